"""Dawn and sunset of the days of fasting, against searches of skyfield and of PyEphem.

Times are rounded to the minute, so each is held to lie in the very minute in which the other library
has it, unless that one is within ``TOLERANCE_S`` of the minute's ends.
"""

from __future__ import annotations

from datetime import UTC, date, datetime, timedelta
from itertools import pairwise
from typing import Any
from zoneinfo import ZoneInfo

import ephem
import pytest
from skyfield import almanac
from skyfield.api import wgs84

from moonwrit.content.models import Fasting
from moonwrit.observances.fasting import FastingDay, FastingMonth, Missing, fasting_months
from moonwrit.policy import FIXED, Evidence, Month, NamedPlace
from moonwrit.sky import ephemeris

DAY = timedelta(days=1)
TOLERANCE_S = 1.0
"""0.9 s at most between UT1, which is printed, and UTC, which skyfield gives; the libraries' Suns are within 0.1 s."""

# Town centres to 0.01 degree, from memory: any point would do.
PLACES = {
    name: NamedPlace(name, latitude, longitude, 0.0, ZoneInfo(zone))
    for name, latitude, longitude, zone in (
        ("Jakarta", -6.20, 106.83, "Asia/Jakarta"),
        ("Mecca", 21.42, 39.83, "Asia/Riyadh"),
        ("Istanbul", 41.01, 28.98, "Europe/Istanbul"),
        ("London", 51.50, -0.13, "Europe/London"),
        ("New York", 40.71, -74.01, "America/New_York"),
        ("Casablanca", 33.57, -7.59, "Africa/Casablanca"),
        ("Cape Town", -33.92, 18.42, "Africa/Johannesburg"),
        ("Melbourne", -37.81, 144.96, "Australia/Melbourne"),
        ("Ushuaia", -54.80, -68.30, "America/Argentina/Ushuaia"),
        ("Kiritimati", 1.87, -157.40, "Pacific/Kiritimati"),
        ("Apia", -13.83, -171.77, "Pacific/Apia"),
        ("Oslo", 59.91, 10.75, "Europe/Oslo"),
        ("Reykjavik", 64.15, -21.94, "Atlantic/Reykjavik"),
        ("Tromso", 69.65, 18.96, "Europe/Oslo"),
        ("Longyearbyen", 78.22, 15.63, "Arctic/Longyearbyen"),
    )
}

# A month of thirty days in each season, roughly where month 9 fell or falls; nothing hangs on the day it began.
MONTHS = [date(2010, 8, 11), date(2015, 6, 18), date(2026, 2, 19), date(2030, 12, 26)]


def month(starts: date, number: int = 9, length: int = 30, window: tuple[date, date] | None = None) -> Month:
    return Month(1447, number, starts, length, "arithmetic", "expected" if window else "settled", "by-hand", FIXED,
                 Evidence(starts - DAY, None), window)


def table(starts: date, *names: str, depression: float = 18, rounding: Any = "minute-safe") -> FastingMonth:
    declared = Fasting(dawn_depression=depression, rounding=rounding)
    (found,) = fasting_months(declared, [month(starts)], {name: PLACES[name] for name in names})
    assert [one.day for one in found.at[names[0]]] == list(range(1, 31))
    return found


def noon(on: date, place: NamedPlace) -> datetime:
    """Roughly the Sun's culmination that the clocks of the place put on the date, as UTC."""
    mean = datetime(on.year, on.month, on.day, 12, tzinfo=UTC) - timedelta(hours=place.longitude_deg / 15)
    assert place.zone is not None
    return mean + (on - mean.astimezone(place.zone).date())


def hold(found: datetime | Missing, theirs: datetime | None, *, up: bool, what: object) -> None:
    """``found`` is the minute of ``theirs``, rounded up or down, but for the tolerance."""
    assert isinstance(found, datetime) == (theirs is not None), what
    if isinstance(found, datetime) and theirs is not None:
        assert found.second == found.microsecond == 0
        beyond = (found - theirs if up else theirs - found).total_seconds()
        assert -TOLERANCE_S < beyond < 60 + TOLERANCE_S, what


