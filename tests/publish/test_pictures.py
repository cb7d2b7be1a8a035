"""Pictures are read back: coordinates to degrees by the picture's own axes, and held against the data."""

from __future__ import annotations

import json
import re
import xml.etree.ElementTree as ET
from collections.abc import Callable
from datetime import date
from math import atan2, cos, degrees, log10, radians, sin
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from moonwrit.almanac import Almanac, assemble
from moonwrit.content import load
from moonwrit.policy import Margin
from moonwrit.policy.differ import LongRun
from moonwrit.policy.evening import Row, evening_at
from moonwrit.policy.published import NamedPlace
from moonwrit.publish.language import ENGLISH, Language
from moonwrit.publish.pictures import LETTER, agreement, horizon, margins_strip, reach, seasons, text_width
from moonwrit.publish.render import stylesheet
from moonwrit.resources import starter_folder
from moonwrit.sky import Places, ephemeris
from moonwrit.sky.circumstances import Instant

UTC = ZoneInfo("UTC")

# Where the sky is drawn in other proportions than over the demonstration's harbours: steep, slanting, wide apart.
PLACES = (
    NamedPlace("Equator", 0.0, 20.0, 0.0, UTC),
    NamedPlace("Far north", 60.0, 25.0, 0.0, UTC),
    NamedPlace("Far south", -52.0, -70.0, 0.0, UTC),
    NamedPlace("Middle north", 35.0, -5.0, 0.0, UTC),
)
EVENINGS = tuple(date(2026, 1 + n, 19 - n + offset) for n in range(12) for offset in (0, 1))
"""Those of, and after, most conjunctions of 2026 (the 18th of January, and then about a day earlier each month)."""


def ramadans(almanac: Almanac) -> list[tuple[int, date]]:
    return [(month.year, month.starts) for month in almanac.months if month.month == 9]


@pytest.fixture(scope="module")
def almanac() -> Almanac:
    return assemble(load(starter_folder()), date(2026, 12, 1))[0]


@pytest.fixture(scope="module")
def skies(almanac: Almanac) -> list[tuple[Row, ET.Element]]:
    """The circumstances of evenings, each with the picture drawn from them."""
    rows = [(row, almanac.places[place].zone) for one in almanac.evenings for place, row in one.at.items()]
    rows += [(row, UTC) for on in EVENINGS for row in evening_at(on, PLACES)]
    return [(row, ET.fromstring(horizon(row, zone, str(row["place"]), ENGLISH))) for row, zone in rows]


@pytest.fixture(scope="module")
def drawn(almanac: Almanac, skies: list[tuple[Row, ET.Element]]) -> list[ET.Element]:
    """One of every kind of picture, and every sky; also where letters and figures are Arabic."""
    years = [[month for month in almanac.months if month.year == year] for year in (1447, 1448, 1449)]
    arabic = Language("ar")
    more = [
        *(margins_strip(months, language) for months in years for language in (ENGLISH, arabic)),
        *(seasons(ramadans(almanac), 9, language) for language in (ENGLISH, arabic)),
        *(horizon(row, UTC, str(row["place"]), arabic) for row, _ in skies[::10]),
    ]
    return [*(svg for _, svg in skies), *(ET.fromstring(text) for text in more)]


def one(svg: ET.Element, kind: str) -> ET.Element:
    found = every(svg, kind)
    assert len(found) == 1, f"{len(found)} elements of class {kind}"
    return found[0]


def every(svg: ET.Element, kind: str) -> list[ET.Element]:
    return [element for element in svg.iter() if kind in element.get("class", "").split()]


def points(svg: ET.Element) -> list[tuple[float, float]]:
    """Where the Moon is drawn: at sunset, at best time, at moonset."""
    return [(float(x), float(y)) for x, y in (p.split(",") for p in one(svg, "path").get("points", "").split())]


