"""Rising, setting and twilight against three libraries and against a slow search of our own.

Times are compared through altitude: the altitude that this package gives at the other's instant, against the
altitude at which the event is. An arcsecond is 0.07 s where a body sets straight down, and many seconds where
it grazes the horizon.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from functools import cache
from typing import cast

import astronomy
import ephem
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from sky_values import PLACES, evening, places
from skyfield import almanac
from skyfield.api import wgs84
from slow_sky import Array, Body, Site, kernel, timescale

from moonwrit.sky import Circumstances, Crossing, Horizon, Instant, Places, Windows, ephemeris, lunations
from moonwrit.sky.horizon import MOON_RADIUS_KM, Turn, crossing, culmination, direction, noon_tt

EPHEM_EPOCH = 2415020.0
AU_KM = 149597870.7
SUN_ARCSEC = 959.63  # semi-diameter at 1 au: Auwers, as in the almanacs


@dataclass(frozen=True)
class Event:
    body: Body
    turn: Turn
    altitude_deg: float | None = None


EVENTS = {
    "sunset": Event("sun", "set"), "moonset": Event("moon", "set"), "sunrise": Event("sun", "rise"),
    "moonrise": Event("moon", "rise"), "dusk": Event("sun", "set", -18.0), "dawn": Event("sun", "rise", -18.0),
}
TURN_DAYS = {"sun": 1.0, "moon": 1.035}


@cache
def looked_at() -> tuple[Windows, np.ndarray[tuple[int, ...], np.dtype[np.int64]]]:
    """24 lunations of 1974-2010, two evenings each. Not later: the libraries guess delta-T differently, by 37 s
    in 2050, which is 18 arcsec of the Moon."""
    some = np.arange(17037 - 320, 17037 + 130, 19)
    mine = lunations(int(some[0]), int(some[-1]))
    at = some - some[0]
    return mine.windows[at], mine.day[at][:, None] + np.array([0, 1])


@cache
def anchors(name: str) -> Array:
    """The upper culmination that the event follows (or, rising, comes before); [lunation, evening, place]."""
    windows, day = looked_at()
    event, sky, where = EVENTS[name], ephemeris(), places()
    if event.body == "moon":
        return culmination(windows, "moon", noon_tt(sky, windows, day, where), where)
    return noon_tt(sky, windows, day if event.turn == "set" else day + 1, where)


def of_every_evening(name: str, find: Callable[[float, float, float, Event], float | None]) -> Array:
    """What ``find(anchor_ut, latitude, longitude, event)`` answers in UT, as TT; NaN where there is no event
    before (rising: after) the next culmination."""
    anchor_ut = ephemeris().ut(anchors(name))
    found = np.full(anchor_ut.shape, np.nan)
    for i, j, k in np.ndindex(anchor_ut.shape):
        latitude, longitude, _ = list(PLACES.values())[k]
        ut = find(float(anchor_ut[i, j, k]), latitude, longitude, EVENTS[name])
        if ut is not None and abs(ut - anchor_ut[i, j, k]) < TURN_DAYS[EVENTS[name].body]:
            found[i, j, k] = ut
    return np.where(np.isnan(found), np.nan, ephemeris().tt(np.nan_to_num(found, nan=2451545.0)))


def mine(name: str) -> Array:
    windows, _ = looked_at()
    event = EVENTS[name]
    tt, state = crossing(windows, event.body, event.turn, anchors(name), places(), altitude_deg=event.altitude_deg)
    assert np.array_equal(np.isnan(tt), state != Crossing.CROSSES)
    return tt


def excess_arcsec(name: str, tt: Array, sun_deg: Callable[[Array], Array], moon_km: float) -> Array:
    """Altitude of the body's centre at ``tt`` less that of the event, for a Sun and Moon of these sizes."""
    windows, _ = looked_at()
    event = EVENTS[name]
    seen = direction(windows, event.body, tt, places())
    if event.altitude_deg is not None:
        target: Array = np.full(tt.shape, event.altitude_deg)
    elif event.body == "sun":
        target = -34 / 60 - sun_deg(seen.distance_km)
    else:
        target = -34 / 60 - np.degrees(np.arcsin(moon_km / seen.distance_km))
    return (np.degrees(seen.altitude_rad) - target) * 3600


