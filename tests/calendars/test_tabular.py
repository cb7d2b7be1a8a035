"""The tabular Hijri calendar against published lists, ICU, convertdate and itself."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from typing import Any

import pytest
from calendar_values import icu_days, rows, ymd
from convertdate import islamic
from hypothesis import given, settings
from hypothesis import strategies as st

from moonwrit.calendars import TABULAR_NAMES, CalendarError, HijriDate, Tabular, tabular_by_name
from moonwrit.calendars.tabular import LEAP_YEARS, Pattern
from moonwrit.errors import RequestError

TYPE_II = Tabular("16", "civil")
ALL = [tabular_by_name(name) for name in TABULAR_NAMES]
# Days of 360 months or 30 years, the cycle of all four patterns: 30 x 354 + 11.
CYCLE_DAYS = 10631
YEARS_1_TO_1600 = 1600

calendars = st.sampled_from(ALL)
day_counts = st.integers(-2_000_000, 4_000_000)


def test_names() -> None:
    assert TABULAR_NAMES == (
        "tabular-15-civil", "tabular-15-thursday",
        "tabular-16-civil", "tabular-16-thursday",
        "tabular-fatimid-civil", "tabular-fatimid-thursday",
        "tabular-habash-civil", "tabular-habash-thursday",
    )  # fmt: skip
    assert [calendar.name for calendar in ALL] == list(TABULAR_NAMES)
    assert tabular_by_name("tabular-fatimid-thursday") == Tabular("fatimid", "thursday")


@pytest.mark.parametrize("row", rows("tabular_patterns.csv"), ids=lambda row: row["type"])
def test_leap_years_are_the_published_list(row: dict[str, str]) -> None:
    published = [int(year) for year in row["leap_years"].split(",")]
    pattern: Pattern = next(p for p in LEAP_YEARS if p == row["pattern"])
    calendar = Tabular(pattern)
    assert [year for year in range(1, 31) if calendar.is_leap(year)] == published
    assert list(LEAP_YEARS[pattern]) == published
    # The cycle repeats, before the epoch as well.
    assert [year + 300 for year in range(-299, -269) if calendar.is_leap(year)] == published


def test_epochs_are_a_friday_and_a_thursday() -> None:
    """16 July 622 Julian is 19 July 622 Gregorian (Reingold and Dershowitz; ICU)."""
    assert TYPE_II.month_start(1, 1) == date(622, 7, 19)
    assert TYPE_II.month_start(1, 1).weekday() == 4
    assert Tabular("16", "thursday").month_start(1, 1) == date(622, 7, 18)


def test_meeus_example_9b() -> None:
    assert rows("worked_examples.csv")[1]["answer"].startswith("2000 April 6; 1421 is a common year of 354 days")
    assert TYPE_II.to_date(HijriDate(1421, 1, 1)) == date(2000, 4, 6)
    assert not TYPE_II.is_leap(1421)
    assert TYPE_II.year_length(1421) == 354


def test_meeus_example_9c() -> None:
    assert rows("worked_examples.csv")[2]["answer"] == "2 Safar 1412"
    assert TYPE_II.from_date(date(1991, 8, 13)) == HijriDate(1412, 2, 2)


def test_leaf_of_1911() -> None:
    """A multilingual calendar leaf: 20 April 1911 is 21 Rabi II 1329 (encyclopedia article "Rumi calendar").

    Only the Thursday epoch prints that number; the Friday epoch would have 20.
    """
    assert Tabular("16", "thursday").from_date(date(1911, 4, 20)) == HijriDate(1329, 4, 21)
    assert TYPE_II.from_date(date(1911, 4, 20)) == HijriDate(1329, 4, 20)


@pytest.mark.parametrize("row", rows("sample_dates.csv"), ids=lambda row: row["gregorian"])
def test_sample_dates(row: dict[str, str]) -> None:
    """Calendrical Calculations, appendix C; back to the year -1245. Hijri years have a year 0 there too."""
    rd, hijri = int(row["rd"]), HijriDate(*ymd(row["islamic_arithmetic"]))
    assert TYPE_II.from_rd(rd) == hijri
    assert TYPE_II.to_rd(hijri) == rd


@pytest.mark.judge("node")
@pytest.mark.parametrize(
    ("icu", "calendar"), [("islamic-civil", TYPE_II), ("islamic-tbla", Tabular("16", "thursday"))]
)
def test_every_day_of_1600_years_against_icu(node: Callable[..., Any], icu: str, calendar: Tabular) -> None:
    first = calendar.to_rd(HijriDate(1, 1, 1))
    last = calendar.to_rd(HijriDate(YEARS_1_TO_1600 + 1, 1, 1)) - 1
    differing = [(rd, theirs) for rd, theirs in icu_days(node, icu, first, last) if calendar.from_rd(rd) != theirs]
    assert not differing


def test_every_day_of_1600_years_against_convertdate() -> None:
    """convertdate's Islamic calendar is type II with the Friday epoch."""
    differing = []
    for year in range(1, YEARS_1_TO_1600 + 1):
        assert TYPE_II.is_leap(year) == islamic.leap(year)
        for month in range(1, 13):
            length = TYPE_II.month_length(year, month)
            assert length == islamic.month_length(year, month)
            for day in range(1, length + 1):
                rd = TYPE_II.to_rd(HijriDate(year, month, day))
                if islamic.to_jd(year, month, day) != rd + 1721424.5:
                    differing.append((year, month, day))
    assert not differing


