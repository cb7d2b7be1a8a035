"""Maps of an evening, held against the circumstances of single places and against skyfield alone."""

from __future__ import annotations

from datetime import date
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from sky_values import PLACES
from slow_sky import Site, kernel, timescale

from moonwrit.sky import Circumstances, Evenings, Places, lunations
from moonwrit.sky.criteria import criterion, cubic
from moonwrit.sky.ephemeris import Array
from moonwrit.sky.horizon import reckoned_longitude_deg
from moonwrit.sky.maps import Grid, over, spanned

FIRST, LAST = 17347, 17372
EARTH = Grid.over(-180, -60, 180, 60, 0.5)
QUANTITY = criterion("yallop-1997").quantity
assert QUANTITY is not None
q = QUANTITY.of


def moonset_tt(c: Circumstances) -> Array:
    return c.moonset_tt


def sunset_tt(c: Circumstances) -> Array:
    return c.sunset_tt


def evening(row: int, after: int = 1) -> Evenings:
    """That many days after the date of a conjunction of 2025 to 2027, in the lunation's own window."""
    moons = lunations(FIRST, LAST)
    pick = slice(row, row + 1)
    return Evenings(moons.ephemeris, moons.windows[pick], moons.conjunction_tt[pick], moons.day[pick, None] + after)


@pytest.mark.parametrize("row", [0, 5, 12, 19])
@pytest.mark.parametrize("after", [0, 1])
def test_a_map_is_the_circumstances_of_its_points(row: int, after: int) -> None:
    """At 500 random points of a half-degree map: q within 1e-5, moonset within 0.1 s, sunset within 0.01 s."""
    asked = evening(row, after)
    fields = over(EARTH, spanned(asked), q, moonset_tt, sunset_tt)
    pick = np.random.default_rng(row).choice(EARTH.shape[0] * EARTH.shape[1], 500, replace=False)
    c = asked.at(EARTH.places().pick(pick))
    for field, of, within in zip(fields, (q, moonset_tt, sunset_tt), (1e-5, 0.1 / 86400, 0.01 / 86400), strict=True):
        assert field.shape == EARTH.shape
        theirs = of(c)[0, 0]
        assert np.isfinite(theirs).all()
        assert np.abs(field.ravel()[pick] - theirs).max() < within


@pytest.mark.parametrize("name", ["Jakarta", "Cape Town", "London", "Ushuaia", "Honolulu", "Oslo"])
def test_a_map_agrees_with_skyfield_alone(name: str) -> None:
    """Sunset, moonset and Yallop's q by skyfield's full apparent places and sampled altitudes: 0.1 s and 1e-5."""
    latitude, longitude, _ = PLACES[name]
    asked = evening(12)
    grid = Grid.over(longitude - 20, max(-60, latitude - 20), longitude + 20, min(60, latitude + 20), 0.5)
    at = int(np.abs(grid.latitude_deg - latitude).argmin()), int(np.abs(grid.longitude_deg - longitude).argmin())
    site = Site(float(grid.latitude_deg[at[0]]), float(grid.longitude_deg[at[1]]))
    q_here, moonset, sunset = (float(field[at]) for field in over(grid, spanned(asked), q, moonset_tt, sunset_tt))
    noon = float(asked.day[0, 0]) + 1721424.5 + 0.5 - site.longitude / 360
    theirs, _ = site.first_crossing_tt("sun", noon, 1.0)
    assert theirs is not None
    assert abs(sunset - theirs) * 86400 < 0.1
    set_tt, _ = site.first_crossing_tt("moon", site.culmination_tt("moon", noon), 1.0)
    assert set_tt is not None
    assert abs(moonset - set_tt) * 86400 < 0.1
    assert abs(q_here - slow_q(site, theirs, set_tt)) < 1e-5


