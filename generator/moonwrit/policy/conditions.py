"""Conditions: rules in their scopes, singly or combined, and what each found on the evenings asked."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date, datetime

import numpy as np

from moonwrit.policy.months import Closeness, Evidence, Finding, Margin, Note
from moonwrit.policy.scopes import AtPlaces, Flags, Scope, Verdict
from moonwrit.sky import Circumstances, Evenings, Places
from moonwrit.sky.comparison import All, Comparison, Rule, met
from moonwrit.sky.described import described, instant

EDGE_SHARE = 0.02
CLOSE_SHARE = 0.15
"""Closeness by share of a day's change: 0.02 of it is about 0.2 degree or one minute of lag, what
refraction at the horizon and the choice of conventions can account for."""

_DECIMALS = {"deg": 4, "arcmin": 4, "min": 2, "h": 3, "%": 3, "": 4}


@dataclass(frozen=True)
class Scoped:
    """A rule that must hold in a scope."""

    rule: Rule
    scope: Scope

    def __str__(self) -> str:
        return f"{self.rule}, {self.scope}"

    def met(self, evenings: Evenings) -> Flags:
        """[lunation, evening]"""
        return self.scope.met(self.rule, evenings)


@dataclass(frozen=True)
class Every:
    """Every condition must hold."""

    parts: tuple[Condition, ...]

    def __str__(self) -> str:
        return "all of: " + "; ".join(f"({part})" for part in self.parts)

    def met(self, evenings: Evenings) -> Flags:
        answers = self.parts[0].met(evenings)
        for part in self.parts[1:]:
            if answers.any():
                answers[answers] = part.met(evenings.chosen(answers))[:, 0]
        return answers


@dataclass(frozen=True)
class Either:
    """One condition is enough."""

    parts: tuple[Condition, ...]

    def __str__(self) -> str:
        return "one of: " + "; ".join(f"({part})" for part in self.parts)

    def met(self, evenings: Evenings) -> Flags:
        answers = self.parts[0].met(evenings)
        for part in self.parts[1:]:
            if not answers.all():
                answers[~answers] = part.met(evenings.chosen(~answers))[:, 0]
        return answers


Condition = Scoped | Every | Either


def evidence(condition: Condition, evenings: Evenings) -> list[tuple[Evidence, Margin]]:
    """What each row rests on. ``evenings`` has one evening a row; one pair of evidence and margin each."""
    parts = [_Part(scoped, evenings) for scoped in _scoped(condition)]
    return [_row_evidence(condition, parts, evenings, row) for row in range(len(evenings.day))]


def _scoped(condition: Condition) -> list[Scoped]:
    if isinstance(condition, Scoped):
        return [condition]
    return [scoped for part in condition.parts for scoped in _scoped(part)]


class _Part:
    """One scoped rule on the rows asked: its verdicts, and every leaf's values."""

    def __init__(self, scoped: Scoped, evenings: Evenings) -> None:
        self.scoped = scoped
        self.verdict: Verdict = scoped.scope.decide(scoped.rule, evenings)
        self.c: Circumstances = evenings.at(self._places())
        self.described = described(self.c)
        shape = self.c.sunset_tt.shape
        self.values = {
            leaf: np.broadcast_to(leaf.quantity.of(self.c), shape) for leaf in scoped.rule.leaves()
        }

    def _places(self) -> Places:
        """The named places of the scope, or the point that decides each row, as [row, 1, 1]."""
        scope = self.scoped.scope
        if isinstance(scope, AtPlaces):
            return scope.all_places()
        latitude = self.verdict.latitude_deg[..., None]
        return Places(latitude, self.verdict.longitude_deg[..., None], np.zeros_like(latitude))

    def index(self, row: int) -> tuple[int, int, int]:
        return row, 0, max(0, int(self.verdict.place[row, 0]))

    def place_name(self, row: int) -> str:
        scope, at = self.scoped.scope, int(self.verdict.place[row, 0])
        if isinstance(scope, AtPlaces):
            return (scope.names + scope.fallback_names)[at]
        return point_name(float(self.verdict.latitude_deg[row, 0]), float(self.verdict.longitude_deg[row, 0]))

    def share_of(self, leaf: Comparison, row: int) -> float:
        return float(leaf.share_of(self.values[leaf][self.index(row)]))

    def finding(self, leaf: Comparison, row: int) -> Finding:
        value = float(self.values[leaf][self.index(row)])
        share = self.share_of(leaf, row)
        decimals = _DECIMALS[leaf.quantity.unit]
        known = bool(np.isfinite(value))
        gap = value - leaf.threshold if leaf.sign in (">=", ">") else leaf.threshold - value
        return Finding(
            leaf.quantity.name, leaf.quantity.frame, self.place_name(row),
            round(value, decimals) + 0.0 if known else None,
            leaf.sign, leaf.threshold, leaf.quantity.unit, bool(met(np.array(share))),
            round(gap, decimals) + 0.0 if known else None,
        )


