"""The results of a survey, drawn from the files of its units: CSV by place, JSON in total with its schema."""

from __future__ import annotations

import csv
import os
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from io import BytesIO
from itertools import combinations
from math import cos, radians
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from moonwrit.errors import RequestError
from moonwrit.survey.plan import Place, Plan, Unit
from moonwrit.survey.running import PLAN, json_bytes, write
from moonwrit.survey.unit import CLOSENESSES

Row = dict[str, Any]

MOST_PLACES = 100
"""``survey.json`` lists single places up to so many; beyond, they stand in the CSV files alone."""

_TABLES = ("policies", "agreement", "places")


class AtPlace(NamedTuple):
    """All rows of one place, in the order of the policies and of their pairs."""

    policies: list[Row]
    agreement: list[Row]
    place: Row


@dataclass(frozen=True)
class Results:
    """Over all places. On a grid a place counts by the area of its cell, else all count alike.

    ``policies`` and ``agreement`` have the keys of their schema. ``places`` are single places, where they are few.
    ``cells``: latitude, longitude and share of months on which all policies begin on one day, means over cells of
    five degrees or more; empty but on a grid. ``seams``: joints of two runs of years at which a walk had not settled.
    """

    survey: Row
    policies: list[Row]
    agreement: list[Row]
    places: list[AtPlace]
    cells: list[tuple[float, float, float]]
    seams: int

    def as_json(self) -> Row:
        return {
            "$schema": "survey.schema.json",
            "survey": self.survey,
            "policies": self.policies,
            "agreement": self.agreement,
            "places": [{**one.place, "policies": one.policies, "agreement": one.agreement} for one in self.places],
        }


def gather(plan: Plan, output: Path) -> Results:
    """Write the CSV and JSON files of a survey whose units are all there. Raises RequestError where one is not."""
    totals = _Totals(plan)
    paths = [output / f"{name}.csv" for name in _TABLES]
    asides = [path.with_name(f".{path.name}.{os.getpid()}") for path in paths]
    try:
        opened = [aside.open("w", encoding="utf-8", newline="") for aside in asides]
        writers: list[csv.DictWriter[str]] = []
        try:
            for one in _each_place(plan, output):
                tables = (one.policies, one.agreement, [one.place])
                if not writers:
                    heads = (POLICY_AT_PLACE, PAIR_AT_PLACE, PLACE)
                    writers = [csv.DictWriter(file, list(head), lineterminator="\n")
                               for file, head in zip(opened, heads, strict=True)]
                    for writer in writers:
                        writer.writeheader()
                for writer, rows in zip(writers, tables, strict=True):
                    writer.writerows(rows)
                totals.add(one)
        finally:
            for file in opened:
                file.close()
        for aside, path in zip(asides, paths, strict=True):
            os.replace(aside, path)
    except OSError as fault:
        raise RequestError(f"{output} cannot be written ({fault.strerror or fault})",
                           "free space, and run again: what is finished is kept") from None
    results = totals.results()
    write(output / "survey.json", json_bytes(results.as_json()))
    write(output / "survey.schema.json", json_bytes(schema()))
    return results


# --- one place after another ------------------------------------------------------------------------------------------


class _Whole(NamedTuple):
    """One policy over all years at some places, place last: the units joined."""

    start: npt.NDArray[np.int32]
    length: npt.NDArray[np.uint8]
    closeness: npt.NDArray[np.int64]
    known: npt.NDArray[np.int64]
    before: npt.NDArray[np.int64]
    age: npt.NDArray[np.float64]
    age_month: npt.NDArray[np.int32]
    seams: npt.NDArray[np.int64]


def _each_place(plan: Plan, output: Path) -> Iterator[AtPlace]:
    for first, end in plan.place_chunks():
        wholes = [_whole(plan, output, policy, first, end) for policy in plan.policies]
        by_policy = [_policy_columns(plan, whole) for whole in wholes]
        pairs = list(combinations(range(len(wholes)), 2))
        by_pair = [_pair_columns(wholes[one].start, wholes[other].start) for one, other in pairs]
        same = np.ones(wholes[0].start.shape, dtype=bool)
        for whole in wholes[1:]:
            same &= whole.start == wholes[0].start
        all_same = same.sum(axis=0)
        for index in range(end - first):
            place = plan.place(first + index)
            yield AtPlace(
                [{"policy": policy, **_named(place), "months": plan.months, **_at(columns, index)}
                 for policy, columns in zip(plan.policies, by_policy, strict=True)],
                [{"policy": plan.policies[one], "other": plan.policies[other], **_named(place), "months": plan.months,
                  **_at(columns, index)} for (one, other), columns in zip(pairs, by_pair, strict=True)],
                {**_named(place), "months": plan.months, "all_same": int(all_same[index])},
            )


