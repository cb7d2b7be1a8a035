"""Which evening belongs to which civil date: the first sunset after the Sun's upper culmination that the
place's own clocks put on that date.

The reference is skyfield's almanac and the time zone database alone.
"""

from __future__ import annotations

from datetime import date, datetime, timedelta
from functools import cache
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from sky_values import PLACES, evening, places
from skyfield import almanac
from skyfield.api import wgs84
from slow_sky import kernel, timescale

from moonwrit.sky import Circumstances, Crossing, Places, ephemeris

# Days near a new moon, in both solstice seasons and at both equinoxes.
DAYS = (date(2026, 6, 15), date(2026, 12, 9), date(2026, 3, 19), date(2026, 9, 11), date(2024, 7, 5), date(2001, 6, 21))


@cache
def noon_and_sunset(latitude: float, longitude: float, zone: str, day: date) -> tuple[datetime, datetime | None]:
    """Noon that the clocks put on ``day``, and the sunset before the next noon, both by those clocks."""
    observer = kernel()["earth"] + wgs84.latlon(latitude, longitude)
    tz = ZoneInfo(zone)
    start, end = timescale().utc(day.year, day.month, day.day - 2), timescale().utc(day.year, day.month, day.day + 3)
    noons = almanac.find_transits(observer, kernel()["sun"], start, end)
    of_day = [at for at, local in enumerate(noons.astimezone(tz)) if local.date() == day]
    assert len(of_day) == 1
    noon = noons[of_day[0]]
    next_noon = noons[of_day[0] + 1]
    # From some way before: a search that starts at noon itself fails in polar night.
    sets, crosses = almanac.find_settings(observer, kernel()["sun"], timescale().tt_jd(noon.tt - 1.4), next_noon)
    real = [at.astimezone(tz) for at, crossed in zip(sets, crosses, strict=True) if crossed and at.tt > noon.tt]
    return noon.astimezone(tz), real[0] if real else None


def clock(c: Circumstances, tt: float, zone: str) -> datetime:
    ut = float(c.sky.ut(np.array(tt)))
    return (datetime(1, 1, 1, tzinfo=ZoneInfo("UTC")) + timedelta(days=ut - 1721425.5)).astimezone(ZoneInfo(zone))


def _alone(day: date, name: str) -> Circumstances:
    """The evening of a date far from any new moon, in a window of its own."""
    sky, noon_tt = ephemeris(), np.array([day.toordinal() + 1721425.0])
    return Circumstances(
        sky, sky.windows(noon_tt, 3.0), noon_tt, np.array([[day.toordinal()]]), places(name, zoned=True)
    )


@pytest.mark.parametrize("day", DAYS, ids=str)
def test_evenings_of_a_date_all_over_the_earth(day: date) -> None:
    c = evening(day, places(zoned=True))
    for k, (name, (latitude, longitude, zone)) in enumerate(PLACES.items()):
        noon, sunset = noon_and_sunset(latitude, longitude, zone, day)
        # Skyfield gives times in UTC, this package in UT1: within 0.9 s.
        assert abs(clock(c, c.noon_tt[0, 0, k], zone) - noon) < timedelta(seconds=1), name
        assert (c.sunset_state[0, 0, k] == Crossing.CROSSES) == (sunset is not None), name
        if sunset is not None:
            assert abs(clock(c, c.sunset_tt[0, 0, k], zone) - sunset) < timedelta(seconds=1), name


@pytest.mark.parametrize(
    ("name", "day"),
    [("Nome", date(2026, 6, 15)), ("Nome", date(2024, 7, 5)), ("Reykjavik", date(2001, 6, 21))],
)
def test_an_evening_may_begin_after_midnight_by_the_clock(name: str, day: date) -> None:
    """Midsummer sunsets at Nome come near 01:45, at Reykjavik soon after midnight (local almanacs, from memory);
    they close the day before."""
    c = evening(day, places(name, zoned=True))
    sunset = clock(c, c.sunset_tt.item(), PLACES[name][2])
    assert sunset.date() == day + timedelta(days=1)
    assert sunset.hour < 2


def test_late_clocks_do_not_move_the_evening() -> None:
    """Kashgar keeps the time of Beijing, Vigo that of Warsaw: sunset late, on the same date."""
    c = evening(date(2026, 6, 15), places("Kashgar", "Vigo", zoned=True))
    for k, name in enumerate(("Kashgar", "Vigo")):
        sunset = clock(c, c.sunset_tt[0, 0, k], PLACES[name][2])
        assert sunset.date() == date(2026, 6, 15)
        assert sunset.hour == 22


def test_both_sides_of_the_date_line() -> None:
    """Kiritimati and Honolulu share a meridian and Apia lies beside Pago Pago: the western date comes a day
    earlier, and a place without a zone keeps the date of its own mean time."""
    day = date(2026, 9, 11)
    c = evening(day, places("Honolulu", "Kiritimati", "Pago Pago", "Apia", zoned=True))
    plain = evening(day, places("Honolulu", "Kiritimati", "Pago Pago", "Apia"))
    noons = c.noon_tt[0, 0]
    # 0.46 degree of longitude is 1.8 minutes, 1.07 degrees 4.3 minutes.
    assert (noons[0] - noons[1]) * 24 == pytest.approx(24.0, abs=0.1)
    assert (noons[2] - noons[3]) * 24 == pytest.approx(24.0, abs=0.1)
    assert np.round(plain.noon_tt[0, 0] - noons).tolist() == [0, 1, 0, 1]


def test_a_place_that_changed_sides_of_the_date_line() -> None:
    """Samoa had no 30 December 2011: its evenings of the 29th and the 31st are one day apart."""
    before, after = (_alone(day, "Apia") for day in (date(2011, 12, 29), date(2011, 12, 31)))
    assert (after.noon_tt - before.noon_tt).item() == pytest.approx(1.0, abs=0.001)
    for c, day in ((before, date(2011, 12, 29)), (after, date(2011, 12, 31))):
        noon, _ = noon_and_sunset(*PLACES["Apia"], day)
        assert abs(clock(c, c.noon_tt.item(), "Pacific/Apia") - noon) < timedelta(seconds=1)


def test_longitudes_at_the_line_itself() -> None:
    """180 east and 180 west are one meridian under two dates."""
    day = date(2026, 9, 11)
    c = evening(day, Places.of([(-17.0, 180.0, 0.0, None), (-17.0, -180.0, 0.0, None)]))
    assert (c.noon_tt[0, 0, 1] - c.noon_tt[0, 0, 0]) == pytest.approx(1.0, abs=0.001)


@pytest.mark.parametrize(
    ("name", "day"), [("Nome", date(2024, 3, 10)), ("Vigo", date(2025, 3, 30)), ("Melbourne", date(2024, 10, 6))]
)
def test_a_change_of_clocks_does_not_move_noon(name: str, day: date) -> None:
    """Summer time begins on that date: noon comes a day after the noon before, an hour later by the clock."""
    zone = PLACES[name][2]
    before, c = (_alone(one, name) for one in (day - timedelta(days=1), day))
    assert (c.noon_tt - before.noon_tt).item() == pytest.approx(1.0, abs=0.001)
    by_the_clock = [clock(one, one.noon_tt.item(), zone).replace(tzinfo=None) for one in (before, c)]
    assert abs(by_the_clock[1] - by_the_clock[0] - timedelta(hours=25)) < timedelta(minutes=1)
