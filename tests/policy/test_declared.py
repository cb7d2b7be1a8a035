"""Policies as a community declares them: the months they give, and what is said of those that cannot be meant."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from datetime import date, timedelta
from itertools import pairwise
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from moonwrit.content import load
from moonwrit.errors import ContentError, RequestError
from moonwrit.policy import Method, Month, NamedPlace, method
from moonwrit.policy.conditions import Either, Every, Scoped
from moonwrit.policy.scopes import Within
from moonwrit.policy.walk import Era
from moonwrit.sky.land import Outline

SITE = """\
community: Council
address: https://example.org/
years: {from: 1447, to: 1448}
contact: us@example.org
authority: The council
calendars:
  main: {name: Calendar, policy: mine, region: all}
"""
PLACES = """\
jakarta: {name: Jakarta, latitude: -6.2, longitude: 106.83, timezone: Asia/Jakarta}
melbourne: {name: Melbourne, latitude: -37.81, longitude: 144.96, timezone: Australia/Melbourne}
perth: {name: Perth, latitude: -31.95, longitude: 115.86, timezone: Australia/Perth}
london: {name: London, latitude: 51.5, longitude: -0.13, timezone: Europe/London}
makkah: {name: Makkah, latitude: 21.4225, longitude: 39.826, timezone: Asia/Riyadh}
east-cape: {name: "East Cape, New Zealand", latitude: -38.7, longitude: 178.0, timezone: Pacific/Auckland}
tromso: {name: Tromsø, latitude: 69.65, longitude: 18.96, timezone: Europe/Oslo}
"""
REGIONS = """\
all: {name: All, places: [melbourne, perth]}
americas: {name: The Americas, places: [melbourne], outline: americas.geojson}
north: {name: The far north, places: [tromso], outline: north.geojson}
"""
HEAD = "mine:\n  name: Mine\n  decided_by: calculation\n"
"""Three lines: what is at fault begins on the fourth."""

Declared = Callable[..., Method]


AMERICAS = [[-168, 60], [-60, 60], [-35, -8], [-70, -55], [-82, -5], [-105, 18], [-125, 40], [-168, 60]]
"""Longitude and latitude of the corners, roughly and invented."""


def geojson(ring: list[list[int]]) -> str:
    return json.dumps({"type": "Polygon", "coordinates": [ring]})


@pytest.fixture
def declared(tmp_path: Path) -> Declared:
    """``declared(text)``: the policy "mine" with ``text`` below its name, from a content folder of its own."""

    def read(text: str, head: str = HEAD, **files: str) -> Method:
        contents = {
            "site.yaml": SITE, "places.yaml": PLACES, "regions.yaml": REGIONS, "observances.yaml": "{}\n",
            "policies.yaml": head + "".join(f"  {line}\n" for line in text.splitlines()),
            "north.geojson": geojson([[10, 62], [20, 62], [20, 70], [10, 62]]),
            "americas.geojson": geojson(AMERICAS),
            **{name.replace("_", "."): content for name, content in files.items()},
        }
        for name, content in contents.items():
            (tmp_path / name).write_text(content, encoding="utf-8")
        return method("mine", load(tmp_path))

    return read


def reasons(months: tuple[Month, ...]) -> list[tuple[object, ...]]:
    """All of a month but its policy's name."""
    return [(m.starts, m.length, m.basis, m.margin, m.evidence) for m in months]


def place(name: str, latitude: float, longitude: float, zone: str) -> NamedPlace:
    return NamedPlace(name, latitude, longitude, 0.0, ZoneInfo(zone))


JAKARTA = place("Jakarta", -6.2, 106.83, "Asia/Jakarta")
MELBOURNE = place("Melbourne", -37.81, 144.96, "Australia/Melbourne")
PERTH = place("Perth", -31.95, 115.86, "Australia/Perth")
LONDON = place("London", 51.5, -0.13, "Europe/London")
MAKKAH = place("Makkah", 21.4225, 39.826, "Asia/Riyadh")

# --- the same as the published policy, written out by hand ----------------------------------------