def test_how_often_the_patterns_differ() -> None:
    """Of 360 month starts I differs from II in 12, III in 36, IV in 60 (computed beforehand on its own).

    Type I from Thursday differs from type II from Friday in 348 of 360 months: the "348 of 360" of the
    Explanatory Supplement (1961), as quoted at second hand.
    """

    def differing(one: Tabular, other: Tabular) -> int:
        months = [(year, month) for year in range(1, 31) for month in range(1, 13)]
        return sum(one.month_start(*month) != other.month_start(*month) for month in months)

    assert differing(Tabular("15"), TYPE_II) == 12
    assert differing(Tabular("fatimid"), TYPE_II) == 36
    assert differing(Tabular("habash"), TYPE_II) == 60
    assert differing(Tabular("15", "thursday"), TYPE_II) == 348


@pytest.mark.parametrize("calendar", ALL, ids=TABULAR_NAMES)
def test_lengths_fit_together(calendar: Tabular) -> None:
    for year in range(1430, 1460):
        lengths = [calendar.month_length(year, month) for month in range(1, 13)]
        assert sum(lengths) == calendar.year_length(year)
        assert set(lengths) == {29, 30}
        assert calendar.month_start(year + 1, 1) - calendar.month_start(year, 12) == date.resolution * lengths[11]
    assert sum(calendar.year_length(year) for year in range(1430, 1460)) == CYCLE_DAYS


@settings(deadline=None)
@given(calendars, day_counts)
def test_a_day_leads_to_its_date_and_back(calendar: Tabular, rd: int) -> None:
    hijri = calendar.from_rd(rd)
    assert calendar.to_rd(hijri) == rd
    assert hijri < calendar.from_rd(rd + 1)
    assert calendar.from_rd(rd + CYCLE_DAYS) == (hijri.year + 30, hijri.month, hijri.day)


@settings(deadline=None)
@given(calendars, st.integers(-2000, 9000), st.integers(1, 12), st.data())
def test_a_date_leads_to_its_day_and_back(calendar: Tabular, year: int, month: int, data: st.DataObject) -> None:
    day = data.draw(st.integers(1, calendar.month_length(year, month)))
    assert calendar.from_rd(calendar.to_rd(HijriDate(year, month, day))) == HijriDate(year, month, day)


@settings(deadline=None)
@given(calendars, st.dates())
def test_civil_dates_lead_back(calendar: Tabular, day: date) -> None:
    assert calendar.to_date(calendar.from_date(day)) == day


@pytest.mark.parametrize("hijri", [(1447, 0, 1), (1447, 13, 1), (1447, 2, 30), (1447, 12, 0), (1448, 12, 30)])
def test_a_date_that_is_not_there(hijri: tuple[int, int, int]) -> None:
    """In type II 1448 is common: the 8th of its cycle."""
    with pytest.raises(CalendarError):
        TYPE_II.to_rd(HijriDate(*hijri))


def test_years_beyond_the_civil_calendar() -> None:
    """The year 0 begins in AD 621, a leap-free 354 days before the epoch: fine. AD 10000 is refused."""
    assert TYPE_II.month_start(0, 1) == date(622, 7, 19) - 354 * date.resolution
    with pytest.raises(CalendarError, match="years 1 to 9999"):
        TYPE_II.month_start(9667, 1)


def test_errors_name_what_would_do() -> None:
    with pytest.raises(RequestError, match='did you mean "tabular-16-civil"'):
        tabular_by_name("tabular-16-civl")
    with pytest.raises(ValueError, match="it has 29 days"):
        TYPE_II.to_date(HijriDate(1447, 2, 30))
    with pytest.raises(CalendarError, match='did you mean "thursday"'):
        Tabular("16", "thursdy")  # type: ignore[arg-type]
    with pytest.raises(CalendarError, match="no tabular pattern"):
        Tabular("17")  # type: ignore[arg-type]