def hold(name: str, theirs: Array, limit_arcsec: float, sun_deg: Callable[[Array], Array], moon_km: float) -> None:
    my_tt = mine(name)
    assert np.array_equal(np.isnan(theirs), np.isnan(my_tt)), "they disagree whether it happens"
    happens = np.isfinite(theirs)
    assert happens.sum() > 800
    assert np.abs(excess_arcsec(name, theirs, sun_deg, moon_km)[happens]).max() < limit_arcsec
    # And the same event, not one a turn away: a grazing Sun of another size may differ by minutes.
    assert np.abs(theirs - my_tt)[happens].max() < 5 / 1440


def _pyephem(anchor_ut: float, latitude: float, longitude: float, event: Event) -> float | None:
    observer = ephem.Observer()
    observer.lat, observer.lon, observer.pressure = str(latitude), str(longitude), 0
    observer.horizon = "-0:34" if event.altitude_deg is None else str(event.altitude_deg)
    observer.date = anchor_ut - EPHEM_EPOCH
    body = ephem.Sun() if event.body == "sun" else ephem.Moon()
    find = observer.next_setting if event.turn == "set" else observer.previous_rising
    try:
        return cast(float, find(body, use_center=event.altitude_deg is not None) + EPHEM_EPOCH)
    except (ephem.AlwaysUpError, ephem.NeverUpError):
        return None


def _astronomy_engine(anchor_ut: float, latitude: float, longitude: float, event: Event) -> float | None:
    body = astronomy.Body.Sun if event.body == "sun" else astronomy.Body.Moon
    rising = event.turn == "rise"
    search = (
        body, astronomy.Observer(latitude, longitude, 0),
        astronomy.Direction.Rise if rising else astronomy.Direction.Set,
        astronomy.Time(anchor_ut - 2451545), -1.04 if rising else 1.04,
    )
    if event.altitude_deg is None:
        found = astronomy.SearchRiseSet(*search)
    else:
        found = astronomy.SearchAltitude(*search, event.altitude_deg)
    return None if found is None else cast(float, found.ut + 2451545)


@pytest.mark.parametrize("name", EVENTS)
def test_pyephem(name: str) -> None:
    """Its places are good to an arcsecond or two; 1.6 arcsec measured. (In other years it lost one moonrise of
    1,200, at 66.5 N, and missed two grazing ones by 0.01 and 0.03 degree; the slow search below finds all three
    where this package has them.)"""

    def sun_deg(distance_km: Array) -> Array:
        return SUN_ARCSEC / 3600 * AU_KM / distance_km

    hold(name, of_every_evening(name, _pyephem), 3.0, sun_deg, MOON_RADIUS_KM)


@pytest.mark.parametrize("name", EVENTS)
def test_astronomy_engine(name: str) -> None:
    """It promises an arc minute and does far better: 2.9 arcsec measured."""

    def sun_deg(distance_km: Array) -> Array:
        return np.degrees(np.arcsin(695700.0 / distance_km))

    hold(name, of_every_evening(name, _astronomy_engine), 4.0, sun_deg, 1738.1)


