"""Conditions on made-up quantities whose values are easy to foresee: the answer, what decides it, and what is told."""

from __future__ import annotations

from dataclasses import replace
from itertools import product
from typing import Any

import numpy as np
import pytest

from moonwrit.policy.conditions import Condition, Either, Every, Scoped, evidence, margin_of, point_name
from moonwrit.policy.months import Evidence, Finding, Margin
from moonwrit.policy.scopes import Anywhere, AtPlaces
from moonwrit.sky import Evenings, Places, lunations
from moonwrit.sky.comparison import All, Comparison, Quantity, Rule, Sign
from moonwrit.sky.comparison import Any as OneOf

MOONS = lunations((1447 - 1) * 12, (1447 - 1) * 12 + 7)
ASKED = Evenings(MOONS.ephemeris, MOONS.windows, MOONS.conjunction_tt, (MOONS.day + 1)[:, None])
"""Eight evenings, one of each lunation."""
HERE = AtPlaces(("Here",), Places.of([(10.0, 20.0, 0.0, None)]))


def always(value: float, unit: str = "", name: str = "made up", per_day: float = 1.0) -> Quantity:
    return Quantity(name, "by hand", unit, per_day, lambda c: np.full(c.sunset_tt.shape, value))


def on_rows(values: tuple[float, ...]) -> Quantity:
    """A value for each of the eight evenings, wherever it is asked and in whatever company."""
    days = ASKED.day[:, 0]
    return Quantity("by row", "by hand", "", 1.0, lambda c: np.broadcast_to(
        np.array(values)[np.searchsorted(days, c.day)][..., None], c.sunset_tt.shape))


def found(condition: Condition) -> tuple[Evidence, Margin]:
    return evidence(condition, ASKED)[0]


def here(quantity: Quantity, sign: Sign = ">=", threshold: float = 0.0) -> Scoped:
    return Scoped(Comparison(quantity, sign, threshold), HERE)


# --- the answer -----------------------------------------------------------------------------------


def test_conditions_joined_are_met_as_their_parts_are() -> None:
    """All eight cases of three parts, each on an evening of its own: all of them, one of them, and nested."""
    cases = list(product([1.0, -1.0], repeat=3))
    a, b, c = (here(on_rows(column)) for column in zip(*cases, strict=True))
    truth = np.array(cases) > 0
    whole: list[tuple[Condition, Any]] = [
        (Every((a, b, c)), truth.all(axis=1)),
        (Either((a, b, c)), truth.any(axis=1)),
        (Every((a, Either((b, c)))), truth[:, 0] & (truth[:, 1] | truth[:, 2])),
        (Either((a, Every((b, c)))), truth[:, 0] | (truth[:, 1] & truth[:, 2])),
        (Every((a,)), truth[:, 0]),
    ]
    for joined, expected in whole:
        assert joined.met(ASKED)[:, 0].tolist() == expected.tolist()
        assert [why.met for why, _ in evidence(joined, ASKED)] == expected.tolist()


def test_the_least_share_decides_where_all_must_hold_and_the_greatest_where_one_may() -> None:
    """Shares, not values: 30 of 100 a day is less than 1 of 2. The findings are all told, in the order written."""
    parts = [here(always(30.0, name="slow", per_day=100.0)), here(always(1.0, name="quick", per_day=2.0)),
             here(always(0.4, name="plain"))]
    every, either = Every(tuple(parts)), Either(tuple(parts))
    conditions: list[tuple[Condition, str, float]] = [
        (every, "slow", 0.3), (either, "quick", 0.5),
        (Every((either, parts[2])), "plain", 0.4), (Either((every, parts[2])), "plain", 0.4),
    ]
    for joined, quantity, share in conditions:
        why, margin = found(joined)
        assert (margin.quantity, margin.day_share) == (quantity, share)
        assert [finding.quantity for finding in why.findings][:3] == ["slow", "quick", "plain"]
    rules = tuple(part.rule for part in parts)
    asked: list[tuple[Rule, str]] = [
        (All(rules), "slow"), (OneOf(rules), "quick"), (All((OneOf(rules), rules[2])), "plain"),
    ]
    for rule, quantity in asked:
        why, margin = found(Scoped(rule, HERE))
        assert margin.quantity == quantity
        assert [finding.quantity for finding in why.findings][:3] == ["slow", "quick", "plain"]


def test_the_place_of_the_part_that_decides_is_named() -> None:
    there = AtPlaces(("There",), Places.of([(-10.0, 20.0, 0.0, None)]))
    parts = here(always(1.0)), Scoped(Comparison(always(2.0), ">=", 0.0), there)
    assert [found(joined)[0].place for joined in (Every(parts), Either(parts))] == ["Here", "There"]
    assert [finding.place for finding in found(Every(parts))[0].findings] == ["Here", "There"]


# --- what is told ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("sign", "value", "margin", "is_met"),
    [
        (">=", 12.0, 2.0, True), (">=", 10.0, 0.0, True), (">=", 9.0, -1.0, False),
        (">", 12.0, 2.0, True), (">", 10.0, 0.0, False), (">", 9.0, -1.0, False),
        ("<=", 12.0, -2.0, False), ("<=", 10.0, 0.0, True), ("<=", 9.0, 1.0, True),
        ("<", 12.0, -2.0, False), ("<", 10.0, 0.0, False), ("<", 9.0, 1.0, True),
    ],
)
def test_a_margin_is_positive_where_the_test_is_met(sign: Sign, value: float, margin: float, is_met: bool) -> None:
    """Zero is met only where equality is enough, and has no sign."""
    why, decided = found(here(always(value), sign, 10.0))
    (finding,) = why.findings
    assert finding == Finding("made up", "by hand", "Here", value, sign, 10.0, "", is_met, margin)
    assert (decided.value, decided.threshold, decided.margin, why.met) == (value, 10.0, margin, is_met)
    assert "-0.0" not in f"{finding.margin} {decided.margin} {decided.day_share}"
    assert str(finding) == f"made up {value:g} {_told(sign, is_met)} 10 (Here)"


