"""Planning windows: the earliest and the latest civil day that the rules allow a month to begin."""

from __future__ import annotations

from collections.abc import Container
from datetime import date

import numpy as np

from moonwrit.policy.conditions import Condition, Either, Every, Scoped
from moonwrit.policy.walk import Questions, Step
from moonwrit.sky.comparison import Comparison, age

LATEST_EVENING = 2
"""The last evening that a plan needs to reckon with, counted from the first after the conjunction: by then
the Moon is more than two days old at sunset, and only clouds on three evenings running could hide it."""


def windows(questions: Questions, steps: list[Step], decided: Container[int]) -> list[tuple[date, date]]:
    """(earliest, latest) first day of the month of each step, given the first step's start and those decided.

    No month has fewer than 29 or more than 30 days; none begins before the evening that follows its
    conjunction in the policy's scope, nor, for planning, more than two evenings after that one.
    """
    first_eves = _first_evenings(questions, steps)
    earliest = latest = steps[0].start
    out = [(date.fromordinal(earliest), date.fromordinal(latest))]
    for step, first_eve in zip(steps[1:], first_eves[1:], strict=True):
        if step.ordinal in decided:
            earliest = latest = step.start
        else:
            earliest = max(earliest + 29, first_eve + 1)
            latest = max(earliest, min(latest + 30, first_eve + LATEST_EVENING + 1))
            # What the policy itself expects is always possible.
            earliest, latest = min(earliest, step.start), max(latest, step.start)
        out.append((date.fromordinal(earliest), date.fromordinal(latest)))
    return out


def _first_evenings(questions: Questions, steps: list[Step]) -> list[int]:
    """For each step, the first evening after the conjunction in the scope of the policy."""
    rows = np.array([step.ordinal for step in steps]) - int(questions.moons.ordinal[0])
    days = questions.days[rows]
    after = questions.asked(rows, days, _with_age_alone)
    column = np.where(after.any(axis=1), after.argmax(axis=1), days.shape[1] - 1)
    return [int(day) for day in days[np.arange(len(rows)), column]]


def _with_age_alone(condition: Condition) -> Condition:
    """The same scopes, asking only whether the conjunction has passed."""
    if isinstance(condition, Scoped):
        return Scoped(Comparison(age(), ">", 0.0), condition.scope)
    kind = Every if isinstance(condition, Every) else Either
    return kind(tuple(_with_age_alone(part) for part in condition.parts))
