"""The solar Hijri calendar under its three rules."""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, date, datetime, timedelta, timezone
from typing import Any

import astronomy
import pytest
from calendar_values import icu_days, rows, ymd, ymd_without_year_0
from hypothesis import given, settings
from hypothesis import strategies as st

from moonwrit.calendars import (
    CYCLE_2820,
    THIRTY_THREE_YEAR,
    CalendarError,
    SolarHijri,
    SolarHijriDate,
    new_year_from_equinox,
)

NEW_YEARS = {
    int(row["ap_year"]): (date.fromisoformat(row["gregorian_new_year"]), row["leap"] == "1")
    for row in rows("persian_new_years.csv")
}


def equinox(year: int) -> datetime:
    """The March equinox of astronomy-engine."""
    found: datetime = astronomy.Seasons(year).mar_equinox.Utc()
    return found.replace(tzinfo=UTC)


ASTRONOMICAL = SolarHijri.from_equinoxes(equinox)
ALL = [THIRTY_THREE_YEAR, CYCLE_2820, ASTRONOMICAL]


@pytest.mark.parametrize("calendar", [THIRTY_THREE_YEAR, ASTRONOMICAL], ids=lambda c: c.rule)
def test_three_centuries_of_new_years(calendar: SolarHijri) -> None:
    """1200-1498 AP as ICU has them; the closest equinox is 22 seconds before noon (1309 AP)."""
    assert len(NEW_YEARS) == 299
    assert {y: (calendar.new_year(y), calendar.is_leap(y)) for y in NEW_YEARS} == NEW_YEARS


def test_years_in_which_the_2820_year_rule_is_at_fault() -> None:
    """Against the true leap years: late by one year, five times in three centuries."""
    differing = [year for year, (_, leap) in NEW_YEARS.items() if CYCLE_2820.is_leap(year) != leap]
    assert differing == [1209, 1210, 1242, 1243, 1403, 1404, 1436, 1437, 1469, 1470]
    assert NEW_YEARS[1403][1]
    assert CYCLE_2820.is_leap(1404)


@pytest.mark.judge("node")
def test_every_day_of_three_centuries_against_icu(node: Callable[..., Any]) -> None:
    first, last = THIRTY_THREE_YEAR.new_year_rd(1200), THIRTY_THREE_YEAR.new_year_rd(1500) - 1
    differing = [
        (rd, theirs)
        for rd, theirs in icu_days(node, "persian", first, last)
        if THIRTY_THREE_YEAR.from_rd(rd) != theirs
    ]
    assert not differing


@pytest.mark.parametrize("row", rows("sample_dates.csv"), ids=lambda row: row["gregorian"])
def test_sample_dates_by_the_33_year_rule(row: dict[str, str]) -> None:
    """The same days in ICU, which counts through a year 0 and carries the rule back to -586."""
    rd, solar = int(row["rd"]), SolarHijriDate(*ymd(row["icu72_persian"]))
    assert THIRTY_THREE_YEAR.from_rd(rd) == solar
    assert THIRTY_THREE_YEAR.to_rd(solar) == rd


@pytest.mark.parametrize("row", rows("sample_dates.csv"), ids=lambda row: row["gregorian"])
def test_sample_dates_by_the_2820_year_rule(row: dict[str, str]) -> None:
    """Calendrical Calculations, appendix C, where -1208 is the year -1207 counted through 0."""
    rd, solar = int(row["rd"]), SolarHijriDate(*ymd_without_year_0(row["persian_arithmetic"]))
    assert CYCLE_2820.from_rd(rd) == solar
    assert CYCLE_2820.to_rd(solar) == rd


@pytest.mark.parametrize(
    "row",
    [row for row in rows("sample_dates.csv") if not row["gregorian"].startswith("-")],
    ids=lambda row: row["gregorian"],
)
def test_sample_dates_by_the_astronomical_rule(row: dict[str, str]) -> None:
    """The same table; its noon is that of Tehran, and none of its years hangs on the difference."""
    rd, solar = int(row["rd"]), SolarHijriDate(*ymd_without_year_0(row["persian_astronomical"]))
    assert ASTRONOMICAL.from_rd(rd) == solar
    assert ASTRONOMICAL.to_rd(solar) == rd


