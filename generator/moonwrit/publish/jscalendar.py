"""``feeds/calendar.json``: the observances as a JSCalendar Group (RFC 8984)."""

from __future__ import annotations

from typing import Any

from moonwrit import __version__
from moonwrit.almanac import Almanac
from moonwrit.content.models import in_language
from moonwrit.journal import Ledger
from moonwrit.publish import words
from moonwrit.publish.basis import json_bytes, utc
from moonwrit.publish.icalendar import last_change, page, uid, was_sentence
from moonwrit.publish.language import ENGLISH, Language


def calendar_feed(almanac: Almanac, ledger: Ledger, language: Language = ENGLISH) -> bytes:
    """All-day events: a start without a zone, a duration in days, ``showWithoutTime``."""
    months = {(month.year, month.month): month for month in almanac.months}
    entries: list[dict[str, Any]] = []
    for one in almanac.occurrences:
        name = in_language(almanac.observances[one.observance].name, language.code, almanac.site.language)
        month = months[one.year, one.month]
        entry = ledger.entry(almanac.calendar_id, one.key)
        entries.append({
            "@type": "Event",
            "uid": uid(almanac, one.key),
            "updated": utc(entry.at),
            "sequence": entry.seq,
            "title": words.event_title(name, one, language),
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
            "keywords": dict.fromkeys(one.tags, True),
            "links": {
                "page": {
                    "@type": "Link", "href": page(almanac, f"observances/{one.observance}/"), "rel": "describedby",
                },
            },
        })
    title = in_language(almanac.calendar.name, language.code, almanac.site.language)
    return json_bytes({
        "@type": "Group",
        "uid": f"{almanac.calendar_id}@{uid(almanac, '').split('@')[1]}",
        "prodId": f"-//Moonwrit//Moonwrit {__version__}//EN",
        "updated": utc(last_change(almanac, ledger)),
        "title": title,
        "locale": language.code,
        "source": page(almanac, "feeds/calendar.json"),
        "entries": entries,
    })