def test_dawn_and_sunset_by_skyfield_for_places_of_both_hemispheres() -> None:
    """Its ``dark_twilight_day``: the change from dark to astronomical twilight, 18 degrees, and that from day to civil
    twilight; where it knows no such change between the midnights around a noon, there is none here either."""
    sky: Any = ephemeris()
    held = missing = 0
    for starts in MONTHS:
        found = table(starts, *PLACES)
        for name, days in found.at.items():
            place = PLACES[name]
            states = almanac.dark_twilight_day(sky.kernel, wgs84.latlon(place.latitude_deg, place.longitude_deg))
            some = days[10:18]
            at = sky.timescale.from_datetimes([noon(some[0].on, place) - DAY, noon(some[-1].on, place) + DAY])
            times, after = almanac.find_discrete(at[0], at[1], states)
            turns = pairwise([int(states(at[0])), *after])
            changes = [(t, was, now) for t, (was, now) in zip(times.utc_datetime(), turns, strict=False)]
            for one in some:
                middle = noon(one.on, place)
                half = timedelta(hours=12, minutes=20)  # the true noon is up to 17 minutes from the mean one
                dawns = [t for t, was, now in changes if middle - half < t < middle and (was, now) == (0, 1)]
                sunsets = [t for t, was, now in changes if middle < t < middle + half and (was, now) == (4, 3)]
                hold(one.dawn, max(dawns, default=None), up=False, what=(name, one))
                hold(one.sunset, min(sunsets, default=None), up=True, what=(name, one))
                held += len(dawns) + len(sunsets)
                missing += 2 - len(dawns) - len(sunsets)
    assert held > 700
    assert missing > 100


@pytest.mark.parametrize("depression", [15, 18, 19.5])
def test_dawn_and_sunset_by_pyephem(depression: float) -> None:
    """The same definitions given to a library with a Sun of its own (VSOP87): its centre at the declared angle before
    noon, and 50 arcmin down after it."""
    for starts in MONTHS[::2]:
        found = table(starts, "Jakarta", "London", "New York", "Melbourne", "Ushuaia", "Apia", depression=depression)
        for name, days in found.at.items():
            place = PLACES[name]
            observer = ephem.Observer()
            observer.lat, observer.lon, observer.pressure = str(place.latitude_deg), str(place.longitude_deg), 0
            for one in days:
                observer.date = noon(one.on, place).replace(tzinfo=None)
                observer.horizon = str(-depression)
                try:
                    dawn = observer.previous_rising(ephem.Sun(), use_center=True).datetime().replace(tzinfo=UTC)
                except ephem.AlwaysUpError:
                    dawn = None
                observer.horizon = "-0:50"
                sunset = observer.next_setting(ephem.Sun(), use_center=True).datetime().replace(tzinfo=UTC)
                hold(one.dawn, dawn, up=False, what=(name, one))
                hold(one.sunset, sunset, up=True, what=(name, one))


def test_rounding_is_on_the_side_of_the_longer_fast() -> None:
    """Minute-safe times enclose the nearest minutes, are a minute apart from them about every other time, and the
    nearest minutes are never two away."""
    safe, near = (table(MONTHS[2], "Melbourne", rounding=rounding).at["Melbourne"]
                  for rounding in ("minute-safe", "nearest-minute"))
    dawns, sunsets = [], []
    for one, other in zip(safe, near, strict=True):
        assert isinstance(one.dawn, datetime)
        assert isinstance(other.dawn, datetime)
        assert isinstance(one.sunset, datetime)
        assert isinstance(other.sunset, datetime)
        dawns.append((other.dawn - one.dawn).total_seconds())
        sunsets.append((one.sunset - other.sunset).total_seconds())
    assert set(dawns) == set(sunsets) == {0.0, 60.0}


