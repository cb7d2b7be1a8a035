"""From rules (``month: 9, last: friday``) to dated occurrences, month by month."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import date, timedelta
from itertools import zip_longest

from moonwrit.content.models import Observance, When
from moonwrit.policy.months import Closeness, Month, Standing

_WEEKDAYS = ("monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday")


@dataclass(frozen=True, slots=True)
class Occurrence:
    """One dated occurrence of an observance.

    ``starts`` and ``ends`` are civil dates, both included. A night (``night``) begins at the sunset
    of ``starts`` and ends at the dawn of the next date; ``starts`` = ``ends`` then, and ``day`` is the
    lunar day whose daytime follows it. ``key`` is unique and lasting: ``<observance>-<year>`` with
    ``-<month>`` where the rule repeats each month and ``-<day>`` where it has several in a month.
    ``standing`` and ``closeness`` are those of the month that the rule names, for its eve too; what hangs
    on where that month ends (its last days, its last Friday) takes the weaker of it and the next month.
    """

    key: str
    observance: str
    year: int
    month: int
    day: int
    starts: date
    ends: date
    night: bool
    standing: Standing
    closeness: Closeness
    tags: tuple[str, ...]


def occurrences(observances: Mapping[str, Observance], months: Sequence[Month]) -> tuple[Occurrence, ...]:
    """Every occurrence of ``observances`` in ``months``, by civil date, then in the content's order.

    - A day that the month does not have (the 30th of 29) gives no occurrence.
    - A run is counted in civil days and runs on into the next month where it is longer than what is
      left of its own; ``run: month`` ends with the month.
    - The night of a lunar day begins at the sunset of the civil date before it: that of day 1 on the
      month's eve, which is the last civil date of the month before.
    - ``last_nights: n`` are the nights of the lunar days 31 - n to the month's last: of ten, ten in
      a month of 30 days and nine in one of 29, since they are counted from the 21st and not back
      from an end that is not known in advance. ``odd: true`` keeps the 21st, 23rd, 25th, 27th, 29th.
    """
    found = [
        (one.starts, place, one)
        for month, following in zip_longest(months, months[1:])
        for place, (name, observance) in enumerate(observances.items())
        for one in _in_month(name, observance, month, following)
    ]
    found.sort(key=lambda entry: entry[:2])
    return tuple(one for _, _, one in found)


_CLOSEST_FIRST: tuple[Closeness, ...] = ("edge", "close", "wide", "fixed")


def _in_month(name: str, observance: Observance, month: Month, following: Month | None) -> Iterator[Occurrence]:
    when = observance.when
    if when.month not in ("every", month.month):
        return
    for day, length, night in _days(when, month):
        standing, closeness = month.standing, month.margin.closeness
        if following is not None and _hangs_on_the_end(when, day + length - 1):
            if following.standing == "expected":
                standing = "expected"
            closeness = min(closeness, following.margin.closeness, key=_CLOSEST_FIRST.index)
        starts = month.starts + timedelta(days=day - (2 if night else 1))
        key = f"{name}-{month.year}"
        if when.month == "every":
            key += f"-{month.month}"
        if when.last_nights is not None:
            key += f"-{day}"
        yield Occurrence(
            key=key,
            observance=name,
            year=month.year,
            month=month.month,
            day=day,
            starts=starts,
            ends=starts + timedelta(days=length - 1),
            night=night,
            standing=standing,
            closeness=closeness,
            tags=tuple(observance.tags),
        )


def _hangs_on_the_end(when: When, last_day: int) -> bool:
    """Would the occurrence change if the month had a day more or fewer?"""
    return when.last is not None or when.day == "last" or when.run == "month" or last_day >= 30


def _days(when: When, month: Month) -> Iterator[tuple[int, int, bool]]:
    """``(lunar day, number of civil days, is it a night)`` of each occurrence of the rule in ``month``."""
    if when.last_nights is not None:
        for day in range(31 - when.last_nights, month.length + 1):
            if day % 2 or not when.odd:
                yield day, 1, True
    elif when.last is not None:
        yield month.length - (month.ends.weekday() - _WEEKDAYS.index(when.last)) % 7, 1, False
    elif when.day is not None:
        day = month.length if when.day == "last" else when.day
        if day <= month.length:
            yield day, month.length - day + 1 if when.run == "month" else when.run, when.night


__all__ = ["Occurrence", "occurrences"]