MABIMS_2021 = """\
test:
  all:
  - {quantity: altitude, frame: topocentric, air: refracted, at_least: 3}
  - {quantity: elongation, frame: geocentric, at_least: 6.4}
where: {place: jakarta}
"""
AT_ONE_PLACE = {
    "mabims-2021": (MABIMS_2021, JAKARTA),
    "mabims-1995": (
        "test:\n  all:\n  - {quantity: altitude, frame: topocentric, air: refracted, at_least: 2}\n"
        "  - any:\n    - {quantity: elongation, frame: geocentric, at_least: 3}\n"
        "    - {quantity: age, at_least: 8}\nwhere: {place: jakarta}",
        JAKARTA,
    ),
    "istanbul-5-8": (
        "test:\n  all:\n  - {quantity: altitude, frame: topocentric, air: airless, at_least: 5}\n"
        "  - {quantity: elongation, frame: geocentric, at_least: 8}\nwhere: {place: london}",
        LONDON,
    ),
    "moon-up-after-conjunction": (
        "test:\n  all:\n  - {quantity: age, more_than: 0}\n  - {quantity: lag, more_than: 0}\nwhere: {place: makkah}",
        MAKKAH,
    ),
    "lag-48": ("test: {quantity: lag, more_than: 48}\nwhere: {place: london}", LONDON),
    # An elongation alone would be met by the old Moon: age > 0 is asked beside it, as the published one says.
    "danjon-7": (
        "test: {quantity: elongation, frame: topocentric, at: best-time, at_least: 7}\nwhere: {place: melbourne}",
        MELBOURNE,
    ),
    "yallop-b": ("test: {criterion: yallop-1997, accept: [A, B]}\nwhere: {place: melbourne}", MELBOURNE),
    "odeh-a": ("test: {criterion: odeh-2004, accept: [A]}\nwhere: {place: melbourne}", MELBOURNE),
    "tabular-fatimid-thursday": ("arithmetic: {pattern: fatimid, epoch: thursday}", None),
    "tabular-15-civil": ('arithmetic: {pattern: "15"}', None),
    "schoch-1930": ("published: schoch-1930\nplace: london", LONDON),
}


@pytest.mark.parametrize("name", AT_ONE_PLACE)
def test_thresholds_written_out_give_the_published_months(declared: Declared, name: str) -> None:
    """Dates, lengths, margins and findings, to the last digit."""
    text, where = AT_ONE_PLACE[name]
    assert reasons(declared(text).months(1440, 1450)) == reasons(method(name, None, where).months(1440, 1450))


def test_anywhere_before_the_end_of_the_date_is_istanbul_1978(declared: Declared) -> None:
    text = "test: {criterion: istanbul-5-8}\nwhere: {anywhere: earth, before: {hour_ut: 24}}"
    assert reasons(declared(text).months(1440, 1450)) == reasons(method("istanbul-1978").months(1440, 1450))


def test_clauses_make_istanbul_2016(declared: Declared) -> None:
    """With the outline drawn here instead of the mainland's own."""
    text = """\
either:
- test: {criterion: istanbul-5-8}
  where: {anywhere: earth, before: {hour_ut: 24}}
- every:
  - test: {quantity: conjunction, before_dawn: 18}
    where: {place: east-cape}
  - test: {criterion: istanbul-5-8}
    where: {within: americas}
"""
    published = method("istanbul-2016")
    condition = published.eras[0].condition
    assert isinstance(condition, Either)
    first, second = condition.parts
    assert isinstance(second, Every)
    dawn, inside = second.parts
    assert isinstance(inside, Scoped)
    drawn = Within(Outline(((np.array(AMERICAS, dtype=np.float64),),)), step_deg=0.5)
    by_hand = Either((first, Every((dawn, Scoped(inside.rule, drawn)))))
    months = declared(text).months(1445, 1445)
    assert reasons(months) == reasons(replace(published, eras=(Era(0, by_hand),)).months(1445, 1445))
    # The second clause has its say: without it some month would begin later.
    assert tuple(month.starts for month in months) != method("istanbul-1978").starts(1445, 1445)


