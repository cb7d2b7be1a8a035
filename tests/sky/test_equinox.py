"""March equinoxes against skyfield's seasons and astronomy-engine."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import astronomy
from skyfield import almanac
from slow_sky import kernel, timescale

from moonwrit.sky.equinox import march_equinox

YEARS = range(1900, 2053)


def test_equinoxes_of_skyfield() -> None:
    """Same ephemeris; given to the second, and UT1 for UTC: 0.5 + 0.9 s since 1972, when UTC begins."""
    years = [year for year in YEARS if 1972 <= year <= 2026]
    t, season = almanac.find_discrete(
        timescale().utc(years[0], 1, 1), timescale().utc(years[-1], 12, 31), almanac.seasons(kernel())
    )
    theirs = t[season == 0].utc_datetime()
    assert len(theirs) == len(years)
    for year, instant in zip(years, theirs, strict=True):
        assert abs(march_equinox(year) - instant) < timedelta(seconds=1.4), year


def test_equinoxes_of_astronomy_engine() -> None:
    """It promises an arc minute, 24 minutes of the Sun's year; its Sun is good to an arcsecond or two, 24 to 48 s,
    and its delta-T differs by 22 s in 2050."""
    for year in YEARS:
        theirs = datetime(2000, 1, 1, 12, tzinfo=UTC) + timedelta(days=astronomy.Seasons(year).mar_equinox.ut)
        assert abs(march_equinox(year) - theirs) < timedelta(seconds=60), year