class Axes:
    """Coordinates back to degrees, by the labels and lines of the picture's own axes."""

    def __init__(self, svg: ET.Element) -> None:
        ticks = [(float(t.get("x", "")), float((t.text or "").rstrip("°"))) for t in every(svg, "azimuth")]
        self.azimuths = [(x, value) for x, value in ticks]
        # A label's baseline is five units below its line; both ends of the axis give the scale.
        self.altitudes = [
            (float(t.get("y", "")) - 5, float((t.text or "").rstrip("°"))) for t in every(svg, "altitude")
        ]

    def azimuth(self, x: float) -> float:
        (x0, a0), (x1, a1) = self.azimuths[0], self.azimuths[-1]
        return a0 + (x - x0) * ((a1 - a0) % 360) / (x1 - x0)

    def altitude(self, y: float) -> float:
        (y0, a0), (y1, a1) = self.altitudes[0], self.altitudes[-1]
        return a0 + (y - y0) * (a1 - a0) / (y1 - y0)


def number(row: Row, key: str) -> float:
    value = row[key]
    assert isinstance(value, float), (key, value)
    return value


def apart(a: float, b: float) -> float:
    return abs((a - b + 180) % 360 - 180)


# --- every picture ------------------------------------------------------------------------------------


def test_every_picture_says_what_it_shows(drawn: list[ET.Element]) -> None:
    """An image by role, whose first children are a title and a description in whole sentences."""
    for svg in drawn:
        assert (svg.tag, svg.get("role")) == ("svg", "img")
        title, told = svg[0], svg[1]
        assert (title.tag, told.tag) == ("title", "desc")
        assert len(title.text or "") > 10
        assert len(told.text or "") > 40
        assert (told.text or "").rstrip().endswith("."), told.text


def test_names_are_escaped(skies: list[tuple[Row, ET.Element]]) -> None:
    """A place may be called anything: the picture stays well-formed and says the name as it is."""
    name = 'A & B <west> "harbour"'
    svg = ET.fromstring(horizon(skies[0][0], UTC, name, ENGLISH))
    assert name in (svg[0].text or "")


def test_no_label_leaves_its_picture_by_the_estimate_of_its_width(drawn: list[ET.Element]) -> None:
    """Every text lies inside the view box, and so does every mark."""
    for svg in drawn:
        _, _, width, height = (float(n) for n in svg.get("viewBox", "").split())
        labels = svg.findall(".//text")
        assert len(labels) > 5
        for label in labels:
            x, y, wide = float(label.get("x", "")), float(label.get("y", "")), text_width(label.text or "")
            start = {"start": x, "middle": x - wide / 2, "end": x - wide}[label.get("text-anchor", "")]
            assert start >= -0.1, (label.text, start)
            assert start + wide <= width + 0.1, (label.text, start + wide, width)
            assert 0.75 * LETTER <= y <= height - 0.2 * LETTER, (label.text, y, height)
        for circle in (c for c in svg.iter("circle") if c.get("cx")):
            x, y, r = (float(circle.get(name, "")) for name in ("cx", "cy", "r"))
            assert r <= x <= width - r
            assert r <= y <= height - r


def test_the_estimate_counts_with_the_letters_of_the_style_sheet() -> None:
    """The size of letters stands in two files: they agree."""
    found = re.search(r"\.picture text \{[^}]*font-size: ([\d.]+)px", stylesheet().decode())
    assert found
    assert float(found[1]) == LETTER


_BOXES = """
const {chromium} = require('playwright-core');
(async () => {
  const browser = await chromium.launch({executablePath: process.argv[1], args: ['--no-sandbox']});
  const page = await browser.newPage();
  const {html, css} = JSON.parse(require('fs').readFileSync(0, 'utf8'));
  await page.setContent(html);
  await page.addStyleTag({content: css});
  console.log(JSON.stringify(await page.evaluate(() => [...document.querySelectorAll('svg')].map(svg => ({
    width: svg.viewBox.baseVal.width, height: svg.viewBox.baseVal.height,
    boxes: [...svg.querySelectorAll('text')].map(t => {
      const b = t.getBBox(); return [t.textContent, b.x, b.y, b.x + b.width, b.y + b.height]; }),
  })))));
  await browser.close();
})();
"""


