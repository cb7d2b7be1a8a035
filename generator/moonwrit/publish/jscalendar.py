"""``feeds/calendar.json``: the observances as a JSCalendar Group (RFC 8984)."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime
from typing import Any

from moonwrit import __version__
from moonwrit.journal import Entry
from moonwrit.observances import Occurrence
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.basis import json_bytes, utc
from moonwrit.publish.edition import Edition, Imprint
from moonwrit.publish.icalendar import was_sentence
from moonwrit.publish.pieces import Parts


def calendar_feed(edition: Edition) -> Parts:
    """All-day events: a start without a zone, a duration in days, ``showWithoutTime``."""
    dated = tuple(
        (one, edition.month_of[one.year, one.month], edition.entry(one.key))
        for one in edition.almanac.occurrences if one.year >= edition.first_rolling_year
    )
    return (edition.piece(_group, edition.imprint, dated, edition.last_of(entry for _, _, entry in dated)),)


def _group(imprint: Imprint, dated: Sequence[tuple[Occurrence, Month, Entry]], updated: datetime) -> bytes:
    return json_bytes({
        "@type": "Group",
        "uid": imprint.uid("calendar"),
        "prodId": f"-//Moonwrit//Moonwrit {__version__}//EN",
        "updated": utc(updated),
        "title": imprint.name,
        "locale": imprint.language.code,
        "source": imprint.feed("calendar.json"),
        "entries": [_event(imprint, *one) for one in dated],
    })


def _event(imprint: Imprint, one: Occurrence, month: Month, entry: Entry) -> dict[str, Any]:
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
    return event
