"""The engine against one that knows nothing of arrays: skyfield and the definitions, one evening after the other.

Places, beginnings and policies are drawn at random. Where the slow value is nearer to the threshold than the two skies
agree (tests/sky holds them to a second and an arc second), the walk is left there: neither answer would be wrong.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass
from datetime import UTC, date, datetime
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest

sys.path.insert(0, str(Path(__file__).resolve().parent.parent / "sky"))

from sky_values import PLACES
from slow_sky import Site, kernel, timescale

from moonwrit.policy.conditions import Scoped
from moonwrit.policy.evening import evening_at
from moonwrit.policy.published import NamedPlace
from moonwrit.policy.scopes import AtPlaces
from moonwrit.policy.walk import Era, walk
from moonwrit.sky import Places
from moonwrit.sky.comparison import Comparison, Quantity, age, altitude, elongation, lag

MONTHS = 6
# Quantity, the thresholds drawn from, and how far from the threshold both skies surely agree.
POLICIES: dict[str, tuple[Quantity, tuple[float, float], float]] = {
    "lag": (lag(), (5.0, 45.0), 0.05),
    "age": (age(), (2.0, 22.0), 0.001),
    "altitude": (altitude("topocentric"), (1.0, 9.0), 0.005),
    "elongation": (elongation("topocentric"), (4.0, 12.0), 0.002),
}


def noon_tt(day: int) -> float:
    return day + 1721424.5 + 0.5 + 69 / 86400


def local_date(tt: float, zone: ZoneInfo) -> date:
    moment: datetime = timescale().tt_jd(tt).utc_datetime()
    return moment.astimezone(zone).date()


def conjunction_tt(near_tt: float) -> float:
    """Where the apparent geocentric longitudes of Moon and Sun agree."""
    earth = kernel()["earth"]

    def difference(tt: float) -> float:
        at = earth.at(timescale().tt_jd(tt))
        moon, sun = (
            at.observe(kernel()[body]).apparent().ecliptic_latlon(epoch="date")[1].degrees for body in ("moon", "sun")
        )
        return float((moon - sun + 180) % 360 - 180)

    for _ in range(8):
        near_tt -= difference(near_tt) / 12.19
    return near_tt


@dataclass(frozen=True)
class Slow:
    """The evenings of one place."""

    site: Site
    zone: ZoneInfo

    def sunset_tt(self, day: int) -> float:
        """The first sunset after the upper culmination that falls on the civil date ``day``."""
        for shift in (-1, 0, 1):
            culmination = self.site.culmination_tt("sun", noon_tt(day + shift) - self.site.longitude / 360)
            if local_date(culmination, self.zone) == date.fromordinal(day):
                sunset, _ = self.site.first_crossing_tt("sun", culmination, 1.0)
                assert sunset is not None
                return sunset
        raise AssertionError(f"no culmination on {date.fromordinal(day)}")

    def value(self, name: str, day: int) -> float:
        sunset = self.sunset_tt(day)
        at = np.array([sunset])
        if name == "age":
            return (sunset - conjunction_tt(sunset)) * 24
        if name == "lag":
            moonset, is_up = self.site.first_crossing_tt("moon", sunset, 1.2)
            return (moonset - sunset) * 1440 if is_up and moonset is not None else 0.0
        if name == "altitude":
            return float(self.site.apparent("moon", at).altaz()[0].degrees[0])
        sun = self.site.apparent("sun", at)
        return float(self.site.apparent("moon", at).separation_from(sun).degrees[0])


@pytest.mark.parametrize("seed", range(12))
def test_the_walk_is_that_of_a_slow_engine(seed: int) -> None:
    """Expected: from the same first day the same months, 29 or 30 days by what the slow sky says of each 29th."""
    drawn = np.random.default_rng(seed)
    name = list(POLICIES)[seed % len(POLICIES)]
    quantity, (low, high), surely = POLICIES[name]
    threshold = round(float(drawn.uniform(low, high)), 3)
    around = [known for known in PLACES.values() if abs(known[0]) < 60]
    latitude, longitude, zone = around[drawn.integers(len(around))]
    latitude, longitude = (round(float(x + drawn.uniform(-2, 2)), 2) for x in (latitude, longitude))
    first = int(drawn.integers((1325 - 1) * 12, (1470 - 1) * 12))

    place = NamedPlace("here", latitude, longitude, 0.0, ZoneInfo(zone))
    scope = AtPlaces(("here",), Places.of([place.row]))
    _, steps = walk((Era(0, Scoped(Comparison(quantity, ">", threshold), scope)),), first, first + MONTHS)
    steps = steps[-MONTHS - 2:]

    slow, start, judged = Slow(Site(latitude, longitude), ZoneInfo(zone)), steps[0].start, 0
    for step in steps[1:]:
        value = slow.value(name, start + 28)
        if abs(value - threshold) < surely:
            break
        start += 29 if value > threshold else 30
        assert (step.start, step.met) == (start, value > threshold), f"{value} against {threshold}"
        judged += 1
    assert judged >= MONTHS // 2


@pytest.mark.parametrize("latitude", [-55.0, -33.0, 0.0, 21.0, 48.0, 59.0])
@pytest.mark.parametrize("on", [date(1937, 3, 14), date(1999, 12, 22), date(2026, 6, 21), date(2053, 9, 1)])
def test_moving_west_delays_sunset(latitude: float, on: date) -> None:
    """Expected: for each degree 4 minutes of UTC, to within what the Sun's declination changes meanwhile."""
    places = [NamedPlace(f"{west}", latitude, 20.0 - west, 0.0, ZoneInfo("UTC")) for west in range(0, 40, 4)]
    sunsets = [datetime.fromisoformat(str(row["sunset_utc"])).astimezone(UTC) for row in evening_at(on, places)]
    minutes = np.diff([sunset.timestamp() for sunset in sunsets]) / 60
    assert np.all(minutes > 0)
    np.testing.assert_allclose(minutes, 16.0, atol=0.08)