def slow_q(site: Site, sunset: float, moonset: float) -> float:
    """Yallop's q from skyfield's positions: geocentric vectors against the geodetic zenith (Yallop 1997)."""
    t = timescale().tt_jd(sunset + 4 / 9 * max(0.0, moonset - sunset))
    up = np.array([
        np.cos(np.radians(site.latitude)) * np.cos(sidereal := np.radians(t.gast * 15 + site.longitude)),
        np.cos(np.radians(site.latitude)) * np.sin(sidereal),
        np.sin(np.radians(site.latitude)),
    ])
    sun, moon = (
        t.M @ kernel()["earth"].at(t).observe(kernel()[body]).apparent().xyz.km for body in ("sun", "moon")
    )
    far = np.linalg.norm(moon)
    sun, moon = sun / np.linalg.norm(sun), moon / far
    altitude = np.arcsin(moon @ up)
    parallax = np.arcsin(6378.137 / far)
    semidiameter = 0.27245 * parallax * (1 + np.sin(altitude) * np.sin(parallax))
    width = np.degrees(semidiameter * (1 - sun @ moon)) * 60
    return float((np.degrees(altitude - np.arcsin(sun @ up)) - cubic(width, 11.8371)) / 10)


def test_where_the_sun_does_not_set_there_is_nothing() -> None:
    """Midsummer of 2025: no sunset and no q beyond the polar circle, both below 60 degrees; nor is anything made up
    where the Moon does not set."""
    asked = evening(5)
    assert date.fromordinal(int(asked.day[0, 0])).month == 6
    grid = Grid.over(-180, 40, 180, 80, 4)
    found, sunset, lag = over(grid, asked, q, sunset_tt, lambda c: c.lag_min)
    north = grid.latitude_deg > 67
    assert np.isnan(sunset[north]).all()
    assert np.isnan(found[north]).all()
    assert np.isnan(lag[north]).all()
    assert np.isfinite(found[grid.latitude_deg < 60]).all()


def test_steep_latitudes_are_those_of_single_places() -> None:
    """Between 61 and 80 degrees every point has the state and the times that its circumstances have."""
    asked = evening(3)
    grid = Grid.over(-20, 50, 60, 80, 5)
    moonset, lag = over(grid, asked, moonset_tt, lambda c: c.lag_min)
    c = asked.at(grid.places())
    np.testing.assert_allclose(moonset.ravel(), c.moonset_tt[0, 0], rtol=0, atol=1e-6, equal_nan=True)
    np.testing.assert_allclose(lag.ravel(), c.lag_min[0, 0], rtol=0, atol=1e-3, equal_nan=True)


@pytest.mark.parametrize("name", ["Apia", "Kiritimati", "Pago Pago", "Suva", "Melbourne"])
def test_places_beyond_the_date_line_stand_where_their_date_comes(name: str) -> None:
    """At its reckoned longitude a grid gives the sunset that the place's own clocks date so."""
    latitude, longitude, zone = PLACES[name]
    asked = evening(9)
    reckoned = reckoned_longitude_deg(ZoneInfo(zone), longitude, int(asked.day[0, 0]))
    assert reckoned == pytest.approx(longitude + (360 if name in ("Apia", "Kiritimati") else 0))
    grid = Grid(np.array([latitude - 1, latitude]), np.array([reckoned, reckoned + 1]))
    (sunset,) = over(grid, asked, sunset_tt)
    c = asked.at(Places.of([(latitude, longitude, 0.0, ZoneInfo(zone))]))
    assert abs(sunset[1, 0] - c.sunset_tt[0, 0, 0]) * 86400 < 0.01


def test_a_grid_holds_both_ends() -> None:
    """A span that the step does not divide is divided evenly."""
    grid = Grid.over(-180, -60, 180, 61, 2)
    assert (grid.latitude_deg[0], grid.latitude_deg[-1]) == (-60, 61)
    assert (grid.longitude_deg[0], grid.longitude_deg[-1]) == (-180, 180)
    assert np.diff(grid.latitude_deg).max() == pytest.approx(121 / 60)