@pytest.mark.parametrize("name", EVENTS)
def test_skyfield(name: str) -> None:
    """Same ephemeris; its observer has diurnal aberration (0.32 arcsec), and its Moon a radius of 1737.4 km, which
    the comparison takes. Its answers flagged False are transits, not settings."""
    windows, _ = looked_at()
    event, anchor = EVENTS[name], anchors(name)
    find = almanac.find_settings if event.turn == "set" else almanac.find_risings
    theirs = np.full(anchor.shape, np.nan)
    some = range(0, len(windows), 4)
    turn = TURN_DAYS[event.body] * (1 if event.turn == "set" else -1)
    for k, (latitude, longitude, _) in enumerate(PLACES.values()):
        observer = kernel()["earth"] + wgs84.latlon(latitude, longitude)
        for i in some:
            ends = sorted([*anchor[i, :, k], *(anchor[i, :, k] + turn)])
            t, crosses = find(
                observer, kernel()[event.body], timescale().tt_jd(ends[0]), timescale().tt_jd(ends[-1]),
                horizon_degrees=event.altitude_deg,
            )
            for j in range(anchor.shape[1]):
                days = (t.tt[np.asarray(crosses, dtype=bool)] - anchor[i, j, k]) / turn
                inside = days[(days > 0) & (days < 1)]
                if len(inside):
                    theirs[i, j, k] = anchor[i, j, k] + inside.min() * turn
    my_tt = mine(name)
    assert np.array_equal(np.isnan(theirs[some]), np.isnan(my_tt[some]))
    happens = np.isfinite(theirs)
    assert happens.sum() > 200
    apart = excess_arcsec(name, theirs, lambda distance_km: np.full_like(distance_km, 16 / 60), 1737.4)
    assert np.abs(apart[happens]).max() < 0.35


# --- the slow search ---------------------------------------------------------------------------------

latitudes = st.one_of(st.floats(-60, 60), st.floats(60, 72), st.floats(-72, -60), st.floats(-89, 89))
longitudes = st.floats(-180, 180)
lunation_numbers = st.integers(17037 - 1200, 17037 + 600)
evening_numbers = st.integers(-1, 2)

# Left out of the windows: diurnal aberration (0.32 arcsec), and that the annual aberration of the Moon, up to
# 20.5 arcsec, is taken at the Earth's centre, 1 degree of parallax away (0.36 arcsec).
SLOW_ARCSEC = {"sun": 0.35, "moon": 0.7}


@settings(max_examples=60, deadline=None, derandomize=True)
@given(latitudes, longitudes, lunation_numbers, evening_numbers)
def test_the_slow_search(latitude: float, longitude: float, lunation: int, after: int) -> None:
    sky, near = ephemeris(), lunations(lunation, lunation)
    day = near.day[:, None] + after
    where = Places.of([(latitude, longitude, 0.0, None)])
    c = Circumstances(sky, near.windows, near.conjunction_tt, day, where)
    site = Site(latitude, longitude)

    mean_noon_tt = float(sky.tt(day[0, 0] + 1721425.0 - longitude / 360))
    noon = site.culmination_tt("sun", mean_noon_tt)
    # An hour angle is good to 0.01 arcsec, but the topocentric one of skyfield carries diurnal aberration, 20 ms,
    # more towards the poles of the sky, where a setting does not hang on it.
    assert abs(float(c.noon_tt.item()) - noon) * 86400 < 0.1
    next_noon = site.culmination_tt("sun", noon + 1)
    moon_noon = site.culmination_tt("moon", noon)

    dusk = c.at_sun_depression(18.0).tt
    dusk_state = crossing(c.windows, "sun", "set", c.noon_tt, where, altitude_deg=-18.0)[1]
    dawn = c.dawn_tt(18.0)
    _agree(site, "sun", noon, 1.0, None, c.sunset_tt, int(c.sunset_state.item()))
    _agree(site, "moon", moon_noon, 1.035, None, c.moonset_tt, int(c.moonset_state.item()))
    _agree(site, "sun", noon, 1.0, -18.0, dusk, int(dusk_state.item()))
    _agree(site, "sun", next_noon, -1.0, -18.0, dawn, None)


def _agree(
    site: Site, body: Body, from_tt: float, days: float, altitude_deg: float | None, found: Array, state: int | None
) -> None:
    slow, starts_above = site.first_crossing_tt(body, from_tt, days, altitude_deg)
    tt, limit = float(found.item()), SLOW_ARCSEC[body] / 3600
    if slow is None:
        assert np.isnan(tt)
        assert state in (None, Crossing.STAYS_ABOVE if starts_above else Crossing.STAYS_BELOW)
        return
    assert state in (None, Crossing.CROSSES)
    assert abs(site.excess_deg(body, np.array([tt]), altitude_deg)[0]) < limit
    if abs(tt - slow) * 86400 > 2:
        # A grazing one: nowhere between the two is the body further from the horizon than that.
        between = site.excess_deg(body, np.linspace(tt, slow, 50), altitude_deg)
        assert np.abs(between).max() < limit