@pytest.mark.parametrize("row", rows("persian_near_noon.csv"), ids=lambda row: row["ap_year"])
def test_equinoxes_near_noon(row: dict[str, str]) -> None:
    """Noon of 52.5 E is 8:30 UT. A minus means before noon, so that the year begins on that day."""
    year, minutes = int(row["ap_year"]), float(row["minutes_after_noon"])
    instant = equinox(year + 621)
    noon = instant.replace(hour=8, minute=30, second=0, microsecond=0)
    assert (instant - noon).total_seconds() / 60 == pytest.approx(minutes, abs=0.05)
    expected = instant.date() if minutes < 0 else instant.date() + timedelta(days=1)
    assert new_year_from_equinox(instant) == expected == NEW_YEARS[year][0]


def test_noon_itself_belongs_to_the_next_day() -> None:
    noon = datetime(2025, 3, 20, 8, 30, tzinfo=UTC)
    assert new_year_from_equinox(noon - timedelta(microseconds=1)) == date(2025, 3, 20)
    assert new_year_from_equinox(noon) == date(2025, 3, 21)


def test_the_date_is_that_of_52_5_east() -> None:
    """At 20:30 UT its next day has begun, and its noon is the first to follow; zones do not matter."""
    assert new_year_from_equinox(datetime(2025, 3, 20, 20, 29, tzinfo=UTC)) == date(2025, 3, 21)
    assert new_year_from_equinox(datetime(2025, 3, 20, 20, 31, tzinfo=UTC)) == date(2025, 3, 21)
    melbourne = timezone(timedelta(hours=11))
    assert new_year_from_equinox(datetime(2025, 3, 20, 19, 0, tzinfo=melbourne)) == date(2025, 3, 20)
    with pytest.raises(CalendarError, match="no time zone"):
        new_year_from_equinox(datetime(2025, 3, 20, 9, 1))


def test_a_table_of_new_years_will_do() -> None:
    """It needs the year after the last one asked for, and says so in its own way where it has none."""
    table = {1403: date(2024, 3, 20), 1404: date(2025, 3, 21), 1405: date(2026, 3, 21)}
    calendar = SolarHijri.from_new_years("a table", table.__getitem__)
    assert calendar.from_date(date(2025, 3, 20)) == SolarHijriDate(1403, 12, 30)
    assert calendar.from_date(date(2026, 3, 20)) == SolarHijriDate(1404, 12, 29)
    assert calendar.to_date(SolarHijriDate(1404, 7, 1)) == date(2025, 9, 23)
    with pytest.raises(KeyError):
        calendar.from_date(date(2026, 3, 21))


def test_each_equinox_is_asked_for_once() -> None:
    asked: list[int] = []

    def counting(year: int) -> datetime:
        asked.append(year)
        return equinox(year)

    calendar = SolarHijri.from_equinoxes(counting)
    for day in range(365):
        calendar.from_date(date(2025, 4, 1) + timedelta(days=day))
    assert sorted(asked) == [2025, 2026, 2027]


@pytest.mark.parametrize("calendar", [THIRTY_THREE_YEAR, CYCLE_2820], ids=lambda c: c.rule)
def test_leap_years_are_the_stated_rule(calendar: SolarHijri) -> None:
    def stated(year: int) -> bool:
        if calendar is THIRTY_THREE_YEAR:
            return (25 * year + 11) % 33 < 8
        return 31 * ((year - 474) % 2820 + 474 + 38) % 128 < 31

    assert all(calendar.is_leap(year) == stated(year) for year in range(-3000, 6000))


@settings(deadline=None)
@given(st.sampled_from([THIRTY_THREE_YEAR, CYCLE_2820]), st.integers(-1_000_000, 3_000_000))
def test_a_day_leads_to_its_date_and_back(calendar: SolarHijri, rd: int) -> None:
    solar = calendar.from_rd(rd)
    assert calendar.to_rd(solar) == rd
    assert solar < calendar.from_rd(rd + 1)


@settings(deadline=None)
@given(st.sampled_from(ALL), st.integers(500, 1600), st.integers(1, 12), st.data())
def test_a_date_leads_to_its_day_and_back(
    calendar: SolarHijri, year: int, month: int, data: st.DataObject
) -> None:
    day = data.draw(st.integers(1, calendar.month_length(year, month)))
    solar = SolarHijriDate(year, month, day)
    assert calendar.from_date(calendar.to_date(solar)) == solar


def test_a_date_that_is_not_there() -> None:
    with pytest.raises(CalendarError, match="no month 13"):
        THIRTY_THREE_YEAR.to_date(SolarHijriDate(1404, 13, 1))
    with pytest.raises(CalendarError, match="it has 29 days"):
        THIRTY_THREE_YEAR.to_date(SolarHijriDate(1404, 12, 30))
    with pytest.raises(CalendarError, match="years 1 to 9999"):
        THIRTY_THREE_YEAR.new_year(-700)
