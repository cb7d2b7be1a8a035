"""Maps are read back: paths to longitudes and latitudes by the picture's own frame, and held against single places."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from datetime import date
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from moonwrit.almanac import Almanac, assemble
from moonwrit.content import load
from moonwrit.policy import NamedPlace
from moonwrit.policy.evening import evening_at
from moonwrit.policy.everywhere import Asked, asked_everywhere
from moonwrit.policy.published import published
from moonwrit.publish.language import ENGLISH, Language
from moonwrit.publish.maps import Chart, Charts, key, region_map, told, world_map
from moonwrit.publish.plate import WIDTH, Box
from moonwrit.resources import starter_folder
from moonwrit.sky.land import Outline

HARBOUR = NamedPlace("Harbour", -38.1, 145.0, 0.0, ZoneInfo("Australia/Melbourne"))
SUVA = NamedPlace("Suva", -18.14, 178.44, 0.0, ZoneInfo("Pacific/Fiji"))
APIA = NamedPlace("Apia", -13.83, -171.77, 0.0, ZoneInfo("Pacific/Apia"))
TROMSO = NamedPlace("Tromsø", 69.65, 18.96, 0.0, ZoneInfo("Europe/Oslo"))
POLICIES = ("yallop-b", "odeh-b", "mabims-2021", "istanbul-1978", "istanbul-2016", "umm-al-qura", "moonset-5-minutes")
MARGIN_DEG = 1.0
"""How far the drawn limit may lie from the true one: the grid's own straightness, and a tenth of a unit."""


@pytest.fixture(scope="module")
def almanac() -> Almanac:
    return assemble(load(starter_folder()), date(2026, 12, 1))[0]


@pytest.fixture(scope="module")
def drawn(almanac: Almanac) -> dict[date, Chart]:
    charts = Charts(almanac)
    found = (charts.of(index) for index in range(len(almanac.months)))
    return {one.chart.on: one.chart for one in found if one is not None}


def asked_by(policy: str, place: NamedPlace = HARBOUR) -> list[Asked]:
    open_place = policy not in ("istanbul-1978", "istanbul-2016", "umm-al-qura")
    method = published(policy, place if open_place else None)
    return asked_everywhere(method, list(method.months(1448, 1448)))


def on(asked: Asked) -> date:
    return date.fromordinal(int(asked.evenings.day[0, 0]))


def rings(path: str) -> list[np.ndarray[tuple[int, ...], np.dtype[np.float64]]]:
    """The subpaths of ``M x y l dx dy ...`` as points in units."""
    out = []
    for part in re.findall(r"M([^M]+)", path):
        start, _, steps = part.rstrip("z").partition("l")
        numbers = np.array([[float(n) for n in start.split()], *np.array(steps.split(), dtype=float).reshape(-1, 2)])
        out.append(np.cumsum(numbers, axis=0))
    return out


def path_of(svg: ET.Element, kind: str) -> str:
    found = [each.get("d", "") for each in svg.iter("path") if each.get("class") == kind]
    assert len(found) <= 1
    return found[0] if found else ""


def covers(path: str, box: Box, longitude: float, latitude: float) -> bool:
    """Whether a filled path covers the point, by the even-odd rule."""
    x, y = (longitude - box.west) * box.view[0], (box.north - latitude) * box.view[1]
    closed = tuple(np.concatenate([ring, ring[:1]]) for ring in rings(path))
    return bool(Outline((closed,)).contains(np.array(x), np.array(y))) if closed else False


def test_every_map_is_well_formed_small_and_within_its_frame(almanac: Almanac, drawn: dict[date, Chart]) -> None:
    """Title and description first; below 60 kB; no point of any path and no mark outside the view box."""
    assert set(drawn) == {evening.on for evening in almanac.evenings}
    for chart in list(drawn.values())[::5]:
        for text in (world_map(chart, ENGLISH, "Three Harbours"), region_map(chart, ENGLISH)):
            assert len(text.encode()) < 60_000
            svg = ET.fromstring(text)
            assert (svg.get("role"), svg[0].tag, svg[1].tag) == ("img", "title", "desc")
            _, _, width, height = (float(n) for n in svg.get("viewBox", "").split())
            assert width == WIDTH
            for kind in ("met", "close", "first", "limit", "land", "outlined"):
                for ring in rings(path_of(svg, kind)):
                    assert (ring > -0.06).all()
                    assert (ring < [width + 0.06, height + 0.06]).all(), kind
            marks = svg.findall("circle")
            assert len(marks) == 3
            for mark in marks:
                assert 0 <= float(mark.get("cx", "")) <= width
                assert 0 <= float(mark.get("cy", "")) <= height


