"""The Julian calendar against published dates and convertdate."""

from __future__ import annotations

from datetime import date

import pytest
from calendar_values import rows, ymd_without_year_0
from convertdate import julian as their_julian
from hypothesis import given, settings
from hypothesis import strategies as st

from moonwrit.calendars import CalendarError, JulianDate, julian_from_date, julian_to_date
from moonwrit.calendars.julian import julian_from_rd, julian_month_length, julian_to_rd


@pytest.mark.parametrize("row", rows("sample_dates.csv"), ids=lambda row: row["gregorian"])
def test_sample_dates(row: dict[str, str]) -> None:
    """Calendrical Calculations, appendix C, where -587 is the year -586 counted through 0."""
    rd, julian = int(row["rd"]), JulianDate(*ymd_without_year_0(row["julian"]))
    assert julian_from_rd(rd) == julian
    assert julian_to_rd(julian) == rd


def test_meeus_example_7b() -> None:
    """27.5 January 333 is JD 1842713.0, and JD = rata die + 1721424.5 at midnight."""
    assert rows("worked_examples.csv")[0]["answer"] == "JD 1842713.0"
    assert julian_to_rd(JulianDate(333, 1, 27)) + 0.5 + 1721424.5 == 1842713.0


def test_meeus_example_9c_in_between() -> None:
    assert julian_from_date(date(1991, 8, 13)) == JulianDate(1991, 7, 31)


def test_epochs_of_the_hijri_calendar() -> None:
    """Rata die 227015 and 227014 (Reingold and Dershowitz; ICU)."""
    assert julian_to_rd(JulianDate(622, 7, 16)) == 227015
    assert julian_to_rd(JulianDate(622, 7, 15)) == 227014


def test_every_day_of_four_centuries_against_convertdate() -> None:
    for rd in range(date(1600, 1, 1).toordinal(), date(2000, 1, 1).toordinal()):
        assert julian_from_rd(rd) == their_julian.from_jd(rd + 1721424.5)


@settings(deadline=None)
@given(st.integers(-3_000_000, 4_000_000))
def test_a_day_leads_to_its_date_and_back(rd: int) -> None:
    julian = julian_from_rd(rd)
    assert julian_to_rd(julian) == rd
    assert julian < julian_from_rd(rd + 1)


@settings(deadline=None)
@given(st.integers(-5000, 9000), st.integers(1, 12), st.data())
def test_a_date_leads_to_its_day_and_back(year: int, month: int, data: st.DataObject) -> None:
    day = data.draw(st.integers(1, julian_month_length(year, month)))
    assert julian_from_rd(julian_to_rd(JulianDate(year, month, day))) == JulianDate(year, month, day)


def test_leap_days() -> None:
    """1900 is leap in this calendar only; the Gregorian one has no such day."""
    assert julian_to_date(JulianDate(1900, 2, 29)) == date(1900, 3, 13)
    assert julian_from_date(date(1900, 3, 13)) == JulianDate(1900, 2, 29)
    with pytest.raises(CalendarError, match="it has 28 days"):
        julian_to_date(JulianDate(1901, 2, 29))


def test_a_date_that_is_not_there() -> None:
    with pytest.raises(CalendarError, match="no month 13"):
        julian_to_rd(JulianDate(1900, 13, 1))
    with pytest.raises(CalendarError, match="years 1 to 9999"):
        julian_to_date(JulianDate(-586, 7, 30))