def _named(place: Place) -> Row:
    return {"place": place.name, "latitude_deg": place.latitude_deg, "longitude_deg": place.longitude_deg}


def _at(columns: dict[str, list[Any]], index: int) -> Row:
    return {name: column[index] for name, column in columns.items()}


def _whole(plan: Plan, output: Path, policy: str, first: int, end: int) -> _Whole:
    parts = [_read(output / Unit(policy, first, end, *years).file) for years in plan.year_chunks()]
    ends = [part["first"] + part["length"].sum(axis=0, dtype=np.int64) for part in parts]
    ages = np.stack([part["age"] for part in parts])  # [years, least most sum, place]
    least, most = ages[:, 0].argmin(axis=0), ages[:, 1].argmax(axis=0)
    column = np.arange(end - first)
    month = np.stack([part["age_month"] for part in parts])
    return _Whole(
        np.concatenate([
            part["first"] + np.cumsum(part["length"], axis=0, dtype=np.int32) - part["length"] for part in parts
        ]),
        np.concatenate([part["length"] for part in parts]),
        _sum(part["closeness"] for part in parts),
        _sum(part["known"] for part in parts),
        _sum(part["before"] for part in parts),
        np.stack([ages[least, 0, column], ages[most, 1, column], ages[:, 2].sum(axis=0)]),
        np.stack([month[least, 0, column], month[most, 1, column]]),
        _sum([reached != after["first"] for reached, after in zip(ends[:-1], parts[1:], strict=True)]
             or [np.zeros(end - first)]),
    )


def _sum(arrays: Iterable[npt.NDArray[Any]]) -> npt.NDArray[np.int64]:
    total: npt.NDArray[np.int64] = np.stack(list(arrays)).sum(axis=0, dtype=np.int64)
    return total


def _read(path: Path) -> dict[str, npt.NDArray[Any]]:
    try:
        with np.load(BytesIO(path.read_bytes()), allow_pickle=False) as archive:
            return dict(archive)
    except (OSError, ValueError, EOFError, KeyError) as fault:
        raise RequestError(f"{path} cannot be read ({fault})", "delete it and run again") from None
    except Exception as fault:  # what zipfile raises for a damaged archive has no base of its own
        raise RequestError(f"{path} is damaged ({fault})", "delete it and run again") from None


def _policy_columns(plan: Plan, whole: _Whole) -> dict[str, list[Any]]:
    ordinal = 12 * (plan.first_year - 1)
    runs = {days: longest_runs(whole.length == days) for days in (29, 30)}
    of = {days: (whole.length == days).sum(axis=0) for days in (29, 30)}
    mean = whole.age[2] / np.maximum(whole.known, 1)
    known = whole.known > 0

    def hours(values: npt.NDArray[np.float64]) -> list[float | None]:
        return [round(float(value), 3) + 0.0 if has else None for value, has in zip(values, known, strict=True)]

    def months(ordinals: Iterable[int]) -> list[str | None]:
        return [month_name(int(each)) if each >= 0 else None for each in ordinals]

    return {
        "of_29": of[29].tolist(),
        "of_30": of[30].tolist(),
        "other_lengths": (plan.months - of[29] - of[30]).tolist(),
        "longest_29": runs[29][0].tolist(),
        "longest_29_from": months(np.where(runs[29][0] > 0, runs[29][1] + ordinal, -1)),
        "longest_30": runs[30][0].tolist(),
        "longest_30_from": months(np.where(runs[30][0] > 0, runs[30][1] + ordinal, -1)),
        **{kind: whole.closeness[index].tolist() for index, kind in enumerate(CLOSENESSES)},
        "age_least_h": hours(whole.age[0]),
        "age_least_month": months(whole.age_month[0]),
        "age_most_h": hours(whole.age[1]),
        "age_most_month": months(whole.age_month[1]),
        "age_mean_h": hours(mean),
        "before_conjunction": whole.before.tolist(),
        "without_sunset": (plan.months - whole.known).tolist(),
        "unsettled_seams": whole.seams.tolist(),
    }


def longest_runs(flags: npt.NDArray[np.bool_]) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64]]:
    """``flags`` [month, place] -> the length of the longest run of true ones [place], and where the first of them
    begins."""
    run = np.zeros(flags.shape[1], dtype=np.int64)
    best, begins = run.copy(), run.copy()
    for month, row in enumerate(flags):
        run = np.where(row, run + 1, 0)
        longer = run > best
        best = np.where(longer, run, best)
        begins = np.where(longer, month + 1 - run, begins)
    return best, begins


