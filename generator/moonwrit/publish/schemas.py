"""JSON Schemas (2020-12) of every JSON that is written: the feeds, and what commands print with ``--json``.

Readers must allow for more keys than these: within a version keys may be added.
"""

from __future__ import annotations

from typing import Any

from moonwrit.files import json_bytes
from moonwrit.publish.basis import VERSION

_TEXT = {"type": "string"}
_DATE = {"type": "string", "format": "date", "pattern": r"^\d{4}-\d{2}-\d{2}$"}
_UTC = {"type": "string", "format": "date-time", "pattern": r"^\d{4}-\d{2}-\d{2}T\d{2}:\d{2}:\d{2}Z$"}
_ADDRESS = {"type": "string", "format": "uri", "pattern": "^https?://"}
_NUMBER = {"type": ["number", "null"]}
_WHOLE = {"type": "integer"}
_TRUE_FALSE = {"type": "boolean"}
_YEAR = {"type": "integer", "minimum": 1}
_MONTH = {"type": "integer", "minimum": 1, "maximum": 12}
_LENGTH = {"type": "integer", "minimum": 28, "maximum": 31}
_STANDING = {"enum": ["expected", "settled", "amended"]}
_CLOSENESS = {"enum": ["fixed", "wide", "close", "edge"]}
_SEQUENCE = {"type": "integer", "minimum": 0}
_CIRCUMSTANCES = {
    "type": "object",
    "additionalProperties": {"type": ["number", "string", "null"]},
    "description": "Names with their units; instants in UTC; null where the event does not happen.",
}


def schema_files() -> dict[str, bytes]:
    """``feeds/schema/<name>.schema.json``"""
    return {f"feeds/schema/{name}": json_bytes(value) for name, value in schemas().items()}


def schemas() -> dict[str, dict[str, Any]]:
    """File name -> schema."""
    return {
        "basis.schema.json": _schema("basis.json: the basis of every month", _basis()),
        "calendar.schema.json": _schema("calendar.json: a JSCalendar Group (RFC 8984) of all-day events", _calendar()),
        "dates.schema.json": _schema("next.json and years/<year>.json: dates for other sites", _dates()),
        "differences.schema.json": _schema("what moonwrit differ --json prints", _list(_difference())),
        "evening.schema.json": _schema("what moonwrit evening --json prints", _list(_evening())),
        "months.schema.json": _schema("what moonwrit months --json prints", _list(_month())),
        "notices.schema.json": _schema("notices.json: a JSON Feed 1.1 of decisions and changes", _notices()),
    }


def _schema(title: str, value: dict[str, Any]) -> dict[str, Any]:
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", "title": f"Moonwrit: {title}", **value}


def _object(properties: dict[str, Any], description: str, optional: tuple[str, ...] = ()) -> dict[str, Any]:
    required = [name for name in properties if name not in optional]
    return {"type": "object", "description": description, "required": required, "properties": properties}


def _list(items: dict[str, Any]) -> dict[str, Any]:
    return {"type": "array", "items": items}


def _basis() -> dict[str, Any]:
    policy = {"name": _TEXT, "title": _TEXT, "source": _TEXT, "note": _TEXT}
    return _object({
        "$schema": _TEXT,
        "version": {"const": VERSION},
        "calendar": _TEXT,
        "site": _ADDRESS,
        "policy": _object(policy, "The policy of the calendar."),
        "months": _list(_month()),
    }, "Every month of a calendar with its full evidence.")


def _month() -> dict[str, Any]:
    margin = _object({
        "quantity": _TEXT,
        "value": _NUMBER,
        "threshold": _NUMBER,
        "margin": _NUMBER,
        "unit": _TEXT,
        "day_share": _NUMBER,
        "closeness": _CLOSENESS,
    }, "How far the deciding quantity is from the value at which the date would flip: value minus threshold, in "
       "the quantity's unit, positive where the test is met.")
    finding = _object({
        "quantity": _TEXT,
        "frame": _TEXT,
        "place": _TEXT,
        "value": _NUMBER,
        "comparison": {"enum": [">=", ">", "<=", "<"]},
        "threshold": {"type": "number"},
        "unit": _TEXT,
        "met": _TRUE_FALSE,
        "margin": _NUMBER,
    }, "One comparison of the policy's test on the deciding evening.")
    evidence = _object({
        "evening": _DATE,
        "met": {"type": ["boolean", "null"]},
        "place": {"type": ["string", "null"]},
        "conjunction_utc": {"anyOf": [_UTC, {"type": "null"}]},
        "findings": _list(finding),
        "circumstances": _CIRCUMSTANCES,
        "notes": _list(_TEXT),
    }, "What the start of the month rests on: the 29th evening of the month before.")
    return _object({
        "year": _YEAR,
        "month": _MONTH,
        "starts": _DATE,
        "eve": _DATE,
        "length": _LENGTH,
        "standing": _STANDING,
        "basis": {"enum": ["arithmetic", "calculated", "sighted", "completed", "adopted", "tabulated"]},
        "window": _object({"earliest": _DATE, "latest": _DATE}, "The first days that the rules still allow."),
        "margin": margin,
        "policy": _TEXT,
        "evidence": evidence,
        "also": {
            "type": "object", "additionalProperties": {"type": ["string", "null"]},
            "description": "The first day in other calendars, where they were asked for.",
        },
    }, "One lunar month.", ("also",))