def _told(sign: Sign, is_met: bool) -> str:
    """The sign as it stands between the numbers that were found."""
    return sign if is_met else {">=": "<", ">": "<=", "<=": ">", "<": ">="}[sign]


@pytest.mark.parametrize(
    ("unit", "told"),
    [("deg", 1.2346), ("arcmin", 1.2346), ("min", 1.23), ("h", 1.235), ("%", 1.235), ("", 1.2346)],
)
def test_numbers_are_told_as_finely_as_they_are_known(unit: str, told: float) -> None:
    """By their unit; and what is rounded to zero has no sign."""
    why, margin = found(here(always(1.23456789, unit), ">=", 0.0))
    (finding,) = why.findings
    assert finding.value == finding.margin == margin.value == margin.margin == told
    assert finding.unit == margin.unit == unit
    assert margin.day_share == 1.23457
    why, margin = found(here(always(-1e-9, unit), ">=", 0.0))
    assert "-0.0" not in f"{why.findings} {margin}"


@pytest.mark.parametrize(
    ("share", "closeness"),
    [
        (0.0, "edge"), (0.0199, "edge"), (0.02, "close"), (0.1499, "close"), (0.15, "wide"), (3.0, "wide"),
        (float("inf"), "wide"),
    ],
)
@pytest.mark.parametrize("sign", [1, -1])
def test_closeness_is_by_share_of_a_days_change(share: float, closeness: str, sign: int) -> None:
    """Below 0.02 edge, below 0.15 close, beyond wide, met or not; what has no end has no number."""
    finding = Finding("q", "", "Here", 1.0, ">=", 0.0, "", True, 1.0)
    margin = margin_of(finding, sign * share)
    assert margin.closeness == closeness
    assert margin.day_share == (None if np.isinf(share) else sign * share)


def test_what_has_no_value_is_told_as_none_and_not_met() -> None:
    """As where there is no sunset: beside a part that has one it is the part that fails, and a note says so."""
    nothing = here(always(float("nan"), name="nothing"))
    for condition in (nothing, Every((here(always(1.0)), nothing))):
        why, margin = found(condition)
        assert why.met is False
        assert (margin.quantity, margin.value, margin.margin, margin.day_share) == ("nothing", None, None, None)
        assert [str(note) for note in why.notes] == [
            "At Here the Sun does not set on this date, so the test cannot be met there."]
    why, margin = found(Either((here(always(1.0)), nothing)))
    assert (why.met, margin.quantity, why.notes) == (True, "made up", ())
    assert [(finding.value, finding.met) for finding in why.findings] == [(1.0, True), (None, False)]


def test_a_fallback_is_named_beside_the_place_that_it_stands_for() -> None:
    """Of two places that have no sunset each has its own; the one that decides is told."""
    latitude = Quantity("latitude", "by hand", "deg", 1.0, lambda c: np.broadcast_to(
        np.where(np.abs(c.places.latitude_deg) > 80, np.nan, c.places.latitude_deg), c.sunset_tt.shape))
    dark = AtPlaces(
        ("One", "Two"), Places.of([(85.0, 0.0, 0.0, None), (89.0, 0.0, 0.0, None)]),
        fallback=Places.of([(5.0, 0.0, 0.0, None), (45.0, 0.0, 0.0, None)]), fallback_names=("Five", "Forty-five"),
    )
    for needed, place, stands_for, value in [(1.0, "Five", "One", 5.0), (0.0, "Forty-five", "Two", 45.0)]:
        why, margin = found(Scoped(Comparison(latitude, ">=", 0.0), replace(dark, needed=needed)))
        assert (why.place, margin.value) == (place, value)
        assert [str(note) for note in why.notes] == [
            f"The Sun does not set at {stands_for} on this date: judged at {place}, as the policy says."]


def test_the_point_that_decides_is_told_in_degrees() -> None:
    """The search for the greatest latitude ends at 60 degrees, that for the least at -60."""
    latitude = Quantity("latitude", "by hand", "deg", 1.0, lambda c: np.broadcast_to(
        c.places.latitude_deg, c.sunset_tt.shape))
    for sign, place in ((">=", "60.0 N, 180.0 W"), ("<=", "60.0 S, 180.0 W")):
        why, margin = found(Scoped(Comparison(latitude, sign, 0.0), Anywhere()))  # type: ignore[arg-type]
        assert (why.place, why.findings[0].place) == (place, place)
        assert margin.value == (60.0 if sign == ">=" else -60.0)


@pytest.mark.parametrize(
    ("latitude", "longitude", "name"),
    [(12.54, -34.0, "12.5 N, 34.0 W"), (-0.1, 179.99, "0.1 S, 180.0 E"), (0.0, 0.0, "0.0 N, 0.0 E")],
)
def test_points_have_names(latitude: float, longitude: float, name: str) -> None:
    assert point_name(latitude, longitude) == name
