"""``feeds/calendar.json``: the observances as a JSCalendar Group (RFC 8984)."""

from __future__ import annotations

from typing import Any

from moonwrit import __version__
from moonwrit.publish import words
from moonwrit.publish.basis import json_bytes, utc
from moonwrit.publish.edition import Edition
from moonwrit.publish.icalendar import was_sentence


def calendar_feed(edition: Edition) -> bytes:
    """All-day events: a start without a zone, a duration in days, ``showWithoutTime``."""
    language = edition.language
    entries: list[dict[str, Any]] = []
    for one in edition.almanac.occurrences:
        if one.year < edition.first_rolling_year:
            continue
        name = edition.say(edition.almanac.observances[one.observance].name)
        month = edition.month_of[one.year, one.month]
        entry = edition.entry(one.key)
        event: dict[str, Any] = {
            "@type": "Event",
            "uid": edition.uid(one.key),
            "updated": utc(entry.at),
            "sequence": entry.seq,
            "title": words.event_title(name, one, language, moved=entry.was is not None),
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
                    "@type": "Link", "href": edition.page(f"observances/{one.observance}/"), "rel": "describedby",
                },
            },
        }
        if one.tags:
            event["keywords"] = dict.fromkeys(one.tags, True)
        entries.append(event)
    return json_bytes({
        "@type": "Group",
        "uid": edition.uid("calendar"),
        "prodId": f"-//Moonwrit//Moonwrit {__version__}//EN",
        "updated": utc(edition.last_change),
        "title": edition.name,
        "locale": language.code,
        "source": edition.feed("calendar.json"),
        "entries": entries,
    })