def _row_evidence(
    condition: Condition, parts: list[_Part], evenings: Evenings, row: int
) -> tuple[Evidence, Margin]:
    part, leaf, share = _deciding(condition, iter(parts), row)
    conjunction: datetime | None = instant(evenings.sky, float(evenings.conjunction_tt[row]))
    notes: list[Note] = []
    if np.isnan(part.values[leaf][part.index(row)]):
        notes.append(Note(
            "At %(place)s the Sun does not set on this date, so the test cannot be met there.",
            {"place": part.place_name(row)},
        ))
    for each in parts:
        scope = each.scoped.scope
        if isinstance(scope, AtPlaces) and each.verdict.place[row, 0] >= len(scope.names):
            notes.append(Note(
                "The Sun does not set at %(place)s on this date: judged at %(fallback)s, as the policy says.",
                {"place": scope.names[int(each.verdict.place[row, 0]) - len(scope.names)],
                 "fallback": each.place_name(row)},
            ))
    finding = part.finding(leaf, row)
    return (
        Evidence(
            date.fromordinal(int(evenings.day[row, 0])), bool(share >= 0), part.place_name(row), conjunction,
            tuple(each.finding(one, row) for each in parts for one in each.scoped.rule.leaves()),
            part.described(part.index(row)), tuple(notes),
        ),
        margin_of(finding, share),
    )


def _deciding(condition: Condition, parts: Iterator[_Part], row: int) -> tuple[_Part, Comparison, float]:
    """The part and leaf on which the row turns, and its share (NaN becomes minus infinity: not met)."""
    if isinstance(condition, Scoped):
        part = next(parts)
        leaf, share = _deciding_leaf(condition.rule, part, row)
        return part, leaf, share
    found = [_deciding(each, parts, row) for each in condition.parts]
    choose = min if isinstance(condition, Every) else max
    return choose(found, key=lambda one: one[2])


def _deciding_leaf(rule: Rule, part: _Part, row: int) -> tuple[Comparison, float]:
    if isinstance(rule, Comparison):
        share = part.share_of(rule, row)
        return rule, -np.inf if np.isnan(share) else share
    found = [_deciding_leaf(each, part, row) for each in rule.parts]
    return (min if isinstance(rule, All) else max)(found, key=lambda one: one[1])


def margin_of(finding: Finding, share: float) -> Margin:
    """The margin of a month, from the finding that decides it."""
    size = abs(share)
    closeness: Closeness = "edge" if size < EDGE_SHARE else "close" if size < CLOSE_SHARE else "wide"
    return Margin(
        finding.quantity, finding.value, finding.threshold, finding.margin, finding.unit,
        round(share, 5) + 0.0 if np.isfinite(share) else None, closeness,
    )


def point_name(latitude_deg: float, longitude_deg: float) -> str:
    """A point on the map in words: "12.5 N, 34.0 W"."""
    north = f"{abs(latitude_deg):.1f} {'N' if latitude_deg >= 0 else 'S'}"
    east = f"{abs(longitude_deg):.1f} {'E' if longitude_deg >= 0 else 'W'}"
    return f"{north}, {east}"