@pytest.mark.parametrize(
    ("name", "starts", "changes", "hours"),
    [
        # The second Sunday of March in the United States; the last of March in the European Union and Britain.
        ("New York", date(2026, 2, 18), date(2026, 3, 8), (-5, -4)),
        ("London", date(2025, 3, 1), date(2025, 3, 30), (0, 1)),
    ],
)
def test_times_are_by_the_clock_in_force_that_day(
    name: str, starts: date, changes: date, hours: tuple[int, int]
) -> None:
    """On the day that the clocks go forward, dawn and sunset are an hour later than the day before, but for the few
    minutes that the Sun itself moves; dawn, too, for the change is at night."""
    days = table(starts, name).at[name]
    for one in days:
        assert isinstance(one.dawn, datetime)
        assert isinstance(one.sunset, datetime)
        wanted = timedelta(hours=hours[one.on >= changes])
        assert (one.dawn.utcoffset(), one.sunset.utcoffset()) == (wanted, wanted), one
        assert one.dawn.date() == one.sunset.date() == one.on
    (index,) = [index for index, one in enumerate(days) if one.on == changes]
    before, after = ([one.dawn, one.sunset] for one in (days[index - 1], days[index]))
    for was, now in zip(before, after, strict=True):
        assert isinstance(was, datetime)
        assert isinstance(now, datetime)
        ahead = now.replace(tzinfo=None) - was.replace(tzinfo=None) - DAY
        assert timedelta(minutes=55) <= ahead <= timedelta(minutes=63)


def of(name: str, starts: date) -> tuple[FastingDay, ...]:
    return table(starts, name).at[name]


def test_where_the_sun_does_not_go_so_far_there_is_no_time() -> None:
    """June at London: no astronomical night, sunset as ever. Midnight Sun at Tromso (published: 20 May to 22 July):
    neither. Polar night at Longyearbyen (26 October to 15 February): the angle is reached, but there is no sunset,
    for the Sun has not risen."""
    assert {(one.dawn, isinstance(one.sunset, datetime)) for one in of("London", date(2015, 6, 18))[:20]} == {
        ("stays above", True)}
    assert {(one.dawn, one.sunset) for one in of("Tromso", date(2015, 6, 18))[:30]} == {("stays above", "stays above")}
    assert {(isinstance(one.dawn, datetime), one.sunset) for one in of("Longyearbyen", date(2030, 12, 26))} == {
        (True, "stays below")}
    assert not any(one.complete for one in (*of("Tromso", date(2015, 6, 18)), *of("London", date(2015, 6, 18))[:20]))


def test_a_sunset_past_midnight_keeps_its_own_date() -> None:
    """Reykjavik at midsummer, whose clocks are an hour and a half ahead of the Sun: sunset is after midnight, and is
    that of the day whose noon came before it."""
    first = of("Reykjavik", date(2015, 6, 18))[0]
    assert isinstance(first.sunset, datetime)
    assert first.sunset.date() == date(2015, 6, 19)
    assert first.sunset.hour == 0


def test_dates_to_which_the_month_may_still_come_are_there_without_a_number() -> None:
    """A month that may begin a day earlier or later, of 29 days or 30: every date from the earliest first day to the
    latest last one."""
    starts = date(2027, 2, 9)
    months = [
        month(starts, length=29, window=(starts - DAY, starts + DAY)),
        month(starts + 29 * DAY, number=10, window=(starts + 28 * DAY, starts + 31 * DAY)),
    ]
    (found,) = fasting_months(Fasting(dawn_depression=18), months, {"Melbourne": PLACES["Melbourne"]})
    days = found.at["Melbourne"]
    assert [one.day for one in days] == [None, *range(1, 30), None, None]
    assert [one.on for one in days] == [starts + n * DAY for n in range(-1, 31)]
    assert found.has_other_days
    assert not table(starts, "Melbourne").has_other_days


def test_each_month_of_fasting_has_a_table_whatever_stands_before_it() -> None:
    """Two years of months in their order, and in each the ninth; without a window there is no date beside its own."""
    starts = date(2026, 2, 19)
    months = [month(starts + 30 * n * DAY, number=1 + (n + 7) % 12) for n in range(24)]
    found = fasting_months(Fasting(dawn_depression=18), months, {"Melbourne": PLACES["Melbourne"]})
    assert [one.month for one in found] == [months[1], months[13]]
    for one in found:
        assert [day.on for day in one.at["Melbourne"]] == [one.month.starts + n * DAY for n in range(30)]
        assert not one.has_other_days


def test_other_months_have_no_table() -> None:
    assert fasting_months(Fasting(dawn_depression=18), [month(date(2027, 3, 11), number=10)], PLACES) == ()
