"""Places written as text, and which conjunction belongs to an evening."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest

from moonwrit.errors import RequestError
from moonwrit.policy import NamedPlace
from moonwrit.policy.evening import evening_at, evenings_at, place_from_text
from moonwrit.sky import lunations

RABAT = NamedPlace("Rabat", 34.02, -6.84, 75.0, ZoneInfo("Africa/Casablanca"))


@pytest.mark.parametrize(
    ("text", "place"),
    [
        ("Rabat,34.02,-6.84,75,Africa/Casablanca", RABAT),
        (" Rabat , 34.02 , -6.84 , 75 , Africa/Casablanca ", RABAT),
        ("Rabat,34.02,-6.84,75", NamedPlace("Rabat", 34.02, -6.84, 75.0, None)),
        ("Rabat,34.02,-6.84,75,", NamedPlace("Rabat", 34.02, -6.84, 75.0, None)),
        ("Rabat,34.02,-6.84", NamedPlace("Rabat", 34.02, -6.84, 0.0, None)),
        (",34.02,-6.84", NamedPlace("here", 34.02, -6.84, 0.0, None)),
        ("North,90,180,9000", NamedPlace("North", 90.0, 180.0, 9000.0, None)),
        ("South,-90,-180,-500", NamedPlace("South", -90.0, -180.0, -500.0, None)),
    ],
)
def test_a_place_is_name_latitude_longitude_and_what_else_is_known(text: str, place: NamedPlace) -> None:
    """Without an elevation at 0 m, without a zone by local mean time, without a name "here"; up to the bounds."""
    found = place_from_text(text, ["melbourne"])
    assert replace(found, zone=None) == replace(place, zone=None)
    assert (found.zone and found.zone.key) == (place.zone and place.zone.key)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("Rabat", '"Rabat" is not a place; write "name,lat,lon,elevation,zone"'),
        ("Rabat,34", '"Rabat,34" is not a place; write'),
        ("Rabat,34,-6,75,Africa/Casablanca,x", "is not a place; write"),
        ("Rabat,34,west", "is not a place; latitude, longitude and elevation are numbers"),
        ("Rabat,34,-6,high", "is not a place; latitude, longitude and elevation are numbers"),
        ("Rabat,90.1,0", "lies off the Earth; latitude is -90 to 90"), ("Rabat,-90.1,0", "lies off the Earth"),
        ("Rabat,0,180.1", "lies off the Earth"), ("Rabat,0,-180.1", "lies off the Earth"),
        ("Rabat,0,0,9000.1", "lies off the Earth"), ("Rabat,0,0,-500.1", "lies off the Earth"),
        ("Rabat,0,0,nan", "lies off the Earth"),
        ("Rabat,34,-6,75,Africa/Nowhere", 'time zone "Africa/Nowhere" is unknown'),
    ],
)
def test_what_is_no_place_is_refused_with_the_way_to_write_it(text: str, said: str) -> None:
    with pytest.raises(RequestError) as refused:
        place_from_text(text)
    assert said in str(refused.value)


def test_a_word_alone_is_a_name_of_the_content() -> None:
    with pytest.raises(RequestError, match=r'place "rabbat" is not known; did you mean "rabat"\?'):
        place_from_text("rabbat", ["rabat", "melbourne"])


def test_an_evening_has_the_last_conjunction_before_the_end_of_the_next_date() -> None:
    """Around each conjunction of twenty years, three dates before it to one after, and in the midst of each month: a
    conjunction comes up to 14 hours before or after the mean one. At the very end of a date it may be either."""
    moons = lunations((1430 - 1) * 12, (1450 - 1) * 12)
    epoch = datetime(2000, 1, 1, 12, tzinfo=UTC)
    known = [epoch + timedelta(days=float(ut) - 2451545.0) for ut in moons.conjunction_ut]
    dates = [moment.date() + timedelta(days=n) for moment in known[1:-1] for n in (-3, -2, -1, 0, 1, 15)]
    for on, (row,) in zip(dates, evenings_at(dates, [RABAT]), strict=True):
        end = datetime(on.year, on.month, on.day, tzinfo=UTC) + timedelta(days=2)
        if min(abs(moment - end) for moment in known) < timedelta(minutes=30):
            continue
        latest = max(moment for moment in known if moment <= end)
        assert abs(datetime.fromisoformat(str(row["conjunction_utc"])) - latest) < timedelta(seconds=1.5)


def test_an_evening_says_where_and_when_it_is() -> None:
    row, unzoned = evening_at(date(2025, 8, 1), [RABAT, NamedPlace("Ship", -10.0, 20.0, 5.0, None)])
    names = ("date", "place", "latitude_deg", "longitude_deg", "elevation_m", "timezone")
    assert [row[name] for name in names] == ["2025-08-01", "Rabat", 34.02, -6.84, 75.0, "Africa/Casablanca"]
    assert [unzoned[name] for name in names] == ["2025-08-01", "Ship", -10.0, 20.0, 5.0, None]
