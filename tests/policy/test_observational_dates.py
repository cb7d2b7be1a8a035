"""The visibility rule of Calendrical Calculations at Cairo against the dates that the book prints for it."""

from __future__ import annotations

from datetime import date, timedelta
from zoneinfo import ZoneInfo

import pytest
from policy_values import rows

from moonwrit.policy.published import NamedPlace, published

CAIRO = NamedPlace("Cairo", 30.1, 31.3, 200.0, ZoneInfo("Africa/Cairo"))


@pytest.mark.parametrize("row", rows("observational_cairo.csv"), ids=lambda row: row["gregorian"])
def test_observational_dates_of_the_book(row: dict[str, str]) -> None:
    """Every sample date inside the ephemeris, all eight; four of them are not the date of the arithmetic calendar."""
    year, month, day = (int(part) for part in row["islamic_observational_cairo"].split("-"))
    found = published("shaukat", CAIRO).months(year, year)[month - 1]
    assert found.starts + timedelta(days=day - 1) == date.fromisoformat(row["gregorian"])
    assert day <= found.length
