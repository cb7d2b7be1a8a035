"""Dawn and sunset of the days of fasting, at each place.

Not part of the package's door: it loads the sky.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from math import ceil, floor
from typing import Literal
from zoneinfo import ZoneInfo

import numpy as np

from moonwrit.content.models import Fasting
from moonwrit.policy import Month, NamedPlace
from moonwrit.sky import Crossing, Places, ephemeris
from moonwrit.sky.horizon import crossing, noon_tt

FASTING_MONTH = 9
_HALF_DAYS = 2.5
"""From the middle of a date: its noon is at most a day away (on the date line), its dawn and sunset another."""

Missing = Literal["stays above", "stays below"]
"""What the Sun does where there is no such moment: it stays above the altitude asked, or below it."""


@dataclass(frozen=True, slots=True)
class FastingDay:
    """A civil date at a place, its dawn and sunset by the clock there, rounded.

    ``day`` is the lunar day; None for a date that is in the month only if it begins or ends otherwise than expected.
    Dawn and sunset are those around the noon of the date, and may fall on its neighbours (by summer time, far north).
    """

    day: int | None
    on: date
    dawn: datetime | Missing
    sunset: datetime | Missing

    @property
    def complete(self) -> bool:
        return isinstance(self.dawn, datetime) and isinstance(self.sunset, datetime)


@dataclass(frozen=True, slots=True)
class FastingMonth:
    """The days of one month of fasting, by place id."""

    month: Month
    at: Mapping[str, tuple[FastingDay, ...]]

    @property
    def has_other_days(self) -> bool:
        """Are there dates that are in the month only if it begins or ends otherwise?"""
        return any(one.day is None for days in self.at.values() for one in days)


def fasting_months(
    declared: Fasting, months: Sequence[Month], places: Mapping[str, NamedPlace]
) -> tuple[FastingMonth, ...]:
    """The table of each month of fasting in ``months``, which are consecutive.

    The dates are those of the month, and of the days around it to which it may still come. Raises RequestError where
    the ephemeris ends.
    """
    out = []
    for month, after in zip(months, [*months[1:], None], strict=True):
        if month.month != FASTING_MONTH:
            continue
        first, last = _reach(month, after)
        dates = [first + timedelta(days=n) for n in range((last - first).days + 1)]
        found = _moments(declared, dates, list(places.values()))
        out.append(FastingMonth(month, {
            place: tuple(
                FastingDay((on - month.starts).days + 1 if month.starts <= on <= month.ends else None, on, *row[index])
                for on, row in zip(dates, found, strict=True)
            )
            for index, place in enumerate(places)
        }))
    return tuple(out)


def _reach(month: Month, after: Month | None) -> tuple[date, date]:
    """From the earliest first day to the latest last one."""
    first = month.window[0] if month.window else month.starts
    last = after.window[1] - timedelta(days=1) if after and after.window else month.ends
    return min(first, month.starts), max(month.ends, last)


def _moments(
    declared: Fasting, dates: Sequence[date], places: Sequence[NamedPlace]
) -> list[list[tuple[datetime | Missing, datetime | Missing]]]:
    """Dawn and sunset, [date][place]."""
    sky, where = ephemeris(), Places.of([place.row for place in places])
    days = np.array([[on.toordinal()] for on in dates])
    windows = sky.windows(days[:, 0] + 1721425.0, _HALF_DAYS)
    noon = noon_tt(sky, windows, days, where)
    dawn_tt, dawn_state = crossing(windows, "sun", "rise", noon, where, altitude_deg=-declared.dawn_depression)
    sunset_tt, sunset_state = crossing(windows, "sun", "set", noon, where)
    dawn_ut, sunset_ut = sky.ut(dawn_tt), sky.ut(sunset_tt)
    safe = declared.rounding == "minute-safe"
    return [
        [
            (
                _told(float(dawn_ut[at]), int(dawn_state[at]), place.zone, floor if safe else round),
                _told(float(sunset_ut[at]), int(sunset_state[at]), place.zone, ceil if safe else round),
            )
            for index, place in enumerate(places) for at in [(row, 0, index)]
        ]
        for row in range(len(dates))
    ]


def _told(ut: float, state: int, zone: ZoneInfo | None, rounded: Callable[[float], int]) -> datetime | Missing:
    """An instant to the minute, by the clock of the place."""
    if state != Crossing.CROSSES:
        return "stays above" if state == Crossing.STAYS_ABOVE else "stays below"
    minutes = rounded((ut - 1721425.5) * 1440)
    return (datetime(1, 1, 1, tzinfo=UTC) + timedelta(minutes=minutes)).astimezone(zone or UTC)


__all__ = ["FASTING_MONTH", "FastingDay", "FastingMonth", "Missing", "fasting_months"]
