"""Months and differences as JSON: the published form of what a date rests on, and its schema.

Keys are added, never quietly given another meaning; ``version`` rises when one has to go.
"""

from __future__ import annotations

import json
from dataclasses import asdict
from datetime import datetime
from typing import TYPE_CHECKING, Any

from moonwrit.policy.months import Finding, Margin, Month

if TYPE_CHECKING:
    from moonwrit.almanac import Almanac
    from moonwrit.policy.differ import Beside

VERSION = 1


def month_json(month: Month) -> dict[str, Any]:
    """One month as in ``feeds/basis.json`` and ``moonwrit months --json``."""
    evidence = month.evidence
    earliest, latest = month.window or (month.starts, month.starts)
    return {
        "year": month.year,
        "month": month.month,
        "starts": month.starts.isoformat(),
        "eve": month.eve.isoformat(),
        "length": month.length,
        "standing": month.standing,
        "basis": month.basis,
        "window": {"earliest": earliest.isoformat(), "latest": latest.isoformat()},
        "margin": margin_json(month.margin),
        "policy": month.policy,
        "evidence": {
            "evening": evidence.evening.isoformat(),
            "met": evidence.met,
            "place": evidence.place,
            "conjunction_utc": utc(evidence.conjunction),
            "findings": [finding_json(finding) for finding in evidence.findings],
            "circumstances": dict(evidence.circumstances),
            "notes": [str(note) for note in evidence.notes],
        },
    }


def margin_json(margin: Margin) -> dict[str, Any]:
    return asdict(margin)


def finding_json(finding: Finding) -> dict[str, Any]:
    return asdict(finding)


def beside_json(beside: Beside) -> dict[str, Any]:
    """One policy beside the community's, as ``moonwrit differ --json`` prints it."""
    return {
        "policy": beside.method.name,
        "title": beside.method.title,
        "months": len(beside.months),
        "agreement": round(beside.agreement, 4),
        "differences": [
            {
                "year": one.ours.year,
                "month": one.ours.month,
                "ours": one.ours.starts.isoformat(),
                "theirs": one.theirs.starts.isoformat(),
                "days": one.days,
                "reason": str(one.reason),
            }
            for one in beside.differences
        ],
    }


def utc(moment: datetime | None) -> str | None:
    return None if moment is None else moment.strftime("%Y-%m-%dT%H:%M:%SZ")


def basis_feed(almanac: Almanac) -> bytes:
    """``feeds/basis.json``: every month of a calendar with its full evidence."""
    method = almanac.method
    return json_bytes({
        "$schema": "schema/basis.schema.json",
        "version": VERSION,
        "calendar": almanac.calendar_id,
        "site": almanac.site.address,
        "policy": {"name": method.name, "title": method.title, "source": method.source, "note": method.note},
        "months": [month_json(month) for month in almanac.months],
    })


def json_bytes(value: Any) -> bytes:
    """Readable JSON in UTF-8, a line feed at its end."""
    return (json.dumps(value, ensure_ascii=False, indent=1, allow_nan=False) + "\n").encode()


def basis_schema() -> bytes:
    """``feeds/schema/basis.schema.json``, JSON Schema 2020-12."""
    date = {"type": "string", "format": "date", "pattern": r"^\d{4}-\d{2}-\d{2}$"}
    number = {"type": ["number", "null"]}
    text = {"type": "string"}
    comparison = {"enum": [">=", ">", "<=", "<"]}
    margin = _object({
        "quantity": text,
        "value": number,
        "threshold": number,
        "margin": number,
        "unit": text,
        "day_share": number,
        "closeness": {"enum": ["fixed", "wide", "close", "edge"]},
    }, "How far the deciding quantity is from the value at which the date would flip: value minus threshold, in "
       "the quantity's unit, positive where the test is met.")
    finding = _object({
        "quantity": text,
        "frame": text,
        "place": text,
        "value": number,
        "comparison": comparison,
        "threshold": {"type": "number"},
        "unit": text,
        "met": {"type": "boolean"},
        "margin": number,
    }, "One comparison of the policy's test on the deciding evening.")
    evidence = _object({
        "evening": date,
        "met": {"type": ["boolean", "null"]},
        "place": {"type": ["string", "null"]},
        "conjunction_utc": {"type": ["string", "null"], "pattern": r"^\d{4}-\d{2}-\d{2}T\d{2}:\d{2}:\d{2}Z$"},
        "findings": {"type": "array", "items": finding},
        "circumstances": {
            "type": "object",
            "additionalProperties": {"type": ["number", "string", "null"]},
            "description": "Names with their units; instants in UTC; null where the event does not happen.",
        },
        "notes": {"type": "array", "items": text},
    }, "What the start of the month rests on: the 29th evening of the month before.")
    month = _object({
        "year": {"type": "integer"},
        "month": {"type": "integer", "minimum": 1, "maximum": 12},
        "starts": date,
        "eve": date,
        "length": {"type": "integer", "minimum": 28, "maximum": 31},
        "standing": {"enum": ["expected", "settled", "amended"]},
        "basis": {"enum": ["arithmetic", "calculated", "sighted", "completed", "adopted", "tabulated"]},
        "window": _object({"earliest": date, "latest": date}, "The first days that the rules still allow."),
        "margin": margin,
        "policy": text,
        "evidence": evidence,
    }, "One lunar month.")
    policy = _object({"name": text, "title": text, "source": text, "note": text}, "The policy of the calendar.")
    return json_bytes({
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "Moonwrit: the basis of every month",
        **_object({
            "$schema": text,
            "version": {"const": VERSION},
            "calendar": text,
            "site": text,
            "policy": policy,
            "months": {"type": "array", "items": month},
        }, "Keys may be added; none is given another meaning without a new version."),
    })


def _object(properties: dict[str, Any], description: str) -> dict[str, Any]:
    """An object with these keys at least: readers must allow for more."""
    return {
        "type": "object", "description": description, "required": list(properties), "properties": properties,
    }
