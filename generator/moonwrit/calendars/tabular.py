"""The arithmetic Hijri calendar: a cycle of 30 years with 11 leap years, no sky in it.

Odd months have 30 days and even months 29; the twelfth has 30 in a leap year. What varies is which
11 years of the 30 are leap, and the day on which the count begins. The leap lists are those of the
encyclopedia article "Tabular Islamic calendar"; their numbering as types I to IV follows
R. H. van Gent, The Islamic calendar, Utrecht (numbering and names from memory).

Each list is the same as (11 * year + k) mod 30 < 11 with a k of its own, so the leap years before a
year need no loop. Years are counted straight through: the year before 1 is 0, then -1.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from typing import Literal, NamedTuple, get_args

from moonwrit.calendars.daycount import CalendarError, check_day, check_month, date_of_rd
from moonwrit.errors import did_you_mean

Pattern = Literal["15", "16", "fatimid", "habash"]
Epoch = Literal["civil", "thursday"]

# Leap years of the cycle; 30 stands for the years divisible by 30.
LEAP_YEARS: dict[Pattern, tuple[int, ...]] = {
    "15": (2, 5, 7, 10, 13, 15, 18, 21, 24, 26, 29),  # type I
    "16": (2, 5, 7, 10, 13, 16, 18, 21, 24, 26, 29),  # type II
    "fatimid": (2, 5, 8, 10, 13, 16, 19, 21, 24, 27, 29),  # type III
    "habash": (2, 5, 8, 11, 13, 16, 19, 21, 24, 27, 30),  # type IV
}
# The k of the rule above; that rule and list agree is tested for the whole cycle.
_SHIFT: dict[Pattern, int] = {"15": 15, "16": 14, "fatimid": 11, "habash": 9}

# Rata die of 1 Muharram 1: Friday 16 July 622 and Thursday 15 July 622, both Julian.
_EPOCH_RD: dict[Epoch, int] = {"civil": 227015, "thursday": 227014}

_CYCLE_DAYS = 30 * 354 + 11


class HijriDate(NamedTuple):
    """A day of the lunar year: month 1 (Muharram) to 12, day 1 to 30. Sorts in order of time."""

    year: int
    month: int
    day: int


@dataclass(frozen=True, slots=True)
class Tabular:
    """One tabular calendar. Civil dates are Gregorian; a Hijri day is named by the civil date of its daytime.

    ``to_rd`` and ``from_rd`` know no bounds; what returns a ``date`` ends with AD 1 and 9999.
    Every method raises ``CalendarError`` for a month, day or year that is not there.
    """

    pattern: Pattern = "16"
    epoch: Epoch = "civil"

    def __post_init__(self) -> None:
        if self.pattern not in _SHIFT:
            raise CalendarError(f'no tabular pattern "{self.pattern}"', did_you_mean(self.pattern, _SHIFT))
        if self.epoch not in _EPOCH_RD:
            raise CalendarError(f'no tabular epoch "{self.epoch}"', did_you_mean(self.epoch, _EPOCH_RD))

    @property
    def name(self) -> str:
        """The published name, for instance ``tabular-16-civil``."""
        return f"tabular-{self.pattern}-{self.epoch}"

    def is_leap(self, year: int) -> bool:
        return (11 * year + _SHIFT[self.pattern]) % 30 < 11

    def year_length(self, year: int) -> int:
        """354 or 355 days."""
        return 355 if self.is_leap(year) else 354

    def month_length(self, year: int, month: int) -> int:
        """29 or 30 days."""
        check_month("Hijri", month)
        return 30 if month % 2 or (month == 12 and self.is_leap(year)) else 29

    def month_start(self, year: int, month: int) -> date:
        """The Gregorian date of the first day of a month."""
        return date_of_rd(self.to_rd(HijriDate(year, month, 1)))

    def to_date(self, hijri: HijriDate) -> date:
        return date_of_rd(self.to_rd(hijri))

    def from_date(self, day: date) -> HijriDate:
        return self.from_rd(day.toordinal())

    def to_rd(self, hijri: HijriDate) -> int:
        """The rata die of a Hijri date."""
        year, month, day = hijri
        check_day("Hijri", year, month, day, self.month_length(year, month))
        return self._year_start_rd(year) + (59 * (month - 1) + 1) // 2 + day - 1

    def from_rd(self, rd: int) -> HijriDate:
        """The Hijri date of a rata die."""
        # The largest year y with _year_start_rd(y) <= rd, solved for y.
        elapsed = 30 * (rd - _EPOCH_RD[self.epoch]) + 29 - _SHIFT[self.pattern]
        year = elapsed // _CYCLE_DAYS + 1
        day_of_year = rd - self._year_start_rd(year)
        # Day 355 of a leap year would open a thirteenth month: it belongs to the twelfth.
        month = min(2 * day_of_year // 59 + 1, 12)
        return HijriDate(year, month, day_of_year - (59 * (month - 1) + 1) // 2 + 1)

    def _year_start_rd(self, year: int) -> int:
        return _EPOCH_RD[self.epoch] + (_CYCLE_DAYS * (year - 1) + _SHIFT[self.pattern]) // 30


_BY_NAME = {
    calendar.name: calendar
    for calendar in (Tabular(pattern, epoch) for pattern in get_args(Pattern) for epoch in get_args(Epoch))
}

TABULAR_NAMES: tuple[str, ...] = tuple(_BY_NAME)
"""The eight published names, ``tabular-15-civil`` to ``tabular-habash-thursday``."""


def tabular_by_name(name: str) -> Tabular:
    """The tabular calendar of a published name. Raises ``CalendarError`` with the nearest name."""
    if name not in _BY_NAME:
        raise CalendarError(f'no tabular calendar "{name}"', did_you_mean(name, TABULAR_NAMES))
    return _BY_NAME[name]
