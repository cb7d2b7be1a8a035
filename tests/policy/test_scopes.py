"""Where a test must hold: named places, an outline, anywhere on Earth before a deadline."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from datetime import date
from itertools import pairwise
from math import asin, degrees, radians, sin
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from moonwrit.policy import Method, NamedPlace, method
from moonwrit.policy.conditions import Condition, Scoped
from moonwrit.policy.scopes import Anywhere, AtPlaces, Before, Scope, Within
from moonwrit.policy.walk import Era
from moonwrit.sky import Array, Circumstances, Evenings, Places, lunations
from moonwrit.sky.comparison import Comparison, Quantity, met
from moonwrit.sky.criteria import criterion
from moonwrit.sky.land import Outline, land

ISTANBUL = criterion("istanbul-5-8").rule()
MAKKAH = Places.of([(21.4225, 39.826, 0.0, ZoneInfo("Asia/Riyadh"))])


def evenings(year: int, months: int = 12) -> Evenings:
    """One evening for each lunation from a Hijri year on: by turns that of the conjunction's UTC date and the next."""
    moons = lunations((year - 1) * 12, (year - 1) * 12 + months - 1)
    day = moons.day + np.arange(months) % 2
    return Evenings(moons.ephemeris, moons.windows, moons.conjunction_tt, day[:, None])


def made_up(value: Callable[[Circumstances], Array]) -> Quantity:
    """A quantity with a value that is easy to foresee, and a day's change of 1."""
    return Quantity("made up", "", "", 1.0, lambda c: np.broadcast_to(value(c), c.sunset_tt.shape))


LATITUDE = made_up(lambda c: np.where(np.abs(c.places.latitude_deg) > 80, np.nan, c.places.latitude_deg))
"""The latitude itself; beyond 80 degrees as if there were no sunset."""


def places(*latitudes: float) -> AtPlaces:
    names = tuple(f"{latitude:g}" for latitude in latitudes)
    return AtPlaces(names, Places.of([(latitude, 0.0, 0.0, None) for latitude in latitudes]))


# --- named places ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("latitudes", "needed", "deciding"),
    [
        ((10, 30, 20), 0.0, 30),  # any: the best
        ((10, 30, 20), 1.0, 10),  # every: the worst
        ((10, 30, 20), 0.3, 30),
        ((10, 30, 20), 0.34, 20),
        ((10, 30, 20), 2 / 3, 20),
        ((10, 30, 20), 0.7, 10),
        ((10,), 0.5, 10),
        # A place without a sunset counts neither for nor against.
        ((10, 85, 30), 1.0, 10),
        ((10, 85, 30), 0.5, 30),
        ((85, 10, 89), 0.0, 10),
    ],
)
def test_the_place_with_which_enough_meet_the_test_decides(
    latitudes: tuple[float, ...], needed: float, deciding: float
) -> None:
    found = replace(places(*latitudes), needed=needed).decide(Comparison(LATITUDE, ">=", 15), evenings(1447, 2))
    assert found.latitude_deg[0, 0] == deciding
    assert found.share[0, 0] == deciding - 15
    assert latitudes[found.place[0, 0]] == deciding


def test_weights_say_how_much_a_place_counts() -> None:
    """The southern place alone has six tenths of the weight: 60 % hang on it, 40 % do not need it."""
    rule, asked = Comparison(LATITUDE, ">=", 15), evenings(1447, 1)
    weighed = replace(places(10, 20, 30), weights=np.array([6.0, 2.0, 2.0]))
    assert replace(weighed, needed=0.4).decide(rule, asked).latitude_deg[0, 0] == 20
    assert replace(weighed, needed=0.6).decide(rule, asked).latitude_deg[0, 0] == 10