def test_conjunction_before_midnight_is_the_old_rule_of_makkah(declared: Declared) -> None:
    """Umm al-Qura until 1419: the conjunction before 24:00 UT of the evening's date."""
    text = "test: {quantity: conjunction, before_hour_ut: 24}\nwhere: {place: makkah}"
    assert declared(text).starts(1400, 1419) == method("umm-al-qura").starts(1400, 1419)


# --- scopes ---------------------------------------------------------------------------------------


def test_a_region_is_its_places(declared: Declared) -> None:
    test = "test: {criterion: yallop-1997}\n"
    for key in ("any_of", "every_of"):
        listed = declared(f"{test}where: {{{key}: [melbourne, perth]}}").months(1447, 1450)
        assert declared(f"{test}where: {{{key}: all}}").months(1447, 1450) == listed
    half = declared(f"{test}where: {{share: 0.5, of: all}}").starts(1440, 1450)
    assert half == declared(f"{test}where: {{any_of: all}}").starts(1440, 1450)  # one of two


def test_any_of_two_places_begins_with_the_first_and_every_one_with_the_last(declared: Declared) -> None:
    """From the same beginning: where both places keep their months apart, a month has only two choices."""
    test = "test: {criterion: mabims-2021}\n"
    any_of = declared(f"{test}where: {{any_of: [perth, london]}}").starts(1440, 1450)
    every = declared(f"{test}where: {{every_of: [perth, london]}}").starts(1440, 1450)
    perth, london = (method("mabims-2021", None, p).starts(1440, 1450) for p in (PERTH, LONDON))
    assert all(a <= min(p, q) for a, p, q in zip(any_of, perth, london, strict=True))
    assert all(e >= max(p, q) for e, p, q in zip(every, perth, london, strict=True))
    assert any_of != every


def test_a_night_without_real_darkness_still_has_an_end(declared: Declared) -> None:
    """From late May to July the Sun does not sink 18 degrees at 51.5 N (90 - 51.5 - 23.4 = 15.1): the night shared
    with London then lasts until the Sun is lowest, and months begin as in the rest of the year."""
    mine = declared("test: {criterion: istanbul-5-8}\nwhere: {shares_night_with: london}").months(1440, 1450)
    summer = [month for month in mine if month.evidence.evening.month == 6]
    assert len(summer) >= 8
    assert all(month.margin.margin is not None for month in mine)
    assert {month.evidence.met for month in summer} == {True, False}
    # Later than anywhere on Earth at all, earlier than in London itself.
    earliest = declared("test: {criterion: istanbul-5-8}\nwhere: {anywhere: earth}").starts(1440, 1450)
    here = method("istanbul-5-8", None, LONDON).starts(1440, 1450)
    assert all(e <= m.starts <= h for e, m, h in zip(earliest, mine, here, strict=True))


def test_a_conjunction_before_dawn_is_asked_in_light_nights_too(declared: Declared) -> None:
    months = declared("test: {quantity: conjunction, before_dawn: 18}\nwhere: {place: london}").months(1440, 1450)
    assert all(month.margin.margin is not None for month in months)
    assert not any(month.evidence.notes for month in months)


@pytest.mark.parametrize(
    ("fallback", "named"),
    [("{place: london}", "London"), ("{latitude: 45}", "45 N on the meridian of Tromsø")],
)
def test_a_declared_fallback_is_used_and_named(declared: Declared, fallback: str, named: str) -> None:
    text = f"test: {{criterion: yallop-1997}}\nwhere: {{place: tromso}}\nfallback: {fallback}"
    months = declared(text).months(1447, 1449)
    moved = [month for month in months if month.evidence.place != "Tromsø"]
    assert {month.evidence.place for month in moved} == {named}
    for month in moved:
        assert str(month.evidence.notes[0]) == (
            f"The Sun does not set at Tromsø on this date: judged at {named}, as the policy says."
        )
    assert {month.evidence.evening.month for month in moved} >= {6, 12}


# --- tables, and dates of others ------------------------------------------------------------------


