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


AGED = " and age (since the geocentric conjunction, at sunset) > 0 h"
IN_WORDS = {
    "altitude, frame: geocentric, more_than: 3": "altitude (geocentric, centre, airless, at sunset) > 3 deg",
    "altitude, frame: topocentric, air: airless, at_most: 3":
        f"altitude (topocentric, centre, airless, at sunset) <= 3 deg{AGED}",
    "altitude, frame: topocentric, air: refracted, limb: upper, at: best-time, less_than: 3":
        f"altitude (topocentric, upper limb, with refraction, at best time) < 3 deg{AGED}",
    "altitude, frame: topocentric, air: airless, limb: lower, at_least: 3":
        "altitude (topocentric, lower limb, airless, at sunset) >= 3 deg",
    "elongation, frame: topocentric, at_least: 7": f"elongation (topocentric, at sunset) >= 7 deg{AGED}",
    "elongation, frame: geocentric, at: best-time, more_than: 7":
        f"elongation (geocentric, at best time) > 7 deg{AGED}",
    "arc-of-vision, frame: geocentric, at_least: 10": "arc of vision (geocentric, airless, at best time) >= 10 deg",
    "arc-of-vision, frame: topocentric, at: sunset, at_least: 10":
        "arc of vision (topocentric, airless, at sunset) >= 10 deg",
    "relative-azimuth, frame: topocentric, at_most: 9": f"relative azimuth (topocentric, at best time) <= 9 deg{AGED}",
    "relative-azimuth, frame: geocentric, at: sunset, at_least: 9":
        f"relative azimuth (geocentric, at sunset) >= 9 deg{AGED}",
    "width, frame: topocentric, at_least: 0.2": f"width (topocentric, at best time) >= 0.2 arcmin{AGED}",
    "width, frame: geocentric, at: sunset, at_least: 0.2": f"width (geocentric, at sunset) >= 0.2 arcmin{AGED}",
    "lag, more_than: 0": "lag (moonset minus sunset) > 0 min",
    "age, at_least: 8": "age (since the geocentric conjunction, at sunset) >= 8 h",
    "age, less_than: 8": f"age (since the geocentric conjunction, at sunset) < 8 h{AGED}",
    "illuminated-percent, at_least: 1": f"illuminated part (geocentric, at sunset) >= 1 %{AGED}",
    "illuminated-percent, at: best-time, at_least: 1": f"illuminated part (geocentric, at best time) >= 1 %{AGED}",
    "conjunction, before_hour_ut: 12": "conjunction before the hour (before 12:00 UT of the date) > 0 h",
    "conjunction, before_hour_ut: 12.5": "conjunction before the hour (before 12:30 UT of the date) > 0 h",
    "conjunction, before_dawn: 15": "conjunction before dawn (Sun 15 deg below the horizon) > 0 h",
}


@pytest.mark.parametrize("test", IN_WORDS)
def test_a_threshold_asks_for_what_it_says(declared: Declared, test: str) -> None:
    """Quantity, frame, limb, air, moment and sign; and the conjunction past, where the old Moon could meet it too."""
    asked = declared(f"test: {{quantity: {test}}}\nwhere: {{place: melbourne}}")
    assert asked.in_words == f"{IN_WORDS[test]}, at Melbourne"


def test_the_old_moon_is_kept_out_where_every_part_lets_it_in_or_any_does(declared: Declared) -> None:
    """All parts must hold: one that the old Moon fails is enough. Any part may: one that it meets is too much."""
    new, old = "{quantity: lag, at_least: 40}", "{quantity: elongation, frame: geocentric, at_least: 8}"
    for join, parts, kept_out in [
        ("all", (new, old), False), ("all", (old, old), True), ("any", (new, old), True), ("any", (new, new), False),
    ]:
        words = declared(f"test: {{{join}: [{', '.join(parts)}]}}\nwhere: {{place: melbourne}}").in_words
        assert words.endswith(f"{AGED}, at Melbourne") == kept_out


# --- scopes ---------------------------------------------------------------------------------------

EARTH = "anywhere on Earth between 60 S and 60 N"
SCOPES = {
    "{place: melbourne}": "at Melbourne",
    "{any_of: [melbourne, perth]}": "at any of Melbourne, Perth",
    "{every_of: all}": "at every one of Melbourne, Perth",
    "{share: 0.5, of: all}": "at 50% at least of Melbourne, Perth",
    "{share: 0.25, of_area: americas}": "over 25% at least of the area of the outline",
    "{within: americas}": "anywhere inside the outline",
    "{anywhere: earth}": EARTH,
    "{anywhere: earth, before: {hour_ut: 24}}": f"{EARTH} before 24:00 UT of the date",
    "{anywhere: earth, before: {hour_ut: 12.5}}": f"{EARTH} before 12:30 UT of the date",
    "{anywhere: earth, before: {dawn_at: makkah}}": f"{EARTH} before the dawn there (Sun 18 deg down)",
    "{anywhere: earth, before: {dawn_at: makkah, depression: 12}}": f"{EARTH} before the dawn there (Sun 12 deg down)",
    "{shares_night_with: london}": f"{EARTH} before the dawn there (Sun 18 deg down)",
}


