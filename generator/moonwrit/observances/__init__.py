"""Observance rules turned into dated occurrences."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

from moonwrit.policy import Closeness, Standing


@dataclass(frozen=True, slots=True)
class Occurrence:
    """One dated occurrence of an observance.

    ``starts`` and ``ends`` are civil dates, both included. A night (``night``) begins at the sunset
    of ``starts`` and ends at the dawn of the next date; ``starts`` = ``ends`` then, and ``day`` is the
    lunar day whose daytime follows it. ``key`` is unique and lasting: ``<observance>-<year>`` with
    ``-<month>`` where the rule repeats each month and ``-<day>`` where it has several in a month.
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


__all__ = ["Occurrence"]