def _evening() -> dict[str, Any]:
    return {
        **_CIRCUMSTANCES, "required": ["date", "place"],
        "properties": {"date": _DATE, "place": _TEXT},
    }


def _difference() -> dict[str, Any]:
    one = _object({
        "year": _YEAR, "month": _MONTH, "ours": _DATE, "theirs": _DATE, "days": _WHOLE, "reason": _TEXT,
    }, "A month that begins on another day: days is theirs minus ours.")
    return _object({
        "policy": _TEXT,
        "title": _TEXT,
        "months": {"type": "integer", "minimum": 1},
        "agreement": {"type": "number", "minimum": 0, "maximum": 1},
        "differences": _list(one),
    }, "One policy beside the community's.")


def _dates() -> dict[str, Any]:
    month = _object({
        "year": _YEAR, "month": _MONTH, "name": _TEXT, "starts": _DATE, "length": _LENGTH, "standing": _STANDING,
    }, "One lunar month.")
    one = _object({
        "key": _TEXT,
        "observance": _TEXT,
        "title": _TEXT,
        "when": _TEXT,
        "starts": _DATE,
        "ends": _DATE,
        "night": {**_TRUE_FALSE, "description": "It begins at the sunset of starts and ends at the next dawn."},
        "year": _YEAR,
        "month": _MONTH,
        "day": {"type": "integer", "minimum": 1, "maximum": 30},
        "standing": _STANDING,
        "standing_text": _TEXT,
        "closeness": _CLOSENESS,
        "tags": _list(_TEXT),
        "page": _ADDRESS,
    }, "One occurrence of an observance; starts and ends are both included.")
    return _object({
        "$schema": _TEXT,
        "version": {"const": VERSION},
        "calendar": _TEXT,
        "title": _TEXT,
        "language": _TEXT,
        "direction": {"enum": ["ltr", "rtl"]},
        "site": _ADDRESS,
        "source": _ADDRESS,
        "updated": _UTC,
        "months": _list(month),
        "dates": _list(one),
    }, "Months and dates of a calendar in one language.")


def _calendar() -> dict[str, Any]:
    link = _object({"@type": {"const": "Link"}, "href": _ADDRESS, "rel": _TEXT}, "RFC 8984, 1.4.11")
    event = _object({
        "@type": {"const": "Event"},
        "uid": _TEXT,
        "updated": _UTC,
        "sequence": _SEQUENCE,
        "title": _TEXT,
        "description": _TEXT,
        "locale": _TEXT,
        "start": {"type": "string", "pattern": r"^\d{4}-\d{2}-\d{2}T00:00:00$"},
        "timeZone": {"type": "null"},
        "duration": {"type": "string", "pattern": r"^P[1-9]\d*D$"},
        "showWithoutTime": {"const": True},
        "freeBusyStatus": {"const": "free"},
        "status": {"enum": ["tentative", "confirmed"]},
        "links": {"type": "object", "additionalProperties": link},
        "keywords": {"type": "object", "additionalProperties": {"const": True}},
    }, "RFC 8984, 5.1", ("keywords",))
    return _object({
        "@type": {"const": "Group"},
        "uid": _TEXT,
        "prodId": _TEXT,
        "updated": _UTC,
        "title": _TEXT,
        "locale": _TEXT,
        "source": _ADDRESS,
        "entries": _list(event),
    }, "RFC 8984, 5.3")


def _notices() -> dict[str, Any]:
    item = _object({
        "id": _ADDRESS, "url": _ADDRESS, "title": _TEXT, "content_text": _TEXT, "content_html": _TEXT,
        "date_published": _UTC,
    }, "One decision, one published date moved or withdrawn, or one notice, which is HTML too.", ("content_html",))
    return _object({
        "version": {"const": "https://jsonfeed.org/version/1.1"},
        "title": _TEXT,
        "home_page_url": _ADDRESS,
        "feed_url": _ADDRESS,
        "language": _TEXT,
        "authors": _list(_object({"name": _TEXT}, "The community.")),
        "items": _list(item),
    }, "https://jsonfeed.org/version/1.1")


__all__ = ["schema_files", "schemas"]