def table_of(starts: tuple[date, ...], first_year: int) -> str:
    rows = [f"{first_year + n // 12},{n % 12 + 1},{day.isoformat()}" for n, day in enumerate(starts)]
    return "\n".join(["year,month,starts", *rows, ""])


def test_a_table_gives_its_own_dates(declared: Declared) -> None:
    starts = method("umm-al-qura").starts(1447, 1449)
    mine = declared("table: dates.csv", dates_csv=table_of(starts, 1447))
    months = mine.months(1447, 1448)
    assert tuple(month.starts for month in months) == starts[:24]
    assert {(month.basis, month.standing, month.margin.closeness) for month in months} == {
        ("tabulated", "settled", "fixed")
    }
    with pytest.raises(RequestError, match="the table of Mine has no month 1450-01"):
        mine.months(1447, 1449)


def test_adopted_months_begin_with_the_first_of_the_authorities(declared: Declared) -> None:
    months = declared("adopts: [umm-al-qura, tabular-16-civil]").months(1440, 1450)
    makkah, tabular = (method(name).starts(1440, 1450) for name in ("umm-al-qura", "tabular-16-civil"))
    assert [month.starts for month in months] == [min(pair) for pair in zip(makkah, tabular, strict=True)]
    for month, other in zip(months, makkah, strict=True):
        whose = "Umm al-Qura" if month.starts == other else "Tabular calendar (16-civil)"
        assert (month.basis, str(month.evidence.notes[0])) == ("adopted", f"Adopted from {whose}.")
    assert makkah != tabular


def test_an_adopted_month_of_either_length_ends_where_the_next_begins(declared: Declared) -> None:
    months = declared("adopts: [umm-al-qura, tabular-16-civil]").months(1440, 1450)
    for month, after in pairwise(months):
        assert month.ends + timedelta(days=1) == after.starts


# --- what cannot be meant: one message with file, line and key ------------------------------------

def all_of(one: str, other: str) -> str:
    return f"test:\n  all:\n  - {{quantity: {one}}}\n  - {{quantity: {other}}}\nwhere: {{place: makkah}}"


CANNOT_BE_MEANT = {
    # Two thresholds of the same number that no number passes.
    all_of("lag, at_least: 5", "lag, less_than: 3"):
        "4: test: no lag is at_least 5 and less_than 3 at once; drop one of them, or say any",
    all_of("age, at_most: 8", "age, more_than: 8"):
        "4: test: no age is at_most 8 and more_than 8 at once; drop one of them, or say any",
    all_of(
        "altitude, frame: topocentric, air: airless, at_least: 5",
        "altitude, frame: topocentric, air: airless, limb: centre, at: sunset, less_than: 3",
    ): "4: test: no altitude is at_least 5 and less_than 3 at once; drop one of them, or say any",
    # A threshold that does not say what is measured.
    "test: {quantity: altitude, at_least: 3}\nwhere: {place: makkah}":
        "4: test: altitude needs a frame; say frame: geocentric or frame: topocentric",
    "test:\n  all:\n  - {quantity: lag, at_least: 3}\n  - {quantity: elongation, at_least: 3}\nwhere: {place: makkah}":
        "7: item 2 of all: elongation needs a frame; say frame: geocentric or frame: topocentric",
    "test: {quantity: altitude, frame: topocentric, at_least: 3}\nwhere: {place: makkah}":
        "4: test: a topocentric altitude needs air: airless or air: refracted",
    "test: {quantity: lag}\nwhere: {place: makkah}":
        "4: test: lag needs one of at_least, more_than, at_most and less_than",
    "test: {quantity: lag, at_least: 5, less_than: 3}\nwhere: {place: makkah}":
        "4: test: lag needs one of at_least, more_than, at_most and less_than",
    "test: {quantity: hight, at_least: 5}\nwhere: {place: makkah}":
        '4: quantity is "hight", which is not known here; known here: age, altitude, arc-of-vision, '
        "conjunction, elongation, illuminated-percent, lag, relative-azimuth, width",
    # Scopes.
    "test: {criterion: yallop-1997}\nwhere: {anywhere: earth, before: {hour_ut: 2}}":
        "5: before: no sunset between 60 S and 60 N comes before 3:00 UT of its date; give a later hour_ut, at most 48",
    "test: {criterion: yallop-1997}\nwhere: {place: makkah, within: americas}":
        "5: where: say exactly one of place, any_of, every_of, share, within, anywhere and shares_night_with",
    "test: {criterion: yallop-1997}\nwhere: {share: 0.5, of: all, of_area: americas}":
        "5: where: say one of of and of_area",
    "test: {criterion: yallop-1997}\nwhere: {within: all}":
        '5: region "all" has no outline; give it one in regions.yaml',
    "test: {criterion: yallop-1997}\nwhere:\n  within: north":
        '6: the outline of "north" lies beyond 60 degrees of latitude, where there may be no sunset; '
        "name places instead",
    "test: {criterion: yallop-1997}\nwhere: {any_of: []}":
        "5: where: any_of names no place; name at least one",
    "test: {criterion: yallop-1997}\nwhere: {place: makkah, before: {hour_ut: 24}}":
        "5: where: before goes with anywhere: earth; drop it",
    "test: {criterion: yallop-1997}": "1: mine: test and where go together; say what must hold and where",
    # Policies.
    "test: {criterion: yallop-1997}\nwhere: {place: makkah}\npublished: umm-al-qura":
        "1: mine: say exactly one of published, arithmetic, table, adopts, test, every and either",
    "test: {criterion: yallop-1997, accept: [A, C]}\nwhere: {place: makkah}":
        "4: Yallop 1997: classes A, C leave a gap; accept A, B, C, or fewer from the end",
    "adopts:\n- mine": '5: policy "mine" adopts itself in the end; let one of them decide',
    "published: mabims-2021":
        '4: the policy mabims-2021 leaves the place open; give one: --place "name,lat,lon,elevation,zone"',
}