@pytest.mark.parametrize("where", SCOPES)
def test_a_scope_is_where_it_says(declared: Declared, where: str) -> None:
    asked = declared(f"test: {{quantity: lag, at_least: 45}}\nwhere: {where}")
    assert asked.in_words == f"lag (moonset minus sunset) >= 45 min, {SCOPES[where]}"


@pytest.mark.parametrize("where", ["{share: 0.25, of_area: americas}", "{within: americas}"])
def test_outlines_are_looked_at_every_half_degree(declared: Declared, where: str) -> None:
    condition = declared(f"test: {{quantity: lag, at_least: 45}}\nwhere: {where}").eras[0].condition
    assert isinstance(condition, Scoped)
    assert isinstance(condition.scope, Within)
    assert condition.scope.step_deg == 0.5


def test_a_lower_sun_at_dawn_is_an_earlier_deadline(declared: Declared) -> None:
    """Anywhere whose sunset comes before the dawn at Makkah: at 18 degrees no month is earlier than at 6, and without
    more words the dawn is that of 18."""
    test, dawn = "test: {criterion: istanbul-5-8}\n", "where: {anywhere: earth, before: {dawn_at: makkah"
    early, late, plain = (
        declared(f"{test}{dawn}{more}}}}}").starts(1440, 1447) for more in (", depression: 18", ", depression: 6", "")
    )
    assert plain == early != late
    assert all(one <= other for one, other in zip(late, early, strict=True))
    assert declared(f"{test}where: {{shares_night_with: makkah}}").starts(1440, 1447) == plain


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


def test_a_published_policy_bears_the_names_that_the_community_gives_it(declared: Declared) -> None:
    """Name, title, summary and who decides are its own; the source too, or else the published one."""
    head = "mine:\n  name: Mine\n  decided_by: record\n"
    plain = declared("published: istanbul-5-8\nplace: london", head)
    published = method("istanbul-5-8", None, LONDON)
    assert (plain.name, plain.title, plain.source, plain.summary, plain.decided_by) == (
        "mine", "Mine", published.source, "", "record")
    assert (plain.note, plain.rests_on, plain.in_words) == (published.note, published.rests_on, published.in_words)
    told = declared("published: istanbul-5-8\nplace: london\nsource: Our book\nsummary: In short", head)
    assert (told.source, told.summary) == ("Our book", "In short")
    month = plain.months(1447, 1447)[0]
    assert (month.policy, month.standing) == ("mine", "expected")


@pytest.mark.parametrize(
    "text",
    ["test: {quantity: lag, at_least: 45}\nwhere: {place: london}", "arithmetic: {pattern: fatimid}",
     "adopts: [umm-al-qura]"],
)
def test_a_policy_of_the_community_says_its_own_name_source_and_summary(declared: Declared, text: str) -> None:
    """With what it asks as the only difference; without them it says nothing."""
    told = declared(f"{text}\nsource: Our book\nsummary: In short")
    plain = declared(text)
    assert (plain.name, plain.title, plain.source, plain.summary, plain.decided_by) == (
        "mine", "Mine", "", "", "calculation")
    assert replace(told, source="", summary="").in_words == plain.in_words
    assert (told.source, told.summary) == ("Our book", "In short")


def test_a_policy_rests_on_every_criterion_that_it_names_once(declared: Declared) -> None:
    """In the order written, wherever they stand."""
    asked = declared("""\
either:
- test: {any: [{criterion: lag-48}, {all: [{quantity: age, more_than: 0}, {criterion: schoch-1930}]}]}
  where: {place: london}
- every:
  - test: {criterion: lag-48}
    where: {place: perth}
  - test: {criterion: yallop-1997, accept: [A]}
    where: {place: perth}
""")
    assert [each.name for each in asked.rests_on] == ["lag-48", "schoch-1930", "yallop-1997"]


@pytest.mark.parametrize(("latitude", "named"), [("45", "45 N"), ("0.5", "0.5 N"), ("0", "0 N"), ("-45.5", "45.5 S")])
def test_a_fallback_on_another_latitude_is_named_by_its_side(declared: Declared, latitude: str, named: str) -> None:
    asked = declared("test: {criterion: lag-48}\nwhere: {place: tromso}\nfallback: {latitude: " + latitude + "}")
    assert asked.in_words.endswith(f"at Tromsø (where the Sun does not set: {named} on the meridian of Tromsø)")


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
