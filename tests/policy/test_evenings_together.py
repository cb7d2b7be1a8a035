"""What is computed for many evenings at once is what is computed for each alone."""

from __future__ import annotations

from datetime import date, timedelta
from zoneinfo import ZoneInfo

from moonwrit.policy.evening import evening_at, evenings_at
from moonwrit.policy.published import NamedPlace, published

PLACES = [
    NamedPlace("Melbourne", -37.81, 144.96, 31.0, ZoneInfo("Australia/Melbourne")),
    NamedPlace("Tromsø", 69.65, 18.96, 0.0, ZoneInfo("Europe/Oslo")),
    NamedPlace("Apia", -13.83, -171.77, 2.0, ZoneInfo("Pacific/Apia")),
]
EVENINGS = [date(1900, 1, 5) + timedelta(days=557 * n) for n in range(100)]


def test_rows_of_many_evenings_are_those_of_each_alone() -> None:
    """A century and a half at three places, one of them without sunsets at times: every printed number is equal."""
    together = evenings_at(EVENINGS, PLACES)
    assert any(row["sunset_utc"] is None for rows in together for row in rows)
    assert together == [evening_at(on, PLACES) for on in EVENINGS]
    assert evenings_at([], PLACES) == []


def test_a_year_alone_is_the_same_year_among_many() -> None:
    """Its months with all evidence and notes, where the 28th and 30th evenings are far from the conjunction too."""
    for name in ("yallop-b", "mabims-2021"):
        method = published(name, NamedPlace("Reykjavik", 64.15, -21.94, 0.0, ZoneInfo("Atlantic/Reykjavik")))
        assert method.months(1440, 1440) == method.months(1430, 1450)[120:132]
