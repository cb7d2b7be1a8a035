"""One part of a survey gathered: the units of all policies over all years at some places, as rows and as sums."""

from __future__ import annotations

import csv
from collections.abc import Iterable
from io import BytesIO, StringIO
from itertools import combinations
from math import cos, radians
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from moonwrit.errors import RequestError
from moonwrit.sky.lunation import Integers
from moonwrit.survey.plan import Plan, Unit
from moonwrit.survey.schema import MOST_PLACES, TABLES, Row
from moonwrit.survey.unit import CLOSENESSES

Columns = dict[str, list[Any]]
Archive = dict[str, npt.NDArray[Any]]

POLICY_SUMS = ("of_29", "of_30", "other_lengths", *CLOSENESSES, "before_conjunction", "without_sunset")
PAIR_SUMS = ("same", "earlier", "later")

_WEIGHT = 1_000_000_000
"""What a place on the equator counts. Whole numbers, so that sums do not depend on where a survey is cut."""


class AtPlace(NamedTuple):
    """All rows of one place, in the order of the policies and of their pairs."""

    policies: list[Row]
    agreement: list[Row]
    place: Row


class Part(NamedTuple):
    """What its places add to the results. Sums are whole numbers, weighted.

    ``lines`` of each of the TABLES, in CSV. ``policies``: POLICY_SUMS, ``age_weight`` of places with an age,
    ``age_sum`` of their means in thousandths of an hour, and the first of the longest runs and of the extreme ages.
    ``agreement``: PAIR_SUMS, and the extremes. ``places``: where they are few. ``cells``: months that all policies
    begin on one day, and places; empty but on a grid.
    """

    lines: tuple[str, ...]
    weight: int
    policies: list[Row]
    agreement: list[Row]
    places: list[AtPlace]
    cells: dict[tuple[int, int], tuple[int, int]]
    seams: int


def gathered(plan: Plan, output: Path, places: tuple[int, int]) -> Part:
    """The part between two indices of places, the last excluded, from its unit files in the folder ``output``.

    Equal files give equal parts. One run of years is in memory at a time. Raises RequestError where a file is missing
    or damaged.
    """
    first, end = places
    policies = [_Policy(end - first) for _ in plan.policies]
    pairs = {pair: _Pair(end - first) for pair in combinations(range(len(policies)), 2)}
    all_same = _none(end - first)
    for years in plan.year_chunks():
        starts = [
            policy.add(_read(output / Unit(name, first, end, *years).file))
            for name, policy in zip(plan.policies, policies, strict=True)
        ]
        for (one, other), pair in pairs.items():
            pair.add(starts[other] - starts[one])
        all_same += np.logical_and.reduce([each == starts[0] for each in starts]).sum(axis=0)

    at = [plan.place(index) for index in range(first, end)]
    where: Columns = {
        "place": [place.name for place in at],
        "latitude_deg": [place.latitude_deg for place in at],
        "longitude_deg": [place.longitude_deg for place in at],
        "months": [plan.months] * len(at),
    }
    by_policy: list[Columns] = [
        {"policy": [name] * len(at), **where, **policy.columns(plan)}
        for name, policy in zip(plan.policies, policies, strict=True)
    ]
    by_pair: list[Columns] = [
        {"policy": [plan.policies[one]] * len(at), "other": [plan.policies[other]] * len(at), **where,
         **pair.columns(plan)}
        for (one, other), pair in pairs.items()
    ]
    by_place: Columns = {**where, "all_same": all_same.tolist()}
    weights = [round(_WEIGHT * cos(radians(place.latitude_deg))) if plan.grid_deg else _WEIGHT for place in at]
    return Part(
        tuple(_lines(name, tables) for name, tables in zip(TABLES, (by_policy, by_pair, [by_place]), strict=True)),
        sum(weights),
        [_policy_total(columns, weights) for columns in by_policy],
        [_pair_total(columns, weights) for columns in by_pair],
        [
            AtPlace([_row(columns, index) for columns in by_policy], [_row(columns, index) for columns in by_pair],
                    _row(by_place, index))
            for index in range(len(at))
        ] if plan.place_count <= MOST_PLACES else [],
        _cells(plan, by_place) if plan.grid_deg else {},
        sum(sum(columns["unsettled_seams"]) for columns in by_policy),
    )


