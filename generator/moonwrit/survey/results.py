"""The results of a survey, joined from its parts: tables by place in CSV, JSON in total with its schema."""

from __future__ import annotations

import os
from collections.abc import Callable
from contextlib import ExitStack, closing
from dataclasses import dataclass
from functools import partial
from itertools import combinations
from pathlib import Path

from moonwrit.errors import RequestError
from moonwrit.files import json_bytes
from moonwrit.survey.part import PAIR_SUMS, POLICY_SUMS, AtPlace, Part, cell_deg, gathered
from moonwrit.survey.plan import Plan
from moonwrit.survey.running import in_order, write
from moonwrit.survey.schema import TABLES, Row, schema
from moonwrit.survey.unit import CLOSENESSES

_FEW = 200
"""So many units are gathered before other processes have begun."""


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


def gather(
    plan: Plan, output: Path, workers: int = 1, each: Callable[[int, int], None] = lambda done, of: None,
) -> Results:
    """Write the CSV and JSON files of a survey whose units are all there: the same bytes whatever the ``workers``.

    ``each`` is told how many parts are done, of how many. Raises RequestError where a unit is missing or damaged.
    """
    totals = _Totals(plan)
    chunks = plan.place_chunks()
    if plan.unit_count <= _FEW:
        workers = 1
    paths = [output / f"{name}.csv" for name in TABLES]
    asides = [path.with_name(f".{path.name}.{os.getpid()}") for path in paths]
    try:
        with ExitStack() as opened:
            files = [opened.enter_context(aside.open("w", encoding="utf-8", newline="")) for aside in asides]
            for file, columns in zip(files, TABLES.values(), strict=True):
                file.write(",".join(columns) + "\n")
            parts = opened.enter_context(closing(in_order(partial(gathered, plan, output), chunks, workers)))
            for done, part in enumerate(parts, 1):
                for file, lines in zip(files, part.lines, strict=True):
                    file.write(lines)
                totals.add(part)
                each(done, len(chunks))
        for aside, path in zip(asides, paths, strict=True):
            os.replace(aside, path)
    except OSError as fault:
        raise RequestError(f"{output} cannot be written ({fault.strerror or fault})",
                           "free space, and run again: what is finished is kept") from None
    finally:
        for aside in asides:
            aside.unlink(missing_ok=True)
    results = totals.results()
    write(output / "survey.json", json_bytes(results.as_json()))
    write(output / "survey.schema.json", json_bytes(schema()))
    return results


class _Totals:
    """Sums over parts, as they come."""

    def __init__(self, plan: Plan) -> None:
        self.plan = plan
        self.weight = self.seams = 0
        self.policies: list[Row] = []
        self.agreement: list[Row] = []
        self.places: list[AtPlace] = []
        self.cells: dict[tuple[int, int], tuple[int, int]] = {}

    def add(self, part: Part) -> None:
        self.weight += part.weight
        self.seams += part.seams
        self.places += part.places
        for cell, (same, places) in part.cells.items():
            before = self.cells.get(cell, (0, 0))
            self.cells[cell] = before[0] + same, before[1] + places
        if not self.policies:
            self.policies, self.agreement = part.policies, part.agreement
            return
        for total, more in zip(self.policies, part.policies, strict=True):
            for name in (*POLICY_SUMS, "age_weight", "age_sum"):
                total[name] += more[name]
            # Of equals, the first stays.
            for days in ("longest_29", "longest_30"):
                total[days] = max(total[days], more[days], key=lambda run: int(run["months"]))
            for age, furthest in (("age_least", min), ("age_most", max)):
                known = [one[age] for one in (total, more) if one[age]]
                total[age] = furthest(known, key=lambda one: float(one["hours"]), default=None)
        for total, more in zip(self.agreement, part.agreement, strict=True):
            for name in PAIR_SUMS:
                total[name] += more[name]
            for name, furthest in (("least", min), ("most", max), ("most_days_apart", max)):
                total[name] = furthest(total[name], more[name])

    def results(self) -> Results:
        of = self.weight * self.plan.months
        deg = cell_deg(self.plan)

        def share(value: int) -> float:
            return round(value / of, 6)

        return Results(
            self.plan.as_json(),
            [
                {
                    "policy": policy,
                    "length_shares": {days: share(total[key]) for days, key in
                                      (("29", "of_29"), ("30", "of_30"), ("other", "other_lengths"))},
                    "longest_29": total["longest_29"],
                    "longest_30": total["longest_30"],
                    "margin_shares": {kind: share(total[kind]) for kind in CLOSENESSES},
                    "age_least": total["age_least"],
                    "age_most": total["age_most"],
                    "age_mean_h": (
                        round(total["age_sum"] / (1000 * total["age_weight"]), 3) if total["age_weight"] else None
                    ),
                    "before_conjunction_share": share(total["before_conjunction"]),
                    "without_sunset_share": share(total["without_sunset"]),
                }
                for policy, total in zip(self.plan.policies, self.policies, strict=True)
            ],
            [
                {
                    "policy": one, "other": other,
                    "agreement": share(total["same"]),
                    "earlier_share": share(total["earlier"]), "later_share": share(total["later"]),
                    "least_agreement": total["least"], "most_agreement": total["most"],
                    "most_days_apart": total["most_days_apart"],
                }
                for (one, other), total in zip(combinations(self.plan.policies, 2), self.agreement, strict=True)
            ],
            self.places,
            [
                (-60 + (row + 0.5) * deg, -180 + (column + 0.5) * deg, same / (places * self.plan.months))
                for (row, column), (same, places) in sorted(self.cells.items())
            ],
            self.seams,
        )
