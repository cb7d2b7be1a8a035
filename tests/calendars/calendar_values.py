"""Reading the published values in tests/reference/calendars (sources in the README there)."""

from __future__ import annotations

import csv
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

REFERENCE = Path(__file__).resolve().parent.parent / "reference" / "calendars"


def rows(name: str) -> list[dict[str, str]]:
    with (REFERENCE / name).open(encoding="utf-8", newline="") as file:
        found = list(csv.DictReader(file))
    assert found, f"{name} is empty"
    return found


def ymd(text: str) -> tuple[int, int, int]:
    """Year, month and day of ``-1245-12-09``."""
    year, month, day = text.rsplit("-", 2)
    return int(year), int(month), int(day)


def ymd_without_year_0(text: str) -> tuple[int, int, int]:
    """The same where the source goes from -1 to 1: counted straight through, as everywhere here."""
    year, month, day = ymd(text)
    assert year != 0
    return (year if year > 0 else year + 1), month, day


# Prints year, month and day of consecutive days, packed into one number each.
_ICU_DAYS = """
const [calendar, first, last] = process.argv.slice(1);
const format = new Intl.DateTimeFormat(`en-u-ca-${calendar}-nu-latn`,
    {year: "numeric", month: "numeric", day: "numeric", timeZone: "UTC"});
const days = [];
for (let rd = +first; rd <= +last; rd++) {
    const [month, day, year] = format.format((rd - 719163) * 86400000).match(/\\d+/g).map(Number);
    days.push(year * 10000 + month * 100 + day);
}
console.log(JSON.stringify(days));
"""


def icu_days(
    node: Callable[..., Any], calendar: str, first: int, last: int
) -> Iterator[tuple[int, tuple[int, int, int]]]:
    """Each rata die from ``first`` to ``last`` with its (year, month, day) in ICU; years above 0 only."""
    packed = node(_ICU_DAYS, calendar, str(first), str(last))
    assert len(packed) == last - first + 1
    for rd, value in enumerate(packed, first):
        yield rd, (value // 10000, value // 100 % 100, value % 100)
