"""The month as a policy yields it, with its basis, margin, standing and evidence."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date, datetime, timedelta
from types import MappingProxyType
from typing import Literal, NamedTuple

from moonwrit.content.record import Decision

Basis = Literal["arithmetic", "calculated", "sighted", "completed", "adopted", "tabulated"]
Standing = Literal["expected", "settled", "amended"]
Closeness = Literal["fixed", "wide", "close", "edge"]


@dataclass(frozen=True, slots=True)
class Margin:
    """How far the deciding quantity is from the value at which the date would flip.

    ``margin`` = value - threshold in ``unit``, positive where the test is met; ``day_share`` is the
    same as a share of what the quantity usually changes from one evening to the next (signed).
    ``closeness``: ``edge`` below 0.02 of a day's change, ``close`` below 0.15, ``wide`` beyond;
    ``fixed`` where nothing is measured and the date cannot flip (arithmetic, tables): then the
    numbers are None and ``quantity`` and ``unit`` are empty.
    """

    quantity: str
    value: float | None
    threshold: float | None
    margin: float | None
    unit: str
    day_share: float | None
    closeness: Closeness


@dataclass(frozen=True, slots=True)
class Finding:
    """One comparison of the test on the deciding evening. ``frame`` says how the quantity is measured."""

    quantity: str
    frame: str
    place: str
    value: float | None
    comparison: Literal[">=", ">", "<=", "<"]
    threshold: float
    unit: str
    met: bool
    margin: float | None

    def __str__(self) -> str:
        """age 5.581 h > 0 h (Makkah)"""
        unit = f" {self.unit}" if self.unit else ""
        value = "none" if self.value is None else f"{self.value:g}{unit}"
        sign = self.comparison if self.met else _OPPOSITE[self.comparison]
        return f"{self.quantity} {value} {sign} {self.threshold:g}{unit} ({self.place})"


_OPPOSITE = {">=": "<", ">": "<=", "<=": ">", "<": ">="}


class Note(NamedTuple):
    """A sentence with named places for values, kept apart so that it can be translated."""

    text: str
    values: Mapping[str, str | int | float | date | Finding] = MappingProxyType({})

    def __str__(self) -> str:
        return self.text % self.values


@dataclass(frozen=True, slots=True)
class Evidence:
    """What the start of a month rests on.

    ``evening`` is the 29th evening of the month before: the one that was asked. ``met`` is the
    test's answer there (None for arithmetic and tables). ``circumstances`` maps names with units to
    numbers, or to ISO 8601 UTC strings for instants, None where the event does not happen;
    it is empty where no sky was asked. ``notes`` say what was unusual about it.
    """

    evening: date
    met: bool | None
    place: str | None = None
    conjunction: datetime | None = None
    findings: tuple[Finding, ...] = ()
    circumstances: Mapping[str, float | str | None] = field(default_factory=dict)
    notes: tuple[Note, ...] = ()


@dataclass(frozen=True, slots=True)
class Month:
    """One lunar month. ``eve`` is the civil date on whose evening it begins; ``starts`` the first day.

    ``window`` is the planning window: the earliest and the latest first day that the rules allow while later
    evenings decide; both are ``starts`` where nothing is left to decide. ``decision`` is the recorded word on it.
    """

    year: int
    month: int
    starts: date
    length: int
    basis: Basis
    standing: Standing
    policy: str
    margin: Margin
    evidence: Evidence
    window: tuple[date, date] | None = None
    decision: Decision | None = None

    @property
    def eve(self) -> date:
        return self.starts - timedelta(days=1)

    @property
    def ends(self) -> date:
        """The civil date of the last day, included."""
        return self.starts + timedelta(days=self.length - 1)

    @property
    def ordinal(self) -> int:
        """Months since Muharram of the year 1 (which is 0)."""
        return (self.year - 1) * 12 + self.month - 1


FIXED = Margin("", None, None, None, "", None, "fixed")