@pytest.mark.parametrize(("needed", "share"), [(0.0, [2, -2, 3, 3]), (0.5, [2, -2, 3, 2]), (1.0, [2, -3, 2, 1])])
def test_each_evening_is_judged_by_the_places_that_have_a_sunset_then(needed: float, share: list[float]) -> None:
    """Four evenings at three places, with two, one or none of them left out; met or not."""
    asked, nothing = evenings(1447, 4), np.nan
    shares = np.array([[nothing, nothing, 2], [nothing, -2, -3], [3, nothing, 2], [1, 2, 3]])
    by_evening = Quantity("made up", "", "", 1.0, lambda c: shares[np.searchsorted(asked.day[:, 0], c.day)])
    found = replace(places(10, 20, 30), needed=needed).decide(Comparison(by_evening, ">=", 0), asked)
    assert found.share[:, 0].tolist() == share
    for row, place in enumerate(found.place[:, 0]):
        assert shares[row, place] == share[row]
        assert found.latitude_deg[row, 0] == (10, 20, 30)[place]


def test_without_any_sunset_nothing_is_met() -> None:
    found = places(85, 89).decide(Comparison(LATITUDE, ">=", 15), evenings(1447, 1))
    assert np.isnan(found.share).all()
    assert not places(85, 89).met(Comparison(LATITUDE, ">=", 15), evenings(1447, 1)).any()


def test_a_fallback_stands_in_where_the_sun_does_not_set() -> None:
    """Its index comes after those of the places, so that the evidence can name it."""
    there = replace(
        places(10, 85), needed=1.0, fallback=Places.of([(5, 0, 0, None), (45, 0, 0, None)]), fallback_names=("5", "45")
    )
    found = there.decide(Comparison(LATITUDE, ">=", 50), evenings(1447, 1))
    assert found.latitude_deg[0, 0] == 10  # the fallback of the place with a sunset is not asked
    found = there.decide(Comparison(LATITUDE, "<=", 20), evenings(1447, 1))
    assert (found.latitude_deg[0, 0], found.place[0, 0]) == (45, 3)


# --- anywhere on Earth ----------------------------------------------------------------------------

DEADLINES = {
    "none": None,
    "the end of the date": Before(hour_ut=24.0),
    "noon": Before(hour_ut=12.0),
    "dawn at Makkah": Before(dawn_at=MAKKAH),
}


@pytest.mark.parametrize("deadline", DEADLINES)
def test_the_search_finds_what_a_grid_over_the_whole_earth_finds(deadline: str) -> None:
    """On a dozen evenings, against every 2 degrees of longitude and 1 of latitude. The search may be better than
    the grid by what changes between its points (half of 2 degrees is 4 minutes, 0.003 of a day), and not worse.
    Only before the conjunction, where the elongation shrinks westward and the test fails by far, may it be."""
    before, asked = DEADLINES[deadline], evenings(1447)
    found = Anywhere(before).decide(ISTANBUL, asked)
    longitude, latitude = (a.ravel() for a in np.meshgrid(np.arange(-180, 180.1, 2), np.arange(-60, 60.1, 1)))
    c = asked.at(Places(latitude, longitude, np.zeros_like(latitude)))
    share = ISTANBUL.share(c)
    if before is not None:
        share = np.where(c.sunset_tt <= before.tt(asked)[..., None], share, -np.inf)
    brute = share.max(axis=-1)
    assert (found.share >= brute - np.where(brute > -0.2, 1e-4, 0.1)).all()
    assert (found.share <= brute + 0.01).all()
    # Failures alone would prove little.
    assert (brute > -0.2).sum() >= 6


@pytest.mark.parametrize("deadline", DEADLINES)
def test_the_place_found_is_one_where_the_test_gives_that_share(deadline: str) -> None:
    before, asked = DEADLINES[deadline], evenings(1448)
    found = Anywhere(before).decide(ISTANBUL, asked)
    latitude, longitude = found.latitude_deg[..., None], found.longitude_deg[..., None]
    c = asked.at(Places(latitude, longitude, np.zeros_like(latitude)))
    assert ISTANBUL.share(c)[..., 0] == pytest.approx(found.share, abs=1e-9)
    assert (np.abs(found.latitude_deg) <= 60).all()
    assert (np.abs(found.longitude_deg) <= 180).all()
    if before is not None:
        assert (c.sunset_tt[..., 0] <= before.tt(asked)).all()


