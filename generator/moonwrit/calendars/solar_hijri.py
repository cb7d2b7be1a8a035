"""The solar Hijri (Persian) calendar: six months of 31 days, five of 30, the last of 29 or 30.

Three rules say when its year begins:

``THIRTY_THREE_YEAR``, the 33-year arithmetic approximation: leap where (25 * year + 11) mod 33 < 8
    (the rule in ICU). It keeps to the astronomical rule over 1178-1634 AP (K. M. Borkowski, The Persian
    calendar for 3000 years, Earth, Moon, and Planets 74, 1996, 223).
``CYCLE_2820``, the 2820-year arithmetic rule (A. Birashk; as in Reingold and Dershowitz): leap where
    31 * (y + 38) mod 128 < 31, with y the year's place, 474 to 3293, in the cycle that holds it. It
    misses the true leap year 1403 AP and makes 1404 one.
``SolarHijri.from_equinoxes``, the astronomical rule in use: the year begins on the day whose noon, by
    the mean time of 52.5 degrees east, follows the March equinox (Borkowski 1996).

Years are counted straight through: the year before 1 is 0, as in ICU. (Reingold and Dershowitz leave
year 0 out: their -1 is 0 here.) AP: anno Persico, the year of this calendar.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from functools import cache
from typing import NamedTuple, Self

from moonwrit.calendars.daycount import CalendarError, check_day, check_month, date_of_rd

# 1 Farvardin 1 = 19 March 622 Julian (Reingold and Dershowitz).
_EPOCH_RD = 226896
# A solar Hijri year begins in the March of the Gregorian year this much greater.
_GREGORIAN_AHEAD = 621
# The mean time of 52.5 degrees east is ahead of Greenwich by 52.5 / 15 hours.
_MEAN_TIME_52_5_EAST = timedelta(hours=3.5)


class SolarHijriDate(NamedTuple):
    """A date of the solar Hijri year: month 1 (Farvardin) to 12, day 1 to 31. Sorts in order of time."""

    year: int
    month: int
    day: int


@dataclass(frozen=True, slots=True)
class SolarHijri:
    """The calendar under one rule for its new year.

    ``rule`` names the rule in words; ``new_year_rd`` gives the rata die of 1 Farvardin of a year.
    Finding a date, or the length of the twelfth month, asks for the new year after it as well.
    Methods raise ``CalendarError`` for a month or day that is not there, and whatever
    ``new_year_rd`` raises for a year that it does not know.
    """

    rule: str
    new_year_rd: Callable[[int], int]

    @classmethod
    def from_new_years(cls, rule: str, new_year: Callable[[int], date]) -> Self:
        """The calendar whose new years are given: ``new_year`` turns a year into the date of its first day.

        For instance the ``__getitem__`` of a table of years.
        """
        return cls(rule, lambda year: new_year(year).toordinal())

    @classmethod
    def from_equinoxes(cls, equinox: Callable[[int], datetime]) -> Self:
        """The calendar under the astronomical rule.

        ``equinox`` turns a Gregorian year into its March equinox, universal time with a time zone; it is
        asked once for each year.
        """
        return cls.from_new_years(
            "astronomical rule, noon of 52.5 degrees east",
            cache(lambda year: new_year_from_equinox(equinox(year + _GREGORIAN_AHEAD))),
        )

    def new_year(self, year: int) -> date:
        """The Gregorian date of 1 Farvardin."""
        return date_of_rd(self.new_year_rd(year))

    def is_leap(self, year: int) -> bool:
        return self.new_year_rd(year + 1) - self.new_year_rd(year) == 366

    def month_length(self, year: int, month: int) -> int:
        """29 to 31 days."""
        check_month("solar Hijri", month)
        if month == 12:
            return 30 if self.is_leap(year) else 29
        return 31 if month <= 6 else 30

    def to_date(self, solar: SolarHijriDate) -> date:
        return date_of_rd(self.to_rd(solar))

    def from_date(self, day: date) -> SolarHijriDate:
        return self.from_rd(day.toordinal())

    def to_rd(self, solar: SolarHijriDate) -> int:
        """The rata die of a solar Hijri date."""
        year, month, day = solar
        check_day("solar Hijri", year, month, day, self.month_length(year, month))
        return self.new_year_rd(year) + _days_before(month) + day - 1

    def from_rd(self, rd: int) -> SolarHijriDate:
        """The solar Hijri date of a rata die."""
        year = (rd - _EPOCH_RD) * 400 // 146097 + 1
        # The mean year only lands near: step to the year that holds the day.
        while rd < self.new_year_rd(year):
            year -= 1
        while rd >= self.new_year_rd(year + 1):
            year += 1
        day_of_year = rd - self.new_year_rd(year)
        month = day_of_year // 31 + 1 if day_of_year < 186 else (day_of_year - 186) // 30 + 7
        return SolarHijriDate(year, month, day_of_year - _days_before(month) + 1)


def new_year_from_equinox(equinox_ut: datetime) -> date:
    """The date of 1 Farvardin for a March equinox.

    ``equinox_ut`` carries a time zone and is reckoned as universal time. An equinox before noon, mean time of
    52.5 degrees east (8:30 UT), makes the year begin on that day; at noon or later, on the next.
    Within a second of noon the answer hangs on the difference of UT1 and UTC, which is not ours to
    know. Raises ``CalendarError`` where the instant has no time zone.
    """
    if equinox_ut.tzinfo is None:
        raise CalendarError(f"the equinox {equinox_ut} has no time zone", "give it in UTC")
    local = equinox_ut.astimezone(UTC) + _MEAN_TIME_52_5_EAST
    return local.date() if local.hour < 12 else local.date() + timedelta(days=1)


def _thirty_three_year_new_year_rd(year: int) -> int:
    # The leap rule above, summed: (8 * year + 21) // 33 leap years from 1 to the year before. Anchored in
    # the years for which the rule is good; carried back to year 1 it begins a day before the epoch.
    return _EPOCH_RD - 1 + 365 * (year - 1) + (8 * year + 21) // 33


def _cycle_2820_new_year_rd(year: int) -> int:
    # The leap rule above, summed: 683 leap years in 2820; the 9 makes it 114 leap years from 1 to 473.
    cycles, place = divmod(year - 474, 2820)
    leap_years = 683 * cycles + 31 * (place + 511) // 128 - 9
    return _EPOCH_RD + 365 * (year - 1) + leap_years


THIRTY_THREE_YEAR = SolarHijri("33-year arithmetic approximation", _thirty_three_year_new_year_rd)
CYCLE_2820 = SolarHijri("2820-year arithmetic rule", _cycle_2820_new_year_rd)


def _days_before(month: int) -> int:
    """Days from 1 Farvardin to the first of the month."""
    return 31 * (month - 1) if month <= 7 else 30 * (month - 1) + 6
