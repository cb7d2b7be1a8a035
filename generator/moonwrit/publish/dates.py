"""Small files of dates for other sites: what comes next, and one for each year; the data of the embedded list."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime, timedelta
from typing import Any

from moonwrit.files import json_bytes
from moonwrit.journal import month_key
from moonwrit.observances import Occurrence
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.basis import VERSION, utc
from moonwrit.publish.edition import Edition, Imprint
from moonwrit.publish.pieces import Parts

AHEAD = timedelta(days=400)
"""``next.json`` looks this far ahead: a lunar year and some weeks, so that it serves long after a build."""


def next_feed(edition: Edition) -> Parts:
    """``feeds/next.json``: the present lunar month and what falls in the thirteen months or so from its first day.

    It changes with the lunar month, not with every day: readers leave out what has passed for them.
    """
    months, dates = upcoming(edition)
    return _parts(edition, "next.json", months, dates)


def year_file(edition: Edition, year: int) -> Parts:
    """``feeds/years/<year>.json``: the months and dates of one Hijri year."""
    return _parts(
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


def _parts(edition: Edition, name: str, months: Sequence[Month], dates: Sequence[Occurrence]) -> Parts:
    keys = [*(month_key(month.year, month.month) for month in months), *(one.key for one in dates)]
    updated = edition.last_of(edition.entry(key) for key in keys)
    return (edition.piece(_file, edition.imprint, name, months, dates, updated),)


def _file(
    imprint: Imprint, name: str, months: Sequence[Month], dates: Sequence[Occurrence], updated: datetime
) -> bytes:
    language = imprint.language
    return json_bytes({
        "$schema": imprint.site_path("feeds/schema/dates.schema.json"),
        "version": VERSION,
        "calendar": imprint.calendar_id,
        "title": imprint.name,
        "language": language.code,
        "direction": language.direction,
        "site": imprint.page(),
        "source": imprint.feed(name),
        "updated": utc(updated),
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
        "dates": [_date(imprint, one) for one in dates],
    })


def _date(imprint: Imprint, one: Occurrence) -> dict[str, Any]:
    language = imprint.language
    return {
        "key": one.key,
        "observance": one.observance,
        "title": words.occurrence_title(imprint.observance(one.observance), one, language),
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
        "page": imprint.page(f"observances/{one.observance}/"),
    }


__all__ = ["next_feed", "upcoming", "year_file"]
