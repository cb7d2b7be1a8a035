"""Names of months against CLDR, and what importing the calendars costs."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Callable
from typing import Any

import pytest
from calendar_values import REFERENCE

from moonwrit.calendars import (
    GREGORIAN_MONTHS,
    HIJRI_MONTHS,
    RUMI_MONTHS,
    SOLAR_HIJRI_MONTHS,
    CalendarError,
    month_name,
    month_slug,
)

CLDR: dict[str, list[str]] = json.loads((REFERENCE / "hijri_month_names_cldr.json").read_text("utf-8"))
# What differs from CLDR on purpose: a stray space, and a grave accent for an apostrophe.
MENDED = {("ur", 3): "ربیع الاول", ("ur", 4): "ربیع الثانی", ("fr", 11): "dhou al qi’da"}


def test_languages() -> None:
    assert sorted(HIJRI_MONTHS) == sorted(["en", *CLDR])


@pytest.mark.parametrize("language", sorted(CLDR))
def test_hijri_names_are_those_of_cldr_but_for_three(language: str) -> None:
    expected = [MENDED.get((language, month), name) for month, name in enumerate(CLDR[language], 1)]
    assert list(HIJRI_MONTHS[language]) == expected


_ICU_MONTHS = """
const names = calendar => {
    const english = month => new Intl.DateTimeFormat(`en-u-ca-${calendar}-nu-latn`, {month, timeZone: "UTC"});
    const format = english("long"), number = english("numeric");
    const found = Array(12);
    for (let day = 0; day < 365; day++) {
        const then = Date.UTC(2026, 0, 1 + day);
        found[parseInt(number.format(then)) - 1] = format.format(then);
    }
    return found;
};
console.log(JSON.stringify({persian: names("persian"), gregory: names("gregory")}));
"""


@pytest.mark.judge("node")
def test_persian_and_gregorian_names_against_icu(node: Callable[..., Any]) -> None:
    found = node(_ICU_MONTHS)
    assert found == {"persian": list(SOLAR_HIJRI_MONTHS), "gregory": list(GREGORIAN_MONTHS)}


def test_rumi_names_stand_with_their_namesakes() -> None:
    """March is Mart, August Ağustos: the names taken over from the Julian months."""
    assert RUMI_MONTHS[2] == "Mart"
    assert RUMI_MONTHS[7] == "Ağustos"
    assert len(set(RUMI_MONTHS)) == 12


def test_languages_with_a_region_and_unknown_ones() -> None:
    assert month_name(9) == "Ramadan"
    assert month_name(9, "tr-CY") == month_name(9, "TR") == "Ramazan"
    assert month_name(9, "xx") == "Ramadan"
    with pytest.raises(CalendarError, match="no month 0"):
        month_name(0)
    with pytest.raises(CalendarError, match="no month 13"):
        month_slug(13)


def test_slugs() -> None:
    slugs = [month_slug(month) for month in range(1, 13)]
    assert slugs[8] == "ramadan"
    assert slugs[11] == "dhu-al-hijja"
    assert len(set(slugs)) == 12
    assert set("".join(slugs)) <= set("abcdefghijklmnopqrstuvwxyz-")


def test_importing_loads_nothing_heavy() -> None:
    """Calendars are pure arithmetic: no arrays, sky or content, in a process of their own."""
    program = (
        "import sys, moonwrit.calendars; "
        "print([m for m in sys.modules if m.split('.')[0] in ('numpy', 'skyfield', 'pydantic', 'yaml')"
        " or m.startswith(('moonwrit.content', 'moonwrit.sky', 'moonwrit.policy'))])"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, encoding="utf-8", check=True)
    assert done.stdout.strip() == "[]"
