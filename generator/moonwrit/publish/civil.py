"""The other way round: civil months with their lunar dates."""

from __future__ import annotations

from calendar import monthrange
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, timedelta

from moonwrit.almanac import Almanac
from moonwrit.observances import Occurrence
from moonwrit.policy import Month


@dataclass(frozen=True, slots=True)
class CivilDay:
    """A civil date; the lunar day that it is, where its month is published; main observances that begin on it."""

    on: date
    month: Month | None
    lunar: int | None
    occurrences: tuple[Occurrence, ...]


@dataclass(frozen=True, slots=True)
class CivilMonth:
    """``weeks`` of seven days each, None outside the month; ``begin``: lunar months that begin in it."""

    first: date
    weeks: tuple[tuple[CivilDay | None, ...], ...]
    begin: tuple[Month, ...]


def civil_years(almanac: Almanac) -> range:
    """Every civil year that holds a published day."""
    return range(almanac.months[0].starts.year, almanac.months[-1].ends.year + 1)


def civil_months(
    months: Sequence[Month], occurrences: Sequence[Occurrence], year: int, first_weekday: int
) -> tuple[CivilMonth, ...]:
    """The months of a civil year, with the occurrences given; those without a published day are left out.

    ``months`` are those that hold a day of the year; ``first_weekday``: Monday is 0.
    """
    lunar = {
        month.starts + timedelta(days=offset): (month, offset + 1)
        for month in months
        for offset in range(month.length)
        if (month.starts + timedelta(days=offset)).year == year
    }
    begins: dict[date, list[Occurrence]] = {}
    for one in occurrences:
        begins.setdefault(one.starts, []).append(one)
    out = []
    for number in range(1, 13):
        first = date(year, number, 1)
        days = [first + timedelta(days=offset) for offset in range(monthrange(year, number)[1])]
        if not any(day in lunar for day in days):
            continue
        cells: list[CivilDay | None] = [None] * ((first.weekday() - first_weekday) % 7)
        for day in days:
            month, number_of_day = lunar.get(day, (None, None))
            cells.append(CivilDay(day, month, number_of_day, tuple(begins.get(day, ()))))
        cells += [None] * (-len(cells) % 7)
        weeks = tuple(tuple(cells[start:start + 7]) for start in range(0, len(cells), 7))
        out.append(CivilMonth(first, weeks, tuple(one for one in months if one.starts in days)))
    return tuple(out)


__all__ = ["CivilDay", "CivilMonth", "civil_months", "civil_years"]
