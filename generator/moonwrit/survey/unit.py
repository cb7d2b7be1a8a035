"""One unit of a survey: the months of one policy at some places over some years.

Policies that leave their place open are walked at all places at once, by the rules of ``policy.walk``; a test holds
both walks together. The others are walked once, whatever the places, and only the age is each place's own.
"""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache
from io import BytesIO
from typing import Literal, NamedTuple

import numpy as np
import numpy.typing as npt

from moonwrit.policy.conditions import CLOSE_SHARE, EDGE_SHARE, Scoped
from moonwrit.policy.walk import LEAD_IN_MONTHS, Questions
from moonwrit.sky import Array, Ephemeris, Evenings, Places, ephemeris, span
from moonwrit.sky.comparison import Rule, met
from moonwrit.sky.ephemeris import using
from moonwrit.sky.lunation import Integers
from moonwrit.survey.plan import Plan, Unit

CLOSENESSES = ("edge", "close", "wide", "fixed")

_BLOCK = 60_000
"""Evenings at places computed in one go: arrays of half a megabyte, which stay in a processor's cache."""


class Months(NamedTuple):
    """``start`` [month, place] civil ordinals of first days, one month more than asked for; ``closeness`` [month,
    place] indices of CLOSENESSES; ``age_h`` [month, place] at the sunset of the eve, NaN where the Sun does not set."""

    start: Integers
    closeness: npt.NDArray[np.int8]
    age_h: Array