def test_a_later_deadline_takes_in_more_of_the_earth() -> None:
    asked = evenings(1447)
    shares = [Anywhere(Before(hour_ut=hour)).decide(ISTANBUL, asked).share for hour in (8.0, 16.0, 24.0, 32.0)]
    shares.append(Anywhere().decide(ISTANBUL, asked).share)
    for sooner, later in pairwise(shares):
        assert (later >= sooner - 1e-4).all()
    # Eight hours are a third of a day's change, less where the altitude decides in high latitudes.
    assert (shares[1] > shares[0] + 0.03).all()


def test_a_deadline_at_dawn_is_that_of_the_same_night() -> None:
    """The night that begins with the evening of D at Makkah ends there about ten hours after its sunset."""
    asked = evenings(1447)
    hours = (Before(dawn_at=MAKKAH).tt(asked) - asked.at(MAKKAH).sunset_tt[..., 0]) * 24
    assert (hours > 8).all()
    assert (hours < 12.5).all()


# --- how fine the search is -----------------------------------------------------------------------


def with_scopes(condition: Condition, other: Callable[[Scope], Scope]) -> Condition:
    if isinstance(condition, Scoped):
        return Scoped(condition.rule, other(condition.scope))
    return replace(condition, parts=tuple(with_scopes(part, other) for part in condition.parts))


def halved(scope: Scope) -> Scope:
    return replace(scope, step_deg=scope.step_deg / 2) if isinstance(scope, Anywhere | Within) else scope


@pytest.mark.parametrize("name", ["istanbul-1978", "istanbul-2016"])
def test_a_grid_twice_as_fine_changes_no_date(name: str) -> None:
    asked = method(name)
    finer = replace(asked, eras=tuple(Era(e.first, with_scopes(e.condition, halved)) for e in asked.eras))
    assert finer.starts(1400, 1475) == asked.starts(1400, 1475)


class _Searched:
    """The scope, which answers from its full search alone."""

    def __init__(self, scope: Scope) -> None:
        self.decide = scope.decide

    def met(self, rule: Comparison, evenings: Evenings) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
        return met(self.decide(rule, evenings).share)


def test_the_quick_answer_is_that_of_the_whole_search() -> None:
    """For the condition that has all kinds of scope, on evenings of twelve years."""
    condition = method("istanbul-2016").eras[0].condition
    asked = evenings(1440, 12 * 12)
    whole = with_scopes(condition, lambda scope: _Searched(scope))  # type: ignore[arg-type,return-value]
    answers = condition.met(asked)
    assert (answers == whole.met(asked)).all()
    assert answers.any() != answers.all()


# --- outlines -------------------------------------------------------------------------------------


def box(west: float, south: float, east: float, north: float) -> tuple[Array, ...]:
    ring = [(west, south), (east, south), (east, north), (west, north), (west, south)]
    return (np.array(ring, dtype=np.float64),)


@pytest.mark.parametrize("needed", [0.1, 0.25, 0.5, 0.9])
def test_a_share_of_an_area_counts_square_kilometres(needed: float) -> None:
    """From the equator to 60 N a share s of the area lies north of the latitude whose sine is (1 - s) sin 60."""
    scope = Within(Outline((box(10, 0, 30, 60),)), needed, step_deg=0.5)
    found = scope.decide(Comparison(LATITUDE, ">=", 0), evenings(1447, 1))
    assert found.latitude_deg[0, 0] == pytest.approx(degrees(asin((1 - needed) * sin(radians(60)))), abs=0.5)
    assert found.place[0, 0] == -1


def test_somewhere_inside_is_the_best_point_inside() -> None:
    """Two islands, one with a lake at its northern end, where the test would be met best."""
    lake = box(2, 28, 8, 31)
    outline = Outline(((box(0, 0, 10, 30)[0], lake[0]), box(40, -10, 50, 20)))
    scope = Within(outline, step_deg=0.5)
    northernmost = scope.decide(Comparison(LATITUDE, ">=", 0), evenings(1447, 1))
    assert northernmost.latitude_deg[0, 0] == pytest.approx(30, abs=0.1)
    assert not 2 < northernmost.longitude_deg[0, 0] < 8
    southernmost = scope.decide(Comparison(LATITUDE, "<=", 0), evenings(1447, 1))
    assert southernmost.latitude_deg[0, 0] == pytest.approx(-10, abs=0.1)
    assert 40 <= southernmost.longitude_deg[0, 0] <= 50


