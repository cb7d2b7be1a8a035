"""The table of the fasting days as it is published: page, sheet and feed say the same, and nothing is made up."""

from __future__ import annotations

import re
import shutil
from collections.abc import Callable
from datetime import datetime
from html import unescape
from pathlib import Path
from typing import Any

import icalendar
import pytest
from page_values import ROOT, build
from test_print import _PRINT

PLACES = """
london:
  name: London
  latitude: 51.50
  longitude: -0.13
  timezone: Europe/London
tromso:
  name: Tromso
  latitude: 69.65
  longitude: 18.96
  timezone: Europe/Oslo
"""


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demonstration moved to two places in the north, without its record and its texts."""
    content = tmp_path_factory.mktemp("fasting") / "content"
    shutil.copytree(ROOT / "content", content, ignore=shutil.ignore_patterns("record", "notices", "pages"))
    (content / "places.yaml").write_text((content / "places.yaml").read_text(encoding="utf-8") + PLACES)
    regions = (content / "regions.yaml").read_text(encoding="utf-8")
    (content / "regions.yaml").write_text(
        re.sub(r"places: \[.*\]", "places: [london, tromso]", regions, count=1), encoding="utf-8")
    site = (content / "site.yaml").read_text(encoding="utf-8")
    # Ramadan 1436 (June and July 2015), and 1446 (March 2025) at whose end British clocks went forward.
    for years in ("{from: 1436, to: 1436}", "{from: 1446, to: 1446}"):
        (content / "site.yaml").write_text(site.replace("{from: 1447, to: 1449}", years), encoding="utf-8")
        build(content, content.parent / ("site" if "1446" in years else "light-nights"))
    return content.parent


def rows(page: Path, place: str) -> list[tuple[str, ...]]:
    """The cells of a place's table."""
    text = page.read_text(encoding="utf-8")
    section = text[text.index(f'<h2 id="{place}">'):].partition("</section>")[0]
    body = section[section.index("<tbody>"):]
    return [tuple(unescape(cell) for cell in re.findall(r"<t[hd][^>]*>(.*?)</t[hd]>", row))
            for row in body.split("<tr")[1:]]


def events(feed: Path) -> list[Any]:
    calendar: Any = icalendar.Calendar.from_ical(feed.read_bytes())
    return list(calendar.walk("VEVENT"))


def test_page_and_feed_give_the_same_times(site: Path) -> None:
    """Every numbered row of the page is an event from that dawn to that sunset, with both in its title; dates without
    a number are no events."""
    feed = {str(event["uid"]): event for event in events(site / "site/feeds/fasting/london.ics")}
    matched = 0
    for day, on, dawn, sunset in rows(site / "site/fasting/1446/index.html", "london"):
        if day == "–":
            continue
        event = feed[f"fast-1446-{int(day):02d}-london.main@calendar.three-harbours.example"]
        assert event["dtstart"].dt.strftime("%a %-d %b %H:%M") == f"{on} {dawn}"
        assert event["dtend"].dt.strftime("%a %-d %b %H:%M") == f"{on} {sunset}"
        assert str(event["summary"]) == f"Fast, day {day}: dawn {dawn} – sunset {sunset} (expected)"
        assert str(event["status"]) == "TENTATIVE"
        matched += 1
    assert matched == len(feed) >= 29


def test_the_page_says_rounding_standing_and_whose_times_prevail(site: Path) -> None:
    text = (site / "site/fasting/1446/index.html").read_text(encoding="utf-8")
    assert "18° below the horizon, rounded down to the minute" in text
    assert "rounded up to the minute" in text
    assert text.count("The times of the local authority prevail over these.") == 1 + 2  # and on every sheet
    assert "The lunar days may still shift; the times stay with their civil dates." in text
    assert "Dates without a lunar day are in the month only if it begins or ends otherwise" in text
    assert rows(site / "site/fasting/1446/index.html", "london")[0][0] == "–"


def test_clocks_that_change_are_pointed_out_where_they_do(site: Path) -> None:
    """Clocks in Europe went forward on 30 March 2025, on the last day of that month or the day after it."""
    text = (site / "site/fasting/1446/index.html").read_text(encoding="utf-8")
    assert text.count("The clocks change on") == 2
    assert text.count("The clocks change on Sunday, 30 March 2025; the times are by the clock in force.") == 2


def test_where_there_is_no_time_page_and_feed_say_so_and_give_none(site: Path) -> None:
    """June and July 2015: Tromso has the midnight Sun until 22 July (published season), London no full night until
    late in July. The feed keeps a whole day for each, whose title names the community's own rule."""
    page = site / "light-nights/fasting/1436/index.html"
    tromso = rows(page, "tromso")
    assert {row[2:] for row in tromso} == {("none: the Sun stays above the angle", "none: the Sun does not set")}
    london = rows(page, "london")
    assert {row[2] for row in london} == {"none: the Sun stays above the angle"}
    assert all(re.fullmatch(r"2[01]:\d\d", row[3]) for row in london)
    assert page.read_text(encoding="utf-8").count("None is made up here: the community&#39;s own rule decides.") == 2
    found = events(site / "light-nights/feeds/fasting/tromso.ics")
    assert len(found) in (29, 30)
    for event in found:
        assert not isinstance(event["dtstart"].dt, datetime)
        assert (event["dtend"].dt - event["dtstart"].dt).days == 1
        assert re.fullmatch(r"Fast, day \d+: by the community's own rule", str(event["summary"]).partition(" (")[0])
        assert not re.search(r"\d\d:\d\d", str(event["summary"]))


def test_without_a_declared_angle_there_is_no_table(site: Path, tmp_path: Path) -> None:
    content = tmp_path / "content"
    shutil.copytree(site / "content", content)
    text = (content / "site.yaml").read_text(encoding="utf-8")
    (content / "site.yaml").write_text(re.sub(r"(?m)^fasting:.*\n", "", text), encoding="utf-8")
    made = build(content, tmp_path / "site")
    assert not (made / "fasting").exists()
    assert not (made / "feeds/fasting").exists()
    assert "fasting/" not in (made / "subscribe/index.html").read_text(encoding="utf-8")


@pytest.mark.judge("playwright")
def test_each_place_prints_on_one_sheet(site: Path, node: Callable[..., Any], chromium: str) -> None:
    """Two places, two sheets of A4 and of Letter, in letters of at least 7 points; with a row for a day that may
    still come and, where there is none, words in place of times."""
    for folder, year in (("site", 1446), ("light-nights", 1436)):
        (printed,) = node(_PRINT, chromium, site / folder, f"fasting/{year}/").values()
        assert printed["sheets"] == [2, 2], year
        assert printed["navigation"] == 0
        assert printed["smallest"] >= 7 * 96 / 72