def _pair_columns(one: npt.NDArray[np.int32], other: npt.NDArray[np.int32]) -> dict[str, list[Any]]:
    apart = other - one
    same = (apart == 0).sum(axis=0)
    return {
        "same": same.tolist(),
        "agreement": [round(each, 6) for each in (same / len(one)).tolist()],
        "earlier": (apart > 0).sum(axis=0).tolist(),
        "later": (apart < 0).sum(axis=0).tolist(),
        "most_days_apart": np.abs(apart).max(axis=0).tolist(),
    }


def month_name(ordinal: int) -> str:
    return f"{ordinal // 12 + 1}-{ordinal % 12 + 1:02d}"


# --- all places together ----------------------------------------------------------------------------------------------


class _Totals:
    """Sums over places, as they come."""

    def __init__(self, plan: Plan) -> None:
        self.plan = plan
        self.weight = 0.0
        self.policies: list[Row] = []
        self.agreement: list[Row] = []
        self.places: list[AtPlace] = []
        self.cells: dict[tuple[int, int], list[float]] = {}
        self.cell_deg = max(5.0, plan.grid_deg or 5.0)
        self.seams = 0

    def add(self, one: AtPlace) -> None:
        weight = cos(radians(one.place["latitude_deg"])) if self.plan.grid_deg else 1.0
        self.weight += weight
        if self.plan.place_count <= MOST_PLACES:
            self.places.append(one)
        if not self.policies:
            self.policies = [{"policy": row["policy"]} for row in one.policies]
            self.agreement = [{"policy": row["policy"], "other": row["other"]} for row in one.agreement]
        for total, row in zip(self.policies, one.policies, strict=True):
            self.seams += row["unsettled_seams"]
            for share in ("of_29", "of_30", "other_lengths", *CLOSENESSES, "before_conjunction", "without_sunset"):
                total[share] = total.get(share, 0.0) + weight * row[share]
            if row["age_mean_h"] is not None:
                total["age_weight"] = total.get("age_weight", 0.0) + weight
                total["age_mean_h"] = total.get("age_mean_h", 0.0) + weight * row["age_mean_h"]
            for days in ("longest_29", "longest_30"):
                if total.get(days) is None or row[days] > total[days]["months"]:
                    total[days] = {"months": row[days], "from": row[f"{days}_from"], "place": row["place"]}
            for age, sign in (("age_least", -1), ("age_most", 1)):
                hours = row[f"{age}_h"]
                if hours is not None and (total.get(age) is None or sign * hours > sign * total[age]["hours"]):
                    total[age] = {"hours": hours, "month": row[f"{age}_month"], "place": row["place"]}
        for total, row in zip(self.agreement, one.agreement, strict=True):
            for share in ("same", "earlier", "later"):
                total[share] = total.get(share, 0.0) + weight * row[share]
            for least, better in (("least", min), ("most", max)):
                total[least] = better(total.get(least, row["agreement"]), row["agreement"])
            total["most_days_apart"] = max(total.get("most_days_apart", 0), row["most_days_apart"])
        if self.plan.grid_deg:
            key = (int((one.place["latitude_deg"] + 60) // self.cell_deg),
                   int((one.place["longitude_deg"] + 180) // self.cell_deg))
            self.cells.setdefault(key, []).append(one.place["all_same"] / one.place["months"])

    def results(self) -> Results:
        of = self.weight * self.plan.months

        def share(value: float) -> float:
            return round(value / of, 6)

        return Results(
            self.plan.as_json(),
            [
                {
                    "policy": total["policy"],
                    "length_shares": {days: share(total[key]) for days, key in
                                      (("29", "of_29"), ("30", "of_30"), ("other", "other_lengths"))},
                    "longest_29": total["longest_29"],
                    "longest_30": total["longest_30"],
                    "margin_shares": {kind: share(total[kind]) for kind in CLOSENESSES},
                    "age_least": total.get("age_least"),
                    "age_most": total.get("age_most"),
                    "age_mean_h": (
                        round(total["age_mean_h"] / total["age_weight"], 3) if "age_weight" in total else None
                    ),
                    "before_conjunction_share": share(total["before_conjunction"]),
                    "without_sunset_share": share(total["without_sunset"]),
                }
                for total in self.policies
            ],
            [
                {
                    "policy": total["policy"], "other": total["other"],
                    "agreement": share(total["same"]),
                    "earlier_share": share(total["earlier"]), "later_share": share(total["later"]),
                    "least_agreement": total["least"], "most_agreement": total["most"],
                    "most_days_apart": total["most_days_apart"],
                }
                for total in self.agreement
            ],
            self.places,
            [
                (-60 + (row + 0.5) * self.cell_deg, -180 + (column + 0.5) * self.cell_deg, sum(shares) / len(shares))
                for (row, column), shares in sorted(self.cells.items())
            ],
            self.seams,
        )


# --- the schema -------------------------------------------------------------------------------------------------------

_TEXT = {"type": "string"}
_COUNT = {"type": "integer", "minimum": 0}
_SHARE = {"type": "number", "minimum": 0, "maximum": 1}
_HOURS = {"type": ["number", "null"]}
_MONTH = {"type": ["string", "null"], "pattern": r"^\d+-\d{2}$"}
_DEGREES = {"type": "number"}

PLACE: Row = {"place": _TEXT, "latitude_deg": _DEGREES, "longitude_deg": _DEGREES, "months": _COUNT,
              "all_same": {**_COUNT, "description": "Months that all the policies begin on one day."}}
_WHERE = {key: PLACE[key] for key in ("place", "latitude_deg", "longitude_deg", "months")}

POLICY_AT_PLACE: Row = {
    "policy": _TEXT, **_WHERE, "of_29": _COUNT, "of_30": _COUNT, "other_lengths": _COUNT,
    "longest_29": _COUNT, "longest_29_from": _MONTH, "longest_30": _COUNT, "longest_30_from": _MONTH,
    **dict.fromkeys(CLOSENESSES, _COUNT),
    "age_least_h": _HOURS, "age_least_month": _MONTH, "age_most_h": _HOURS, "age_most_month": _MONTH,
    "age_mean_h": _HOURS,
    "before_conjunction": {**_COUNT, "description": "Months whose eve's sunset comes before the conjunction."},
    "without_sunset": {**_COUNT, "description": "Months on whose eve the Sun does not set: they have no age."},
    "unsettled_seams": {**_COUNT, "description": "Joints between two runs of years at which the walks do not meet."},
}

PAIR_AT_PLACE: Row = {
    "policy": _TEXT, "other": _TEXT, **_WHERE, "same": _COUNT, "agreement": _SHARE,
    "earlier": {**_COUNT, "description": "Months that policy begins before other."},
    "later": {**_COUNT, "description": "Months that policy begins after other."},
    "most_days_apart": _COUNT,
}


def schema() -> Row:
    """JSON Schema (2020-12) of ``survey.json``; readers must allow for more keys. CSV columns are its keys."""
    run = _object({"months": _COUNT, "from": _MONTH, "place": _TEXT}, "The longest run, and where it is found first.")
    age = {"anyOf": [{"type": "null"}, _object(
        {"hours": {"type": "number"}, "month": _MONTH, "place": _TEXT},
        "Hours from the conjunction to the sunset of the eve; negative before it.",
    )]}
    total = _object({
        "policy": _TEXT,
        "length_shares": _object({"29": _SHARE, "30": _SHARE, "other": _SHARE}, "Of all months at all places."),
        "longest_29": run, "longest_30": run,
        "margin_shares": _object(dict.fromkeys(CLOSENESSES, _SHARE), "Of all months at all places."),
        "age_least": age, "age_most": age, "age_mean_h": _HOURS,
        "before_conjunction_share": _SHARE, "without_sunset_share": _SHARE,
    }, "One policy. On a grid, shares and means count a place by the area of its cell.")
    pair = _object({
        "policy": _TEXT, "other": _TEXT, "agreement": _SHARE, "earlier_share": _SHARE, "later_share": _SHARE,
        "least_agreement": _SHARE, "most_agreement": _SHARE, "most_days_apart": _COUNT,
    }, "Two policies: the share of months begun on one day; the least and the most at any place.")
    place = _object({
        **PLACE,
        "policies": _list(_object(POLICY_AT_PLACE, "One policy at this place.")),
        "agreement": _list(_object(PAIR_AT_PLACE, "Two policies at this place.")),
    }, "One place.")
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "Moonwrit: survey.json: a long-run study of policies",
        **_object({
            "$schema": _TEXT,
            "survey": {"type": "object", "description": f"What was asked, as in {PLAN}."},
            "policies": _list(total),
            "agreement": _list(pair),
            "places": {**_list(place), "description": f"Empty where there are more than {MOST_PLACES}: see the CSV."},
        }, "Months of Hijri years first_year to last_year, by policy and place. Decisions are left aside."),
    }


def _object(properties: Row, description: str) -> Row:
    return {"type": "object", "description": description, "required": list(properties), "properties": properties}


def _list(items: Row) -> Row:
    return {"type": "array", "items": items}