def test_the_places_of_the_demonstration_are_met_where_the_evening_says_so(
    almanac: Almanac, drawn: dict[date, Chart]
) -> None:
    """Yallop's q above -0.014, as ``moonwrit evening --json`` gives it: a filled mark, on the surface that says met in
    both maps, but for what lies within a degree of the limit."""
    seen = set()
    for evening in almanac.evenings:
        chart = drawn[evening.on]
        for spot, row in zip(chart.spots, evening.at.values(), strict=True):
            value = row["yallop_q"]
            assert isinstance(value, float)
            assert spot.met == (value > -0.014)
            seen.add(spot.met)
            if abs(value + 0.014) < 0.01:
                continue
            for surface in (chart.world, chart.region):
                path = surface.layers["met"]
                assert covers(path, surface.box, spot.longitude_deg, spot.latitude_deg) == spot.met, evening.on
    assert seen == {True, False}


@pytest.mark.parametrize("policy", POLICIES)
def test_points_of_the_map_against_single_places(policy: str) -> None:
    """At 60 random points of three evenings, what is drawn is what the policy's test finds there alone; points within
    a degree of the drawn limit are not asked."""
    for asked in asked_by(policy)[::5]:
        chart = Chart(on(asked), asked, [HARBOUR])
        box, layers = chart.world.box, chart.world.layers
        random = np.random.default_rng(asked.evenings.day[0, 0])
        points = [(float(random.uniform(-179, 179)), float(random.uniform(-59, 59))) for _ in range(60)]
        found = asked.met([NamedPlace("", latitude, longitude, 0.0, None) for longitude, latitude in points])
        limit = np.concatenate([np.zeros((0, 2)), *rings(layers["limit"])])
        checked = 0
        for (longitude, latitude), met in zip(points, found, strict=True):
            at = np.array([(longitude - box.west), (box.north - latitude)]) * box.view
            if len(limit) and np.hypot(*(limit - at).T).min() < 3 * MARGIN_DEG * box.view[0]:
                continue
            assert covers(layers["met"], box, longitude, latitude) == met, (longitude, latitude, on(asked))
            checked += 1
        assert checked > 30


def test_where_the_moon_sets_first_is_hatched_and_nowhere_else() -> None:
    """At random points, the hatched surface is where ``moonwrit evening`` gives no lag above nought and the test is far
    from met; surfaces for met and for the Moon's setting first never overlap."""
    asked = asked_by("yallop-b")[6]
    chart = Chart(on(asked), asked, [HARBOUR])
    box, layers = chart.world.box, chart.world.layers
    random = np.random.default_rng(6)
    places = [
        NamedPlace("", float(random.uniform(-59, 59)), float(random.uniform(-179, 179)), 0.0, None) for _ in range(80)
    ]
    hatched = 0
    for place, row in zip(places, evening_at(chart.on, places), strict=True):
        lag, q = row["lag_min"], row["yallop_q"]
        assert isinstance(lag, float)
        assert isinstance(q, float)
        first = covers(layers["first"], box, place.longitude_deg, place.latitude_deg)
        assert not (first and covers(layers["met"], box, place.longitude_deg, place.latitude_deg))
        if abs(lag) > 2 and abs(q + 0.014 + 0.15 * 1.4) > 0.02:
            assert first == (lag <= 0 and q < -0.014 - 0.15 * 1.4)
        hatched += first
    assert hatched > 5


def test_a_deadline_cuts_off_what_comes_after_it() -> None:
    """Istanbul 1978 asks before 24:00 UT: sunset comes later west of some meridian in the Americas, where nothing is
    met, however old the Moon is."""
    for asked in asked_by("istanbul-1978"):
        surface = Chart(on(asked), asked, [HARBOUR]).world
        assert not surface.met[:, surface.grid.longitude_deg < -125].any()
    # And on some evening it is met up to the deadline, so that the cut is seen.
    reach = [
        surface.grid.longitude_deg[surface.met.any(axis=0)].min()
        for asked in asked_by("istanbul-1978")
        if (surface := Chart(on(asked), asked, [HARBOUR]).world).met.any()
    ]
    assert min(reach) < -75


