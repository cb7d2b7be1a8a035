"""The month walk: month by month, 29 or 30 days, by what the condition says on each 29th evening.

A month that begins on civil date S has its 29th evening on S + 28. If the condition of the next month is met
there, the next month begins on the morrow; if not, thirty days are completed. No month has 28 or 31 days,
whatever the sky does, unless the community has recorded so.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType

import numpy as np

from moonwrit.errors import RequestError
from moonwrit.policy.conditions import Condition
from moonwrit.policy.scopes import Flags
from moonwrit.sky import Evenings, Lunations, lunations, span
from moonwrit.sky.lunation import Integers

LEAD_IN_MONTHS = 24
"""The walk begins this many months before the first that is asked for, on the first evening that meets the
condition. Walks from different beginnings meet within a few months; tests hold this for every policy."""

_BEFORE = 1
_EVENINGS = 4
"""Evenings looked at around each conjunction: from the day before its UTC date to two days after."""


@dataclass(frozen=True, slots=True)
class Era:
    """A condition, from the month of ordinal ``first`` on."""

    first: int
    condition: Condition


@dataclass(frozen=True, slots=True)
class Step:
    """The start of one month: ``start`` its first day and ``evening`` the 29th evening before it, as civil
    ordinals; ``met`` the condition's answer then; ``met_28th`` whether it was met an evening earlier
    already; ``met_30th`` its answer an evening later."""

    ordinal: int
    start: int
    evening: int
    met: bool
    met_28th: bool
    met_30th: bool


class Questions:
    """The condition's answers around every conjunction of a span, and anywhere else when asked."""

    def __init__(self, eras: tuple[Era, ...], first: int, last: int) -> None:
        self.eras = eras
        self.moons: Lunations = lunations(first, last)
        self.days = self.moons.day[:, None] + np.arange(_EVENINGS) - _BEFORE

    @cached_property
    def answers(self) -> Flags:
        """[lunation, evening]"""
        return self.asked(np.arange(len(self.moons)), self.days, lambda condition: condition)

    def condition(self, ordinal: int) -> Condition:
        return [era.condition for era in self.eras if era.first <= ordinal][-1]

    def met(self, rows: Integers, days: Integers) -> Flags:
        """The answers for the months of ``rows`` on ``days`` [row]."""
        column = days - self.days[rows, 0]
        known = (column >= 0) & (column < _EVENINGS)
        found = self.answers[rows, np.where(known, column, 0)]
        if not known.all():
            found[~known] = self.asked(rows[~known], days[~known][:, None], lambda condition: condition)[:, 0]
        return found

    def evenings(self, rows: Integers, days: Integers) -> Evenings:
        """Evenings ``days`` [row, evening] of the lunations ``rows``; a row whose dates lie outside the
        lunation's own window gets a window of its own."""
        moons = self.moons
        windows = moons.windows[rows]
        first, last = self.days[rows, 0], self.days[rows, -1]
        away = np.flatnonzero((days.min(axis=1) < first) | (days.max(axis=1) > last))
        if len(away):
            middle = days[away].mean(axis=1) + 1721424.5 + 1.0
            windows = windows.replaced(away, moons.ephemeris.windows(middle, windows.half_days))
        return Evenings(moons.ephemeris, windows, moons.conjunction_tt[rows], days)

    def asked(self, rows: Integers, days: Integers, of: Callable[[Condition], Condition]) -> Flags:
        """Whether ``of`` the condition of each row's month is met on ``days`` [row, evening]."""
        answers = np.zeros(days.shape, dtype=bool)
        ordinals = self.moons.ordinal[rows]
        for index, era in enumerate(self.eras):
            until = self.eras[index + 1].first if index + 1 < len(self.eras) else np.inf
            mine = np.flatnonzero((ordinals >= era.first) & (ordinals < until))
            if len(mine):
                answers[mine] = of(era.condition).met(self.evenings(rows[mine], days[mine]))
        return answers


def walk(
    eras: tuple[Era, ...], first: int, last: int, decided: Mapping[int, int] = MappingProxyType({})
) -> tuple[Questions, list[Step]]:
    """The starts of the months of ordinal ``first`` to ``last`` + 1, after those of the lead-in.

    ``decided`` gives the first day, as a civil ordinal, of months whose start is on record; the others follow
    from them. Raises RequestError where a month lies outside the ephemeris or before the first era.
    """
    earliest, latest = span()
    earliest = max(earliest, eras[0].first)
    if first < earliest or last >= latest:
        raise RequestError(
            f"this policy can be computed from the year {-(-earliest // 12) + 1} to {latest // 12} AH, and "
            f"the year {(first if first < earliest else last) // 12 + 1} was asked for",
            "choose years inside that span",
        )
    begin = max(earliest, first - LEAD_IN_MONTHS)
    questions = Questions(eras, begin, last + 1)
    starts, evenings, met = [decided.get(begin, _first_start(questions))], [], []
    for row in range(1, last + 2 - begin):
        evenings.append(starts[-1] + 28)
        met.append(bool(questions.met(np.array([row]), np.array(evenings[-1:]))[0]))
        # The record is asked first: what it says stands, and what follows is reckoned from it.
        starts.append(decided.get(begin + row, starts[-1] + (29 if met[-1] else 30)))
    rows, days, is_met = np.arange(1, last + 2 - begin), np.array(evenings), np.array(met)
    met_28th, met_30th = questions.met(rows, days - 1), is_met.copy()
    met_30th[~is_met] = questions.met(rows[~is_met], days[~is_met] + 1)
    first_step = Step(begin, starts[0], starts[0] - 1, True, False, True)
    return questions, [first_step, *(
        Step(begin + row, *step)
        for row, step in enumerate(zip(starts[1:], evenings, met, met_28th.tolist(), met_30th.tolist(), strict=True), 1)
    )]


def _first_start(questions: Questions) -> int:
    """The morrow of the first evening that meets the condition; of the last looked at, where none does."""
    answers = questions.answers[0]
    column = int(np.argmax(answers)) if answers.any() else _EVENINGS - 1
    return int(questions.days[0, column]) + 1