def cell_deg(plan: Plan) -> float:
    """How wide and high the cells of the map are."""
    return max(5.0, plan.grid_deg or 5.0)


def _read(path: Path) -> Archive:
    try:
        with np.load(BytesIO(path.read_bytes()), allow_pickle=False) as archive:
            return dict(archive)
    except (OSError, ValueError, EOFError, KeyError) as fault:
        raise RequestError(f"{path} cannot be read ({fault})", "delete it and run again") from None
    except Exception as fault:  # what zipfile raises for a damaged archive has no base of its own
        raise RequestError(f"{path} is damaged ({fault})", "delete it and run again") from None


# --- one run of years after another -----------------------------------------------------------------------------------


def _none(places: int) -> Integers:
    return np.zeros(places, dtype=np.int64)


class LongestRuns:
    """The longest runs of true ones and where the first of them begins [place], told some months at a time."""

    def __init__(self, places: int) -> None:
        self.longest, self.begins = _none(places), _none(places)
        self._months = 0
        self._broken = _none(places) - 1
        """The last month that was not true."""

    def add(self, flags: npt.NDArray[np.bool_]) -> None:
        """``flags`` [month, place]"""
        months = np.arange(self._months, self._months + len(flags), dtype=np.int32)[:, None]
        broken = np.maximum(self._broken, np.maximum.accumulate(np.where(flags, -1, months), axis=0))
        run = months - broken
        last = run.argmax(axis=0)
        most = run.max(axis=0)
        longer = most > self.longest
        self.longest = np.where(longer, most, self.longest)
        self.begins = np.where(longer, months[last, 0] + 1 - most, self.begins)
        self._months, self._broken = self._months + len(flags), broken[-1]


class _Policy:
    """One policy at some places."""

    def __init__(self, places: int) -> None:
        self.runs = {days: LongestRuns(places) for days in (29, 30)}
        self.of = {days: _none(places) for days in (29, 30)}
        self.closeness = np.zeros((len(CLOSENESSES), places), dtype=np.int64)
        self.known, self.before, self.seams = _none(places), _none(places), _none(places)
        self.age = np.stack([np.full(places, start) for start in (np.inf, -np.inf, 0.0)])  # least, most, sum
        self.age_month = np.full((2, places), -1, dtype=np.int32)
        self.end: Integers | None = None

    def add(self, unit: Archive) -> Integers:
        """Take in the next years; the first days of their months [month, place]."""
        first, length = unit["first"], unit["length"]
        for days in (29, 30):
            self.of[days] += (length == days).sum(axis=0)
            self.runs[days].add(length == days)
        self.closeness += unit["closeness"]
        self.known += unit["known"]
        self.before += unit["before"]
        further = np.stack([unit["age"][0] < self.age[0], unit["age"][1] > self.age[1]])
        self.age_month = np.where(further, unit["age_month"], self.age_month)
        self.age = np.stack([*np.where(further, unit["age"][:2], self.age[:2]), self.age[2] + unit["age"][2]])
        ends: Integers = first + np.cumsum(length, axis=0, dtype=np.int32)
        if self.end is not None:
            self.seams += self.end != first
        self.end = ends[-1]
        return ends - length

    def columns(self, plan: Plan) -> Columns:
        ordinal = 12 * (plan.first_year - 1)
        known = self.known > 0

        def hours(values: npt.NDArray[np.float64]) -> list[float | None]:
            return [round(float(value), 3) + 0.0 if has else None for value, has in zip(values, known, strict=True)]

        def months(ordinals: Iterable[int]) -> list[str | None]:
            return [month_name(int(each)) if each >= 0 else None for each in ordinals]

        def run(days: int) -> Columns:
            found = self.runs[days]
            return {f"longest_{days}": found.longest.tolist(),
                    f"longest_{days}_from": months(np.where(found.longest > 0, found.begins + ordinal, -1))}

        return {
            "of_29": self.of[29].tolist(),
            "of_30": self.of[30].tolist(),
            "other_lengths": (plan.months - self.of[29] - self.of[30]).tolist(),
            **run(29), **run(30),
            **{kind: self.closeness[index].tolist() for index, kind in enumerate(CLOSENESSES)},
            "age_least_h": hours(self.age[0]),
            "age_least_month": months(self.age_month[0]),
            "age_most_h": hours(self.age[1]),
            "age_most_month": months(self.age_month[1]),
            "age_mean_h": hours(self.age[2] / np.maximum(self.known, 1)),
            "before_conjunction": self.before.tolist(),
            "without_sunset": (plan.months - self.known).tolist(),
            "unsettled_seams": self.seams.tolist(),
        }