def computed(plan: Plan, unit: Unit) -> bytes:
    """The unit's file: a NumPy archive of what ``summed`` gives. Equal units give equal bytes."""
    with using(plan.ephemeris):
        places = Places.of([plan.place(index).row for index in range(unit.first_place, unit.end_place)])
        step = max(1, _BLOCK // (4 * 12 * (unit.last_year - unit.first_year + 3)))
        blocks = [
            _summed(_months(plan, unit, places.pick(np.arange(first, min(first + step, len(places))))), unit)
            for first in range(0, len(places), step)
        ]
    out = BytesIO()
    joined = {name: np.concatenate([block[name] for block in blocks], axis=-1) for name in blocks[0]}
    np.savez_compressed(out, **joined)  # type: ignore[arg-type]
    return out.getvalue()


def _summed(months: Months, unit: Unit) -> dict[str, npt.NDArray[np.generic]]:
    """What is kept of the months, the place last.

    ``first`` day of the first month; ``length`` [month]; ``closeness`` how many months of each; ``age`` least, most
    and sum over ``known`` months, ``age_month`` the ordinals of the least and the most (-1: none).
    """
    age, ordinal = months.age_h, 12 * (unit.first_year - 1)
    known = np.isfinite(age)
    low, high = (np.where(known, age, gone) for gone in (np.inf, -np.inf))
    at = np.stack([low.argmin(axis=0), high.argmax(axis=0)]) + ordinal
    return {
        "first": months.start[0].astype(np.int32),
        "length": np.diff(months.start, axis=0).astype(np.uint8),
        "closeness": np.stack([(months.closeness == kind).sum(axis=0) for kind in range(4)]).astype(np.uint16),
        "known": known.sum(axis=0).astype(np.uint16),
        "before": (known & (age < 0)).sum(axis=0).astype(np.uint16),
        "age": np.stack([low.min(axis=0), high.max(axis=0), np.where(known, age, 0).sum(axis=0)]),
        "age_month": np.where(known.any(axis=0), at, -1).astype(np.int32),
    }


def _months(plan: Plan, unit: Unit, places: Places) -> Months:
    if not plan.leaves_place_open(unit.policy):
        start, closeness = _own_months(plan, unit.policy, unit.first_year, unit.last_year)
        shape = (len(start), len(places))
        return Months(
            np.broadcast_to(start[:, None], shape), np.broadcast_to(closeness[:, None], (shape[0] - 1, shape[1])),
            _ages(start[:-1], unit, places),
        )
    condition = plan.method(unit.policy).eras[0].condition
    assert isinstance(condition, Scoped)
    return walk_each(condition.rule, places, 12 * (unit.first_year - 1), 12 * unit.last_year - 1)


@lru_cache(maxsize=64)
def _own_months(plan: Plan, policy: str, first: int, last: int) -> tuple[Integers, npt.NDArray[np.int8]]:
    """Starts and closeness of a policy that has places of its own, or none."""
    # Planning windows are not asked for.
    months = replace(plan.method(policy), decided_by="calculation").months(first, last)
    starts = [month.starts.toordinal() for month in months]
    return (
        np.array([*starts, starts[-1] + months[-1].length]),
        np.array([CLOSENESSES.index(month.margin.closeness) for month in months], dtype=np.int8),
    )


def _ages(start: Integers, unit: Unit, places: Places) -> Array:
    """[month, place]"""
    first = 12 * (unit.first_year - 1)
    questions = Questions((), first, first + len(start) - 1)
    return questions.evenings(np.arange(len(start)), start[:, None] - 1).at(places).age_h[:, 0]


def walk_each(rule: Rule, places: Places, first: int, last: int) -> Months:
    """The months of ordinal ``first`` to ``last`` under a rule asked at each place by itself."""
    begin = max(span()[0], first - LEAD_IN_MONTHS)
    asked = _Asked(rule, places, begin, last + 1)
    starts, shares = [asked.first_start()], [np.zeros(len(places))]
    for row in range(1, last + 2 - begin):
        share = asked.share(row, starts[-1] + 28)
        starts.append(starts[-1] + np.where(met(share), 29, 30))
        shares.append(share)
    rows = range(first - begin, last + 1 - begin)
    size = np.abs(np.stack([shares[row] for row in rows]))
    # Without a sunset there is no share, and nothing is closer than wide: as in ``policy.conditions``.
    closeness = np.where(size < EDGE_SHARE, 0, np.where(size < CLOSE_SHARE, 1, 2)).astype(np.int8)
    age = np.stack([asked.age(row, starts[row] - 1) for row in rows])
    return Months(np.stack(starts[first - begin:]), closeness, age)


@lru_cache(maxsize=32)
def _evenings(sky: Ephemeris, first: int, last: int, column: int | None = None) -> Evenings:
    """The evenings around each of the lunations ``first`` to ``last``; or the one that many days after the first."""
    questions = Questions((), first, last)
    days = questions.days if column is None else questions.days[:, :1] + column
    return questions.evenings(np.arange(len(days)), days)


class _Asked:
    """A rule's shares and the ages of the Moon at places, on evenings counted from the first of each lunation's."""

    def __init__(self, rule: Rule, places: Places, first: int, last: int) -> None:
        self.rule, self.places, self.span = rule, places, (first, last)
        near = _evenings(ephemeris(), first, last)
        self.days = near.day
        self.near = self._found(near)
        self.far: dict[int, tuple[Array, Array]] = {}

    def _found(self, evenings: Evenings) -> tuple[Array, Array]:
        """Shares and ages [lunation, evening, place]."""
        c = evenings.at(self.places)
        return np.broadcast_to(self.rule.share(c), c.sunset_tt.shape), c.age_h

    def first_start(self) -> Integers:
        """As ``policy.walk``: the morrow of the first evening that meets the rule, else of the last looked at."""
        answers = met(self.near[0][0])
        column = np.where(answers.any(axis=0), answers.argmax(axis=0), answers.shape[0] - 1)
        start: Integers = self.days[0, column] + 1
        return start

    def share(self, row: int, day: Integers) -> Array:
        """On the ``day`` [place] of each place."""
        return self._at(row, day, 0)

    def age(self, row: int, day: Integers) -> Array:
        return self._at(row, day, 1)

    def _at(self, row: int, day: Integers, which: Literal[0, 1]) -> Array:
        column = day - self.days[row, 0]
        near = (column >= 0) & (column < self.days.shape[1])
        out: Array = self.near[which][row, np.where(near, column, 0), np.arange(len(day))]
        if not near.all():
            for far in np.unique(column[~near]).tolist():
                # For all lunations at once: where the Moon is late once, near the polar circles, it is often.
                if far not in self.far:
                    self.far[far] = self._found(_evenings(ephemeris(), *self.span, far))
                out[column == far] = self.far[far][which][row, 0, column == far]
        return out