# --- where it does not set ---------------------------------------------------------------------------


def high_north(day: date, *names: str) -> Circumstances:
    return evening(day, places(*names))


@pytest.mark.parametrize(
    ("day", "name", "state"),
    [
        # Published seasons (Tromso: midnight sun 20 May to 22 July, polar night 27 November to 15 January;
        # McMurdo: about 24 October to 20 February, and 24 April to 19 August; from memory).
        (date(2024, 6, 6), "Tromso", Crossing.STAYS_ABOVE),
        (date(2024, 12, 1), "Tromso", Crossing.STAYS_BELOW),
        (date(2024, 9, 3), "Tromso", Crossing.CROSSES),
        (date(2024, 6, 6), "McMurdo", Crossing.STAYS_BELOW),
        (date(2024, 12, 1), "McMurdo", Crossing.STAYS_ABOVE),
        (date(2024, 12, 1), "Longyearbyen", Crossing.STAYS_BELOW),
        (date(2024, 6, 6), "Longyearbyen", Crossing.STAYS_ABOVE),
        (date(2024, 12, 1), "Reykjavik", Crossing.CROSSES),
        (date(2024, 6, 6), "Reykjavik", Crossing.CROSSES),
    ],
)
def test_midnight_sun_and_polar_night(day: date, name: str, state: Crossing) -> None:
    c = high_north(day, name)
    assert c.sunset_state.item() == state
    assert np.isnan(c.sunset_tt.item()) == (state != Crossing.CROSSES)


def test_without_a_sunset_there_is_no_number() -> None:
    """Whatever hangs on the sunset is not a number, on the same evening as its neighbours have one."""
    c = high_north(date(2024, 6, 6), "Tromso", "Oslo")
    of_evening = {
        name: getattr(c, name) for name in ("sunset_tt", "lag_min", "age_h", "best_tt")
    }
    names = [name for name in vars(Instant) if name.endswith(("_deg", "_arcmin", "_share")) and name[0] != "_"]
    instants = {
        f"{when} {name}": getattr(moment, name)
        for when, moment in (("sunset", c.sunset), ("best", c.best))
        for name in names if name != "limb_altitude_deg"
    }
    limbs = {f"limb {limb}": c.sunset.limb_altitude_deg(limb, refracted=True) for limb in (-1, 0, 1)}
    assert len(instants) >= 2 * 17
    for name, value in (of_evening | instants | limbs).items():
        assert value.shape == (1, 1, 2), name
        assert np.isnan(value).tolist() == [[[True, False]]], name


def test_a_moon_that_does_not_set_before_it_culminates_again() -> None:
    """North of the Arctic Circle, Moon far north, with a sunset: the lag has no end."""
    found = _without_moonset(Crossing.STAYS_ABOVE)
    for c, site, moon_noon in found:
        assert c.lag_min.item() == np.inf
        assert c.best_tt.item() == c.sunset_tt.item()
        assert site.excess_deg("moon", moon_noon + np.arange(0, 1.035, 0.01)).min() > 0


def test_a_moon_that_stays_below_the_horizon() -> None:
    """Its state is that of its turn: one that rises hours later, on the way to its next culmination, was
    below all the same, and the lag must not say that it never sets."""
    found = _without_moonset(Crossing.STAYS_BELOW)
    rises_later = 0
    for c, site, moon_noon in found:
        assert c.lag_min.item() == -np.inf
        assert c.best_tt.item() == c.sunset_tt.item()
        excess = site.excess_deg("moon", moon_noon + np.arange(0, 1.035, 0.01))
        assert excess[:50].max() < 0
        assert site.excess_deg("moon", c.sunset_tt.ravel())[0] < 0
        rises_later += int(excess.max() > 0)
    assert rises_later >= 5


