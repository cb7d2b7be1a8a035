"""The Rumi fiscal calendar of the Ottoman state, from 13 March 1840 to 31 December 1925 (Gregorian).

Julian months and leap days until 15 February 1332, which was followed by 1 March 1333 = 1 March 1917
Gregorian; from then on the days and months of the Gregorian calendar. Years began on 1 March until
1333, which ended on 31 December after ten months; 1334 to 1341 began on 1 January. Start and year
rule: encyclopedia article "Rumi calendar". Reform of 1917, start of the year in January and end
(Law 698 of 26 December 1925): from memory; that the dates fit together is arithmetic.

Months carry the number of their Julian or Gregorian namesake: 3 is Mart, 1 is Kanun-i Sani, which
before the reform came eleventh in the fiscal year. So dates of one fiscal year do not sort by number.
"""

from __future__ import annotations

from contextlib import suppress
from datetime import date
from typing import NamedTuple

from moonwrit.calendars.daycount import CalendarError
from moonwrit.calendars.julian import JulianDate, julian_from_date, julian_to_date

RUMI_FIRST = date(1840, 3, 13)
"""1 Mart 1256, the first day of the calendar."""
RUMI_LAST = date(1925, 12, 31)
"""31 December 1341, the last day of the calendar."""
_REFORM = date(1917, 3, 1)
_YEARS_BEHIND = 584
_FIRST_YEAR, _REFORMED_YEAR, _LAST_YEAR = 1256, 1333, 1341


class RumiDate(NamedTuple):
    """A Rumi date. ``month`` is the number of the Julian or Gregorian namesake (1 January to 12)."""

    year: int
    month: int
    day: int


def rumi_from_date(day: date) -> RumiDate | None:
    """The Rumi date of a Gregorian date; None outside the span in which the calendar was in use."""
    if not RUMI_FIRST <= day <= RUMI_LAST:
        return None
    if day >= _REFORM:
        return RumiDate(day.year - _YEARS_BEHIND, day.month, day.day)
    year, month, of_month = julian_from_date(day)
    return RumiDate(year - _YEARS_BEHIND - (month < 3), month, of_month)


def rumi_to_date(rumi: RumiDate) -> date:
    """The Gregorian date of a Rumi date.

    Raises ``CalendarError`` where there was no such date: outside the span, in the days dropped by
    the reform, in January and February of the short year 1333, or past the end of a month.
    """
    year, month, day = rumi
    found = None
    if _FIRST_YEAR <= year <= _LAST_YEAR:
        with suppress(ValueError):  # the month has no such day
            if year >= _REFORMED_YEAR:
                found = date(year + _YEARS_BEHIND, month, day)
            else:
                found = julian_to_date(JulianDate(year + _YEARS_BEHIND + (month < 3), month, day))
    # Only inside the span, and on its own side of the reform, does a date lead back to itself.
    if found is None or rumi_from_date(found) != rumi:
        raise CalendarError(
            f"the Rumi calendar had no day {day} of month {month} in {year}",
            "it ran from 1 March 1256 to 31 December 1341, and 15 February 1332 was followed by 1 March 1333",
        )
    return found