@pytest.mark.judge("playwright")
@pytest.mark.parametrize("direction", ["ltr", "rtl"])
def test_no_label_leaves_its_picture_in_a_browser(
    drawn: list[ET.Element], node: Callable[..., Any], chromium: str, direction: str
) -> None:
    """What the browser measures with its own fonts lies inside the view box (two units for a font's own leading),
    on pages of either direction; and no two labels overlap by more than leading."""
    html = f'<html dir="{direction}"><body>{"".join(ET.tostring(svg, "unicode") for svg in drawn)}</body></html>'
    found = node(_BOXES, chromium, stdin=json.dumps({"html": html, "css": stylesheet().decode()}))
    assert len(found) == len(drawn)
    for picture in found:
        boxes = picture["boxes"]
        assert len(boxes) > 5
        for text, left, top, right, bottom in boxes:
            assert left >= -0.5, (text, left)
            assert top >= -2, (text, top)
            assert right <= picture["width"] + 0.5, (text, right)
            assert bottom <= picture["height"] + 2, (text, bottom)
        for index, (a, a_left, a_top, a_right, a_bottom) in enumerate(boxes):
            for b, b_left, b_top, b_right, b_bottom in boxes[index + 1:]:
                wide = min(a_right, b_right) - max(a_left, b_left)
                high = min(a_bottom, b_bottom) - max(a_top, b_top)
                assert wide < 0.5 or high < 5, (a, b, wide, high)


# --- where to look ------------------------------------------------------------------------------------


def test_one_scale_for_azimuth_and_altitude(skies: list[tuple[Row, ET.Element]]) -> None:
    """A degree is as long along the horizon as up from it, so that angles are as they are in the sky."""
    for row, svg in skies:
        axes = Axes(svg)
        assert len(axes.azimuths) >= 2, row
        assert len(axes.altitudes) >= 2, row
        along = (axes.azimuths[-1][0] - axes.azimuths[0][0]) / ((axes.azimuths[-1][1] - axes.azimuths[0][1]) % 360)
        up = (axes.altitudes[0][0] - axes.altitudes[-1][0]) / axes.altitudes[-1][1]
        assert along == pytest.approx(up, rel=0.02)


def test_sun_and_moon_stand_where_the_circumstances_say(skies: list[tuple[Row, ET.Element]]) -> None:
    """Read back to degrees, the drawn places agree with the data to 0.1 degree (the coordinates have one decimal)."""
    for row, svg in skies:
        axes, moon, sun = Axes(svg), points(svg), one(svg, "sun")
        assert apart(axes.azimuth(float(sun.get("cx", ""))), number(row, "sun_azimuth_deg")) < 0.1
        assert apart(axes.azimuth(moon[0][0]), number(row, "moon_azimuth_deg")) < 0.1
        assert abs(axes.altitude(moon[0][1]) - number(row, "moon_altitude_topocentric_deg")) < 0.1
        if number(row, "lag_min") > 0:
            assert apart(axes.azimuth(moon[1][0]), number(row, "best_moon_azimuth_deg")) < 0.1
            assert abs(axes.altitude(moon[1][1]) - number(row, "best_moon_altitude_topocentric_deg")) < 0.1


def test_marks_lie_on_the_way(skies: list[tuple[Row, ET.Element]]) -> None:
    """The crescents are drawn at the corners of the Moon's way, and nothing else is."""
    for _, svg in skies:
        marks = [
            tuple(float(n) for n in re.findall(r"translate\(([-\d.]+) ([-\d.]+)\)", mark.get("transform", ""))[0])
            for mark in every(svg, "moon")
        ]
        assert marks == points(svg)[:2]


def test_the_sun_has_just_set(skies: list[tuple[Row, ET.Element]]) -> None:
    """At sunset the whole disc is drawn below the horizon, touching it within a tenth of a degree."""
    for _, svg in skies:
        sun, axes = one(svg, "sun"), Axes(svg)
        top = axes.altitude(float(sun.get("cy", "")) - float(sun.get("r", "")))
        assert -0.1 <= top <= 0.03