@pytest.mark.parametrize("text", CANNOT_BE_MEANT)
def test_a_policy_that_cannot_be_meant_is_refused_at_its_line(declared: Declared, tmp_path: Path, text: str) -> None:
    with pytest.raises(ContentError) as caught:
        declared(text)
    assert str(caught.value) == f"{tmp_path}/policies.yaml:{CANNOT_BE_MEANT[text]}"


@pytest.mark.parametrize(
    "text",
    [
        # Bounds that leave room between them, or speak of different numbers, or are choices.
        all_of("lag, at_least: 3", "lag, less_than: 5"),
        all_of("lag, at_least: 5", "lag, at_most: 5"),
        all_of("altitude, frame: geocentric, at_least: 5", "altitude, frame: topocentric, air: airless, less_than: 3"),
        all_of(
            "altitude, frame: topocentric, air: airless, limb: upper, at_least: 5",
            "altitude, frame: topocentric, air: airless, limb: lower, less_than: 3",
        ),
        all_of("width, frame: topocentric, at_least: 5", "width, frame: topocentric, at: sunset, less_than: 3"),
        all_of("lag, at_least: 5", "lag, less_than: 3").replace("all:", "any:"),
    ],
)
def test_bounds_that_some_number_passes_are_taken(declared: Declared, text: str) -> None:
    assert " and " in declared(text).in_words or " or " in declared(text).in_words


def test_a_region_without_places_is_refused(declared: Declared, tmp_path: Path) -> None:
    with pytest.raises(ContentError) as caught:
        declared(MABIMS_2021, regions_yaml="all:\n  name: All\n")
    assert str(caught.value) == (
        f'{tmp_path}/regions.yaml:1: all has no "places"; add it: a list of one or more places'
    )


def test_a_table_with_a_month_of_31_days_is_refused_at_its_line(declared: Declared, tmp_path: Path) -> None:
    text = "year,month,starts\n1447,1,2025-06-26\n1447,2,2025-07-27\n"
    with pytest.raises(ContentError) as caught:
        declared("table: dates.csv", dates_csv=text)
    assert str(caught.value) == (
        f"{tmp_path}/dates.csv:3: the month before would have 31 days; a month has 29 or 30 days"
    )
