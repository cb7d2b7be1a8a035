"""The Julian calendar, through the day count.

Years are counted straight through, as astronomers do: 1 BC is year 0, 2 BC is year -1. (Reingold and
Dershowitz leave year 0 out: their -586 is -585 here.) Every fourth year is leap, without exception.
"""

from __future__ import annotations

from datetime import date
from typing import NamedTuple

from moonwrit.calendars.daycount import check_day, check_month, date_of_rd

# Rata die of 1 March of year 0. Reckoned from March, the leap day ends the year and disturbs nothing.
_MARCH_0_RD = -307
_FOUR_YEARS = 1461


class JulianDate(NamedTuple):
    """A Julian date: month 1 (January) to 12, day 1 to 31. Sorts in order of time."""

    year: int
    month: int
    day: int


def julian_is_leap(year: int) -> bool:
    return year % 4 == 0


def julian_month_length(year: int, month: int) -> int:
    """28 to 31 days. Raises ``CalendarError`` where the month is not 1 to 12."""
    check_month("Julian", month)
    if month == 2:
        return 29 if julian_is_leap(year) else 28
    return 30 if month in (4, 6, 9, 11) else 31


def julian_to_rd(julian: JulianDate) -> int:
    """The rata die of a Julian date. Raises ``CalendarError`` where there is no such day."""
    year, month, day = julian
    check_day("Julian", year, month, day, julian_month_length(year, month))
    years = year if month > 2 else year - 1
    return _MARCH_0_RD + _FOUR_YEARS * years // 4 + _days_before((month - 3) % 12) + day - 1


def julian_from_rd(rd: int) -> JulianDate:
    """The Julian date of a rata die."""
    elapsed = rd - _MARCH_0_RD
    years = (4 * elapsed + 3) // _FOUR_YEARS
    day_of_year = elapsed - _FOUR_YEARS * years // 4
    months = (5 * day_of_year + 2) // 153
    month = (months + 2) % 12 + 1
    return JulianDate(years if month > 2 else years + 1, month, day_of_year - _days_before(months) + 1)


def julian_to_date(julian: JulianDate) -> date:
    """The Gregorian date. Raises ``CalendarError`` for no such day, or outside AD 1 to 9999 Gregorian."""
    return date_of_rd(julian_to_rd(julian))


def julian_from_date(day: date) -> JulianDate:
    """The Julian date of a Gregorian date."""
    return julian_from_rd(day.toordinal())


def _days_before(months: int) -> int:
    """Days from 1 March to the first of the month that lies ``months`` (0 to 11) later."""
    # Five months from March, and again from August, make 153 days: 31 30 31 30 31.
    return (153 * months + 2) // 5