def test_an_outline_is_searched_as_well_as_by_a_fine_grid() -> None:
    """Australia (the land's own outline), on a dozen evenings, against every quarter of a degree."""
    australia, asked = land().holding((134.0, -25.0)), evenings(1447)
    found = Within(australia, step_deg=0.5).decide(ISTANBUL, asked)
    longitude, latitude = australia.grid(0.25)
    brute = ISTANBUL.share(asked.at(Places(latitude, longitude, np.zeros_like(latitude)))).max(axis=-1)
    assert (found.share >= brute - 1e-3).all()
    assert (found.share <= brute + 0.01).all()
    assert australia.contains(found.longitude_deg, found.latitude_deg).all()


@pytest.mark.parametrize("size", [1.2, 0.4, 0.02])
def test_a_region_smaller_than_the_grid_is_still_searched(size: float) -> None:
    """A town's outline answers as the town does."""
    outline = Outline((box(50.6, 26.1, 50.6 + size, 26.1 + size),))
    asked, rule = evenings(1447), Comparison(LATITUDE, ">=", 26)
    for scope in (Within(outline, step_deg=0.5), Within(outline, 0.5, step_deg=0.5)):
        assert scope.met(rule, asked).all()
        found = scope.decide(rule, asked)
        assert outline.contains(found.longitude_deg, found.latitude_deg).all()


def test_the_smallest_island_of_a_region_counts() -> None:
    """Somewhere inside a large island and a small one is in the small one, where the test is met there alone."""
    outline = Outline((box(0, 0, 10, 10), box(60.1, 40.1, 60.2, 40.2)))
    scope, asked = Within(outline, step_deg=0.5), evenings(1447)
    assert scope.met(Comparison(LATITUDE, ">=", 40), asked).all()
    assert (scope.decide(Comparison(LATITUDE, ">=", 40), asked).longitude_deg > 60).all()
    assert not scope.met(Comparison(LATITUDE, ">=", 41), asked).any()


# --- the date line --------------------------------------------------------------------------------

APIA = NamedPlace("Apia", -13.83, -171.77, 0.0, ZoneInfo("Pacific/Apia"))
PAGO_PAGO = NamedPlace("Pago Pago", -14.28, -170.70, 0.0, ZoneInfo("Pacific/Pago_Pago"))
"""130 km apart; from memory, to 0.01 degree. Samoa's clocks left out 30 December 2011 (IANA tz database)."""


def at(place: NamedPlace, first: int, last: int) -> list[date]:
    asked = Method("here", "Here", "", "calculation", eras=(Era(0, Scoped(ISTANBUL, place.scope())),))
    return list(asked.starts(first, last))


def test_the_same_evening_has_two_dates_on_the_two_sides_of_the_date_line() -> None:
    """Neighbours see the same Moon four minutes apart: Apia, whose date is a day further, begins a date later."""
    both = zip(at(APIA, 1435, 1475), at(PAGO_PAGO, 1435, 1475), strict=True)
    gaps = [(west - east).days for west, east in both]
    assert set(gaps) <= {0, 1, 2}
    assert gaps.count(1) / len(gaps) > 0.97  # the others hang on those minutes


def test_a_place_that_changed_its_side_of_the_date_line_keeps_to_its_clocks() -> None:
    """Until 2011 Apia wrote the date that Pago Pago writes."""
    both = zip(at(APIA, 1415, 1432), at(PAGO_PAGO, 1415, 1432), strict=True)
    gaps = [(west - east).days for west, east in both]
    assert gaps.count(0) / len(gaps) > 0.97


def test_both_sides_in_one_scope_each_on_its_own_date() -> None:
    """Any of the two is Pago Pago, whose evening of the same date comes a day later; every one is Apia."""
    two = AtPlaces(("Apia", "Pago Pago"), Places.of([APIA.row, PAGO_PAGO.row]), 0.0)
    asked = evenings(1447)
    assert (two.decide(ISTANBUL, asked).place == 1).all()
    assert (replace(two, needed=1.0).decide(ISTANBUL, asked).place == 0).all()