def test_moonset_is_drawn_where_the_moon_sets(skies: list[tuple[Row, ET.Element]]) -> None:
    """Against the Moon's azimuth at moonset, computed by ``sky``, which the row does not hold: 0.3 degree."""
    sky = ephemeris()
    checked = 0
    for row, svg in skies[::7]:
        setting, moon = row["moonset_utc"], points(svg)
        if number(row, "lag_min") <= 0:
            assert len(moon) == 1
            continue
        assert isinstance(setting, str)
        jd = np.datetime64(setting.rstrip("Z"), "s").astype(float) / 86400 + 2440587.5
        windows = sky.windows(np.array([jd]), 1.0)
        tt = jd + 69.2 / 86400  # delta-T of 2025 to 2028 within a second
        latitude, longitude, elevation = (number(row, key) for key in ("latitude_deg", "longitude_deg", "elevation_m"))
        place = Places.of([(latitude, longitude, elevation, UTC)])
        azimuth = float(Instant(windows, np.array([[[tt]]]), place).moon_azimuth_deg[0, 0, 0])
        assert apart(Axes(svg).azimuth(moon[2][0]), azimuth) < 0.3, (row["date"], row["place"])
        checked += 1
    assert checked > 15


def test_the_lit_side_is_towards_the_sun(skies: list[tuple[Row, ET.Element]]) -> None:
    """The crescent at best time leans by the direction to the Sun at that time, up and right as in the sky."""
    for row, svg in skies:
        if number(row, "lag_min") <= 0:
            continue
        right = (number(row, "best_sun_azimuth_deg") - number(row, "best_moon_azimuth_deg") + 180) % 360 - 180
        up = number(row, "best_sun_altitude_deg") - number(row, "best_moon_altitude_topocentric_deg")
        turned = float(re.findall(r"rotate\(([-\d.]+)\)", one(svg, "best").get("transform", ""))[0])
        assert apart(turned, degrees(atan2(-up, right))) < 2, (row["date"], row["place"])
        # Not turned, the lit path bulges to the right: its outer arc passes (r, 0), clockwise on the page.
        assert re.match(r"M0 -[\d.]+A[\d.]+ [\d.]+ 0 0 1 0 ", one(svg, "best")[1].get("d", ""))


def test_times_are_those_of_the_place(almanac: Almanac) -> None:
    """Wattle Harbour, 9 December 2026: 09:34:19, 09:48 and 10:05 UTC are eleven hours later by its clock."""
    evening = next(evening for evening in almanac.evenings if evening.on == date(2026, 12, 9))
    row, zone = evening.at["wattle-harbour"], almanac.places["wattle-harbour"].zone
    labels = [t.text for t in ET.fromstring(horizon(row, zone, "Wattle Harbour", ENGLISH)).iter("text")]
    expected = [(int(str(row[key])[11:13]) + 11, str(row[key])[14:16]) for key in (
        "sunset_utc", "best_time_utc", "moonset_utc",
    )]
    sunset, best, moonset = (f"{hour}:{minute}" for hour, minute in expected)
    for label in (f"Sun {sunset}", f"Moon {sunset}", f"{best} best time", f"{moonset} moonset"):
        assert label in labels


def test_a_moon_that_sets_before_the_sun_is_drawn_below_the_horizon() -> None:
    """Before the conjunction of 9 December 2026 there is nothing to look for, and the picture says so."""
    (row,) = evening_at(date(2026, 12, 8), PLACES[3:])
    assert number(row, "lag_min") < 0
    svg = ET.fromstring(horizon(row, UTC, "here", ENGLISH))
    assert len(every(svg, "moon")) == 1
    assert every(svg, "setting") == []
    assert Axes(svg).altitude(points(svg)[0][1]) < 0
    assert "has set before" in (svg[1].text or "")


def test_no_picture_where_the_sun_does_not_set() -> None:
    """Midsummer at 70 degrees north."""
    (row,) = evening_at(date(2026, 6, 16), [NamedPlace("North Cape", 71.17, 25.78, 0.0, UTC)])
    assert row["sunset_utc"] is None
    assert horizon(row, UTC, "North Cape", ENGLISH) == ""