def test_the_map_moves_where_places_keep_the_date_of_the_other_side() -> None:
    """Apia, at 171.77 W, has the date of the east: it stands beyond 180 at the right, on the same map as Suva."""
    asked = asked_by("yallop-b", APIA)[3]
    chart = Chart(on(asked), asked, [SUVA, APIA])
    assert [round(spot.longitude_deg, 2) for spot in chart.spots] == [178.44, 188.23]
    assert (chart.world.box.west, chart.world.box.east) == (-160, 200)
    for text in (world_map(chart, ENGLISH, "Islands"), region_map(chart, ENGLISH)):
        marks = ET.fromstring(text).findall("circle")
        assert len(marks) == 2
        assert float(marks[0].get("cx", "")) < float(marks[1].get("cx", ""))
    assert 160 < chart.region.box.west < 178 < 189 < chart.region.box.east < 210


def test_no_sunset_is_no_answer() -> None:
    """Midsummer above the polar circle: the map reaches to the place, and nothing is met where the Sun does not set."""
    asked = next(each for each in asked_by("yallop-b", TROMSO) if on(each).month == 6)
    chart = Chart(on(asked), asked, [TROMSO])
    assert chart.world.box.north > 70
    assert not chart.spots[0].met
    north = chart.world.grid.latitude_deg > 68
    assert not chart.world.met[north].any()
    assert covers(chart.world.layers["first"], chart.world.box, 18.96, 69.65)


def test_what_is_told_is_what_is_drawn(drawn: dict[date, Chart]) -> None:
    """The share of the Earth by area and the first longitude of the sentences, from the drawn surface itself."""
    chart = drawn[date(2026, 12, 9)]
    random = np.random.default_rng(9)
    box = chart.world.box
    latitudes = np.degrees(np.arcsin(random.uniform(-np.sin(np.pi / 3), np.sin(np.pi / 3), 1500)))
    longitudes = random.uniform(-180, 180, 1500)
    path = chart.world.layers["met"]
    inside = np.array([covers(path, box, float(x), float(y)) for x, y in zip(longitudes, latitudes, strict=True)])
    assert chart.share_met == pytest.approx(inside.mean(), abs=0.04)
    assert chart.first_met is not None
    assert chart.first_met[1] == pytest.approx(longitudes[inside].max(), abs=6)
    said = " ".join(told(chart, ENGLISH))
    assert f"{chart.share_met * 100:.0f}%" in said
    assert "It is not met at: Wattle Harbour, Gannet Harbour, Lantern Harbour." in said


def test_arithmetic_has_no_map() -> None:
    """Tabular calendars do not ask the sky."""
    method = published("tabular-16-civil")
    assert asked_everywhere(method, list(method.months(1448, 1448))) == []


def test_surfaces_differ_in_pattern_and_names_are_kept_apart(drawn: dict[date, Chart]) -> None:
    """Dots and hatches, not colours alone; every entry of the key has another swatch; names are escaped and do not
    overlap; the same bytes every time."""
    chart = drawn[date(2027, 3, 9)]
    text = region_map(chart, ENGLISH)
    assert text == region_map(chart, Language("en"))
    world = world_map(chart, ENGLISH, "A & B <i>")
    assert "A &amp; B &lt;i&gt;" in world
    assert 'fill="url(#world-dots)"' in world
    assert 'fill="url(#world-hatch)"' in world
    assert len({swatch for swatch, _ in key(ENGLISH)}) == len(key(ENGLISH)) == 6
    boxes = []
    for label in ET.fromstring(text).findall("text"):
        size = 23 if label.get("class") == "name" else 19
        wide, x, y = 0.6 * size * len(label.text or ""), float(label.get("x", "")), float(label.get("y", ""))
        left = {"start": x, "middle": x - wide / 2, "end": x - wide}[label.get("text-anchor", "")]
        boxes.append((left, y - 0.75 * size, left + wide, y + 0.2 * size))
    assert len(boxes) > 6
    for index, a in enumerate(boxes):
        for b in boxes[index + 1:]:
            assert not (a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]), (a, b)
