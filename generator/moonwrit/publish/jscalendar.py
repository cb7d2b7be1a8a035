"""``feeds/calendar.json``: the observances as a JSCalendar Group (RFC 8984)."""

from __future__ import annotations

from datetime import datetime
from typing import Any

from moonwrit import __version__
from moonwrit.files import json_bytes
from moonwrit.journal import Entry
from moonwrit.observances import Occurrence
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.basis import utc
from moonwrit.publish.edition import Edition, Imprint
from moonwrit.publish.icalendar import was_sentence
from moonwrit.publish.pieces import Parts, plain

_BETWEEN = plain(b",\n")
_END = plain(b"\n ]\n}\n")


def calendar_feed(edition: Edition) -> Parts:
    """All-day events: a start without a zone, a duration in days, ``showWithoutTime``. The parts are a head with no
    event in it yet, the events, and the end."""
    imprint = edition.imprint
    dated = [
        (one, edition.month_of[one.year, one.month], edition.entry(one.key))
        for one in edition.almanac.occurrences if one.year >= edition.first_rolling_year
    ]
    events = [piece for one in dated for piece in (_BETWEEN, edition.piece(_event, imprint, *one))]
    head = edition.piece(_group, imprint, edition.last_of(entry for _, _, entry in dated))
    return (head, *events[1:], _END)


def _group(imprint: Imprint, updated: datetime) -> bytes:
    empty = json_bytes({
        "@type": "Group",
        "uid": imprint.uid("calendar"),
        "prodId": f"-//Moonwrit//Moonwrit {__version__}//EN",
        "updated": utc(updated),
        "title": imprint.name,
        "locale": imprint.language.code,
        "source": imprint.feed("calendar.json"),
        "entries": [],
    })
    return empty.removesuffix(b"]\n}\n") + b"\n"


def _event(imprint: Imprint, one: Occurrence, month: Month, entry: Entry) -> bytes:
    language = imprint.language
    event: dict[str, Any] = {
        "@type": "Event",
        "uid": imprint.uid(one.key),
        "updated": utc(entry.at),
        "sequence": entry.seq,
        "title": words.event_title(imprint.observance(one.observance), one, language, moved=entry.was is not None),
        "description": "\n\n".join([
            *was_sentence(entry, language), words.basis_sentence(month, language),
            words.margin_sentence(month.margin, language),
        ]),
        "locale": language.code,
        "start": f"{one.starts.isoformat()}T00:00:00",
        "timeZone": None,
        "duration": f"P{(one.ends - one.starts).days + 1}D",
        "showWithoutTime": True,
        "freeBusyStatus": "free",
        "status": "tentative" if one.standing == "expected" else "confirmed",
        "links": {
            "page": {
                "@type": "Link", "href": imprint.page(f"observances/{one.observance}/"), "rel": "describedby",
            },
        },
    }
    if one.tags:
        event["keywords"] = dict.fromkeys(one.tags, True)
    return b"  " + json_bytes(event).removesuffix(b"\n").replace(b"\n", b"\n  ")