# --- margins and seasons ------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("share", "drawn_at"),
    [(1.0, 1.0), (0.1, 2 / 3), (0.01, 1 / 3), (0.001, 0.0), (0.0, 0.0), (7.0, 1.0), (-0.1, -2 / 3), (None, 0.0)],
)
def test_equal_steps_are_tenfold(share: float | None, drawn_at: float) -> None:
    """A day at the end, a thousandth of it (and less) in the middle, thirds between; the sign is the side."""
    assert reach(Margin("altitude", 5.0, 5.0, 0.0, "deg", share, "wide")) == pytest.approx(drawn_at)


def test_months_stand_where_their_margins_are(almanac: Almanac) -> None:
    """Read back by the numbers on the axis, each mark gives its month's share of a day's change and its side."""
    for year in (1447, 1448, 1449):
        months = [month for month in almanac.months if month.year == year]
        svg = ET.fromstring(margins_strip(months, ENGLISH))
        ticks = [(float(t.get("x", "")), float(t.text or "")) for t in every(svg, "share")]
        assert [value for _, value in ticks] == [1, 0.1, 0.01, 0.01, 0.1, 1]
        middle = (ticks[0][0] + ticks[-1][0]) / 2
        tenfold = ticks[5][0] - ticks[4][0]
        names = {(t.text or ""): float(t.get("y", "")) - 5 for t in every(svg, "name")}
        stems = {float(line.get("y2", "")): float(line.get("x2", "")) for line in every(svg, "stem")}
        for month in months:
            share = month.margin.day_share
            assert share is not None
            x = stems[names[ENGLISH.month(month.month)]]
            assert (x > middle) == (share > 0)
            found = (abs(x - middle) - abs(ticks[-1][0] - middle)) / tenfold
            assert found == pytest.approx(min(0, max(-3, log10(abs(share)))), abs=0.01)


def test_standing_is_a_shape(almanac: Almanac) -> None:
    """Discs are settled, rings expected, diamonds amended: one for each month, and one in the key below."""
    months = [month for month in almanac.months if month.year == 1448]
    svg = ET.fromstring(margins_strip(months, ENGLISH))
    for standing, shape in (("settled", "disc"), ("expected", "ring"), ("amended", "diamond")):
        count = sum(month.standing == standing for month in months)
        assert count > 0
        assert len(every(svg, shape)) == count + 1


def test_first_days_stand_in_their_season(almanac: Almanac) -> None:
    """Filled marks lie at the angle of the year at which the month's first day falls: 1 January up, clockwise."""
    svg = ET.fromstring(seasons(ramadans(almanac), 9, ENGLISH))
    rim = one(svg, "axis")
    centre_x, centre_y, radius = (float(rim.get(name, "")) for name in ("cx", "cy", "r"))
    known = [month for month in almanac.months if month.month == 9]
    marks = every(svg, "disc")
    assert len(marks) == len(known) == 3
    for mark, month in zip(marks, known, strict=True):
        angle = radians((month.starts - date(month.starts.year, 1, 1)).days / 365.2422 * 360)
        right, down = float(mark.get("cx", "")) - centre_x, float(mark.get("cy", "")) - centre_y
        far = (right**2 + down**2) ** 0.5
        assert far < radius
        assert (right / far, -down / far) == pytest.approx((sin(angle), cos(angle)), abs=0.005)
    assert len(marks) + len(every(svg, "ring")) == 33


def test_a_stroke_stands_for_each_month_on_another_day() -> None:
    """Expected: as many strokes upwards as months that begin later and downwards
    as months that begin earlier, a unit for a day, up to two."""
    days = (0, 1, -1, 2, 0, -2, -3, 0) + (0,) * 16
    drawn = agreement(LongRun(1447, 1448, days), "Another", Language("en"))
    paths = re.findall(r'<path class="stroke \w+" d="([^"]*)"', drawn)
    later, earlier = (re.findall(r"v(-?\d+)", path) for path in paths)
    assert later == ["-12", "-24"]
    assert earlier == ["12", "24", "24"]
    assert "Of 24 months 19 begin on the same day, 2 later and 3 earlier." in drawn