class _Pair:
    """Two policies at some places."""

    def __init__(self, places: int) -> None:
        self.same, self.earlier, self.most = _none(places), _none(places), _none(places)

    def add(self, apart: Integers) -> None:
        """``apart`` [month, place]: days that the other begins later."""
        self.same += (apart == 0).sum(axis=0, dtype=np.int32)
        self.earlier += (apart > 0).sum(axis=0, dtype=np.int32)
        self.most = np.maximum(self.most, np.maximum(apart.max(axis=0), -apart.min(axis=0)))

    def columns(self, plan: Plan) -> Columns:
        return {
            "same": self.same.tolist(),
            "agreement": [round(each, 6) for each in (self.same / plan.months).tolist()],
            "earlier": self.earlier.tolist(),
            "later": (plan.months - self.same - self.earlier).tolist(),
            "most_days_apart": self.most.tolist(),
        }


def month_name(ordinal: int) -> str:
    return f"{ordinal // 12 + 1}-{ordinal % 12 + 1:02d}"


# --- rows and sums ----------------------------------------------------------------------------------------------------


def _row(columns: Columns, index: int) -> Row:
    return {name: column[index] for name, column in columns.items()}


def _lines(table: str, of_each: list[Columns]) -> str:
    """Place by place, at each place the columns' rows in their order."""
    out = StringIO()
    writer = csv.writer(out, lineterminator="\n")
    rows = [zip(*(columns[name] for name in TABLES[table]), strict=True) for columns in of_each]
    for at_place in zip(*rows, strict=True):
        writer.writerows(at_place)
    return out.getvalue()


def _weighted(column: list[int], weights: list[int]) -> int:
    return sum(count * weight for count, weight in zip(column, weights, strict=True))


def _policy_total(columns: Columns, weights: list[int]) -> Row:
    total: Row = {name: _weighted(columns[name], weights) for name in POLICY_SUMS}
    for days in ("longest_29", "longest_30"):
        at = columns[days].index(max(columns[days]))
        total[days] = {"months": columns[days][at], "from": columns[f"{days}_from"][at], "place": columns["place"][at]}
    known = [index for index, mean in enumerate(columns["age_mean_h"]) if mean is not None]
    total["age_weight"] = sum(weights[index] for index in known)
    total["age_sum"] = sum(round(1000 * columns["age_mean_h"][index]) * weights[index] for index in known)
    for age, furthest in (("age_least", min), ("age_most", max)):
        hours = columns[f"{age}_h"]
        total[age] = None
        if known:
            at = furthest(known, key=hours.__getitem__)
            total[age] = {"hours": hours[at], "month": columns[f"{age}_month"][at], "place": columns["place"][at]}
    return total


def _pair_total(columns: Columns, weights: list[int]) -> Row:
    return {
        **{name: _weighted(columns[name], weights) for name in PAIR_SUMS},
        "least": min(columns["agreement"]),
        "most": max(columns["agreement"]),
        "most_days_apart": max(columns["most_days_apart"]),
    }


def _cells(plan: Plan, by_place: Columns) -> dict[tuple[int, int], tuple[int, int]]:
    cells: dict[tuple[int, int], tuple[int, int]] = {}
    deg = cell_deg(plan)
    for latitude, longitude, same in zip(*(by_place[key] for key in ("latitude_deg", "longitude_deg", "all_same")),
                                         strict=True):
        key = int((latitude + 60) // deg), int((longitude + 180) // deg)
        before, places = cells.get(key, (0, 0))
        cells[key] = before + same, places + 1
    return cells
