"""Small files of dates for other sites: what comes next, and one for each year; the data of the embedded list."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta
from typing import Any

from moonwrit.observances import Occurrence
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.basis import VERSION, json_bytes, utc
from moonwrit.publish.edition import Edition

AHEAD = timedelta(days=400)
"""``next.json`` looks this far ahead: a lunar year and some weeks, so that it serves long after a build."""


def next_feed(edition: Edition) -> bytes:
    """``feeds/next.json``: the present lunar month and what falls in the thirteen months or so from its first day.

    It changes with the lunar month, not with every day: readers leave out what has passed for them.
    """
    months, dates = upcoming(edition)
    return _file(edition, "next.json", months, dates)


def year_file(edition: Edition, year: int) -> bytes:
    """``feeds/years/<year>.json``: the months and dates of one Hijri year."""
    return _file(
        edition, f"years/{year}.json",
        [month for month in edition.almanac.months if month.year == year],
        [one for one in edition.almanac.occurrences if one.year == year],
    )


def upcoming(edition: Edition) -> tuple[list[Month], list[Occurrence]]:
    """Months and dates that end on or after the first day of the present month, and begin within ``AHEAD``."""
    almanac = edition.almanac
    begun = [month.starts for month in almanac.months if month.starts <= almanac.as_of]
    since = begun[-1] if begun else almanac.months[0].starts
    until = since + AHEAD
    return (
        [month for month in almanac.months if month.ends >= since and month.starts <= until],
        [one for one in almanac.occurrences if one.ends >= since and one.starts <= until],
    )


def _file(edition: Edition, name: str, months: Sequence[Month], dates: Sequence[Occurrence]) -> bytes:
    language = edition.language
    return json_bytes({
        "$schema": edition.site.address.rstrip("/") + "/feeds/schema/dates.schema.json",
        "version": VERSION,
        "calendar": edition.almanac.calendar_id,
        "title": edition.name,
        "language": language.code,
        "direction": language.direction,
        "site": edition.page(),
        "source": edition.feed(name),
        "updated": utc(edition.last_change),
        "months": [
            {
                "year": month.year,
                "month": month.month,
                "name": words.month_title(month, language),
                "starts": month.starts.isoformat(),
                "length": month.length,
                "standing": month.standing,
            }
            for month in months
        ],
        "dates": [_date(edition, one) for one in dates],
    })


def _date(edition: Edition, one: Occurrence) -> dict[str, Any]:
    language = edition.language
    name = edition.say(edition.almanac.observances[one.observance].name)
    return {
        "key": one.key,
        "observance": one.observance,
        "title": words.occurrence_title(name, one, language),
        "when": words.span(one.starts, one.ends, language),
        "starts": one.starts.isoformat(),
        "ends": one.ends.isoformat(),
        "night": one.night,
        "year": one.year,
        "month": one.month,
        "day": one.day,
        "standing": one.standing,
        "standing_text": words.standing(one.standing, language),
        "closeness": one.closeness,
        "tags": list(one.tags),
        "page": edition.page(f"observances/{one.observance}/"),
    }


__all__ = ["next_feed", "upcoming", "year_file"]