def _without_moonset(state: Crossing) -> list[tuple[Circumstances, Site, float]]:
    """Forty evenings at 66 to 69 N with a sunset and without a moonset, and when that Moon culminates."""
    mine = lunations(17037, 17037 + 260)
    sites = [Site(latitude, 20.0) for latitude in (66.0, 67.5, 69.0)]
    where = Places.of([(site.latitude, site.longitude, 0.0, None) for site in sites])
    day = mine.day[:, None] + np.array([0, 1, 2])
    c = Circumstances(mine.ephemeris, mine.windows, mine.conjunction_tt, day, where)
    which = np.argwhere((c.moonset_state == state) & (c.sunset_state == Crossing.CROSSES))
    assert len(which) >= 40
    found = []
    for i, j, k in which[:: len(which) // 40][:40]:
        row = np.array([i])
        one = Circumstances(
            mine.ephemeris, mine.windows[row], mine.conjunction_tt[row], day[row, j : j + 1], where.pick(np.array([k]))
        )
        found.append((one, sites[k], sites[k].culmination_tt("moon", float(c.noon_tt[i, j, k]))))
    return found


# --- other horizons ----------------------------------------------------------------------------------


def test_dip_lowers_the_horizon_of_a_high_place() -> None:
    """PyEphem with its horizon lowered by the same angle: 1.758 arcmin times the root of the metres."""
    day, metres = date(2023, 7, 18), 400.0
    where = Places.of([(-5.36, 105.31, metres, None)])
    flat = evening(day, where)
    dipped = Circumstances(
        flat.sky, flat.windows, flat.conjunction_tt, flat.day, where, Horizon(dip=True)
    )
    dip_deg = 1.758 / 60 * metres**0.5
    observer = ephem.Observer()
    observer.lat, observer.lon, observer.elevation, observer.pressure = "-5.36", "105.31", metres, 0
    observer.date = float(flat.sky.ut(flat.noon_tt).item()) - EPHEM_EPOCH
    for dip, c in ((0.0, flat), (dip_deg, dipped)):
        observer.horizon = str(-34 / 60 - dip)
        for body, tt in ((ephem.Sun(), c.sunset_tt), (ephem.Moon(), c.moonset_tt)):
            theirs = observer.next_setting(body) + EPHEM_EPOCH
            # PyEphem's Sun has its own size of the day, 15' 44" here: 16 arcsec, 1.1 s.
            assert abs(theirs - c.sky.ut(tt).item()) * 86400 < 1.5
    # A degree of altitude is four minutes or a little more.
    assert dip_deg * 4 < (dipped.sunset_tt - flat.sunset_tt).item() * 1440 < dip_deg * 4.6


def test_dip_of_the_sea_horizon() -> None:
    """The geometric dip acos(R / (R + h)) less a sixth part of its square for refraction (terrestrial
    refraction of 1/6, common practice): within 1 %. None below the sea, none unless asked for."""
    metres = np.array([-30.0, 0.0, 2.0, 100.0, 1000.0, 4000.0])
    geometric = np.degrees(np.arccos(6371000 / (6371000 + np.maximum(metres, 0))))
    assert Horizon(dip=True).dip_deg(metres) == pytest.approx(geometric * (1 - 1 / 6) ** 0.5, rel=0.01)
    assert Horizon().dip_deg(metres).tolist() == [0.0] * 6


def test_a_place_given_alone_or_among_others() -> None:
    """Answers do not depend on company: high and low latitudes are solved apart and put back in order."""
    windows, day = looked_at()
    names = ["Tromso", "Jakarta", "McMurdo", "Oslo"]
    together = noon_tt(ephemeris(), windows, day, places(*names))
    tt, state = crossing(windows, "sun", "set", together, places(*names))
    for k, name in enumerate(names):
        alone = noon_tt(ephemeris(), windows, day, places(name))
        one_tt, one_state = crossing(windows, "sun", "set", alone, places(name))
        assert np.array_equal(one_tt[..., 0], tt[..., k], equal_nan=True)
        assert np.array_equal(one_state[..., 0], state[..., k])
