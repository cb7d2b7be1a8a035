"""The Rumi calendar against dated events and a printed leaf."""

from __future__ import annotations

from datetime import date, timedelta

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moonwrit.calendars import CalendarError, JulianDate, RumiDate, julian_to_date, rumi_from_date, rumi_to_date
from moonwrit.calendars.rumi import RUMI_FIRST, RUMI_LAST

DAYS = [RUMI_FIRST + timedelta(days=n) for n in range((RUMI_LAST - RUMI_FIRST).days + 1)]


@pytest.mark.parametrize(
    ("civil", "rumi"),
    [
        # Encyclopedia article "Rumi calendar": first day, and a multilingual leaf of 1911.
        (date(1840, 3, 13), RumiDate(1256, 3, 1)),
        (date(1911, 4, 20), RumiDate(1327, 4, 7)),
        # Events known by their Rumi date, from memory: the constitution of 10 Temmuz 1324, the
        # "31 Mart" rising of 1325.
        (date(1908, 7, 23), RumiDate(1324, 7, 10)),
        (date(1909, 4, 13), RumiDate(1325, 3, 31)),
        # The reform and the end, from memory; the years after it are the Gregorian less 584.
        (date(1917, 2, 28), RumiDate(1332, 2, 15)),
        (date(1917, 3, 1), RumiDate(1333, 3, 1)),
        (date(1917, 12, 31), RumiDate(1333, 12, 31)),
        (date(1918, 1, 1), RumiDate(1334, 1, 1)),
        (date(1923, 10, 29), RumiDate(1339, 10, 29)),
        (date(1925, 12, 31), RumiDate(1341, 12, 31)),
        # Years change in March before the reform, and 1900 has the Julian leap day.
        (date(1900, 3, 13), RumiDate(1315, 2, 29)),
        (date(1900, 3, 14), RumiDate(1316, 3, 1)),
        (date(1900, 1, 13), RumiDate(1315, 1, 1)),
    ],
)
def test_known_dates(civil: date, rumi: RumiDate) -> None:
    assert rumi_from_date(civil) == rumi
    assert rumi_to_date(rumi) == civil


def test_leaf_of_1911_in_the_julian_calendar() -> None:
    """The same leaf names 7 April 1911 Julian."""
    assert julian_to_date(JulianDate(1911, 4, 7)) == date(1911, 4, 20) == rumi_to_date(RumiDate(1327, 4, 7))


def test_every_day_leads_back() -> None:
    found = [rumi_from_date(day) for day in DAYS]
    assert len(set(found)) == len(DAYS)
    assert [rumi_to_date(rumi) for rumi in found if rumi] == DAYS


def test_years_have_the_length_that_the_rules_give() -> None:
    """1331 had its Julian leap day; 1332 lost 13 days; 1333 had ten months; 1336 (1920) was leap."""
    length: dict[int, int] = {}
    for day in DAYS:
        rumi = rumi_from_date(day)
        assert rumi is not None
        length[rumi.year] = length.get(rumi.year, 0) + 1
    assert min(length) == 1256
    assert max(length) == 1341
    odd_years = {year: days for year, days in length.items() if days not in (365, 366)}
    assert odd_years == {1332: 365 - 13, 1333: 365 - 31 - 28}
    assert length[1331] == length[1336] == 366


@settings(deadline=None)
@given(st.dates())
def test_outside_the_span_there_is_no_rumi_date(day: date) -> None:
    assert (rumi_from_date(day) is None) == (not date(1840, 3, 13) <= day <= date(1925, 12, 31))


@pytest.mark.parametrize(
    "rumi",
    [
        (1255, 3, 1), (1255, 2, 28), (1342, 1, 1), (99999999, 1, 1),  # outside the span
        (1332, 2, 16), (1332, 2, 28), (1333, 1, 1), (1333, 2, 28),  # dropped by the reform
        (1332, 13, 1), (1332, 0, 1), (1300, 4, 31),  # in no year
        (1339, 2, 29), (1314, 2, 29),  # not leap
    ],
)  # fmt: skip
def test_a_date_that_was_not_there(rumi: tuple[int, int, int]) -> None:
    with pytest.raises(CalendarError, match="15 February 1332 was followed by 1 March 1333"):
        rumi_to_date(RumiDate(*rumi))
