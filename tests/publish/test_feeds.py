"""The feeds before clients that this project did not write, and against the sections of their standards."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from collections.abc import Callable
from datetime import UTC, date, datetime, timedelta
from pathlib import Path
from typing import Any
from xml.etree import ElementTree as ET
from zoneinfo import ZoneInfo

import feedparser
import icalendar
import ics
import jsonschema
import microdata
import pytest
from page_values import ROOT, build

from live_subscriber import subscribed
from moonwrit.publish.timezones import vtimezone

# A backslash before a letter n is left out: icalendar and libical read it back, but ics takes it for a line break.
AWKWARD = "Comma, semicolon; backslash \\ between, \"quotes\", 🌙 and عيد الفطر: end"
LINES = "First line, with comma.\nSecond; line \\ and 🌙🌙🌙 " + "longer than a line may be, " * 5 + "عيد مبارك"
HERE = Path(__file__).parent


@pytest.fixture(scope="session")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demonstration with two more languages, a second calendar, reminders, and texts that want escaping."""
    content = tmp_path_factory.mktemp("feeds") / "content"
    shutil.copytree(ROOT / "content", content)
    site = (content / "site.yaml").read_text(encoding="utf-8")
    site = re.sub(r"(?m)^languages:.*$", "languages: [ar, tr]\nremind_hours_before: 6", site)
    site += "  table:\n    name: The tabular one\n    policy: tabular\n    region: three-harbours\n"
    (content / "site.yaml").write_text(site, encoding="utf-8")
    observances = (content / "observances.yaml").read_text(encoding="utf-8")
    changed = observances.replace("    en: Eid al-Fitr\n", f"    en: {json.dumps(AWKWARD, ensure_ascii=False)}\n", 1)
    changed = changed.replace("  about: The first day of Muharram, with which the year begins.\n",
                              f"  about: {json.dumps(LINES, ensure_ascii=False)}\n", 1)
    assert changed.count("🌙") > 3
    (content / "observances.yaml").write_text(changed, encoding="utf-8")
    return build(content, content.parent / "site")


@pytest.fixture(scope="session")
def calendars(site: Path) -> list[Path]:
    """Every iCalendar file of the site."""
    found = sorted(site.rglob("*.ics"))
    names = {path.relative_to(site).as_posix() for path in found}
    assert {"feeds/observances.ics", "feeds/main/months.ics", "feeds/table/evenings.ics", "feeds/tags/main.ics",
            "feeds/years/1448.ics", "feeds/fasting/wattle-harbour.ics",
            "ar/feeds/observances.ics", "tr/feeds/table/tags/shia.ics"} <= names
    return found


Events = dict[str, list[dict[str, Any]]]


def parsed_calendar(path: Path) -> Any:
    """Of no type: each property of the library is a union of all value types."""
    return icalendar.Calendar.from_ical(path.read_bytes())


def moment(value: date | datetime) -> str:
    if isinstance(value, datetime):
        return value.astimezone(UTC).strftime("%Y%m%dT%H%M%SZ")
    return value.strftime("%Y%m%d")


@pytest.fixture(scope="session")
def written(calendars: list[Path]) -> Events:
    """What the library that wrote the files reads from them: events by UID."""
    return {str(path): sorted((
        {
            "uid": str(event["uid"]), "starts": moment(event["dtstart"].dt), "ends": moment(event["dtend"].dt),
            "title": str(event["summary"]), "text": str(event["description"]), "status": str(event["status"]),
            "sequence": int(event["sequence"]),
        }
        for event in parsed_calendar(path).walk("VEVENT")
    ), key=lambda event: event["uid"]) for path in calendars}


def by_uid(found: Events) -> Events:
    return {name: sorted(events, key=lambda event: event["uid"]) for name, events in found.items()}


def test_awkward_text_comes_back_equal(site: Path, written: Events) -> None:
    """Commas, semicolons, backslashes, quotes, emoji, right-to-left script and line breaks, in title and text."""
    events = {event["uid"]: event for event in written[str(site / "feeds/observances.ics")]}
    assert events["eid-al-fitr-1448.main@calendar.three-harbours.example"]["title"] == AWKWARD + " (expected)"
    assert events["new-year-1449.main@calendar.three-harbours.example"]["text"].startswith(LINES + "\n\n")


@pytest.mark.judge("ical.js")
def test_ical_js_reads_every_feed_alike(written: Events, node: Callable[..., Any]) -> None:
    assert by_uid(node(HERE / "read_ical.js", "ical.js", *written)) == written


@pytest.mark.judge("node-ical")
def test_node_ical_reads_every_feed_alike(written: Events, node: Callable[..., Any]) -> None:
    assert by_uid(node(HERE / "read_ical.js", "node-ical", *written)) == written


@pytest.mark.judge("libical")
def test_libical_reads_every_feed_alike(written: Events) -> None:
    done = subprocess.run(["/usr/bin/python3", HERE / "read_libical.py", *written], capture_output=True, check=True)
    assert by_uid(json.loads(done.stdout)) == written


@pytest.mark.filterwarnings("ignore::DeprecationWarning", "ignore::FutureWarning")
def test_ics_reads_every_feed_alike(written: Events) -> None:
    """A second Python library; it cannot tell whole days from midnight, so dates alone are compared there."""
    for name, events in written.items():
        text = Path(name).read_text(encoding="utf-8")
        found = sorted(ics.Calendar(text).events, key=lambda event: str(event.uid))
        assert [event.uid for event in found] == [event["uid"] for event in events]
        assert [event.name for event in found] == [event["title"] for event in events]
        assert [event.begin.to("utc").strftime("%Y%m%dT%H%M%SZ")[: len(one["starts"])]
                for event, one in zip(found, events, strict=True)] == [event["starts"] for event in events]


@pytest.mark.judge("vdirsyncer", "khal")
def test_vdirsyncer_and_khal_show_every_kind_of_feed_alike(written: Events, site: Path, tmp_path: Path) -> None:
    """Fetched over HTTP and listed: as many events, the same titles, days and hours."""
    kinds = ["observances.ics", "months.ics", "evenings.ics", "tags/main.ics", "years/1448.ics"]
    melbourne = ZoneInfo("Australia/Melbourne")

    def shown(event: dict[str, Any]) -> tuple[str, str]:
        starts = event["starts"]
        if len(starts) == 8:
            return event["title"], str(date.fromisoformat(starts))
        return event["title"], datetime.fromisoformat(starts).astimezone(melbourne).strftime("%Y-%m-%d %H:%M")

    with subscribed(site, tmp_path / "home", kinds) as subscriber:
        for kind in kinds:
            found = subscriber.look(kind, "2025-01-01", 1700)
            assert sorted(found) == sorted(shown(event) for event in written[str(site / "feeds" / kind)]), kind


def test_a_second_writing_says_the_same(calendars: list[Path], written: Events) -> None:
    """Parsed and written anew by the library, the events are the same ones."""
    for path in calendars:
        again: Any = icalendar.Calendar.from_ical(parsed_calendar(path).to_ical())
        assert sorted(str(event["uid"]) for event in again.walk("VEVENT")) == [one["uid"] for one in written[str(path)]]


# --- RFC 5545 -------------------------------------------------------------------------------------


def test_3_1_lines_are_of_75_octets_at_most_end_in_crlf_and_hold_no_control_character(calendars: list[Path]) -> None:
    for path in calendars:
        content = path.read_bytes()
        assert content.endswith(b"\r\n")
        assert b"\n" not in content.replace(b"\r\n", b"")
        for line in content.split(b"\r\n"):
            assert len(line) <= 75, (path, line)
            assert not re.search(rb"[\x00-\x08\x0a-\x1f\x7f]", line), (path, line)
        content.decode("utf-8")


def test_3_6_1_whole_days_end_on_the_day_after(written: Events, site: Path) -> None:
    events = {event["uid"].partition(".")[0]: event for event in written[str(site / "feeds/observances.ics")]}
    assert (events["ashura-1448"]["starts"], events["ashura-1448"]["ends"]) == ("20260626", "20260627")
    assert (events["eid-al-adha-1447"]["starts"], events["eid-al-adha-1447"]["ends"]) == ("20260528", "20260601")


def test_3_8_1_11_tentative_while_expected_and_the_title_says_so(written: Events) -> None:
    seen = set()
    for name, events in written.items():
        if "evenings" in name or "/ar/" in name or "/tr/" in name:
            continue
        for event in events:
            assert event["status"] in ("TENTATIVE", "CONFIRMED")
            assert (event["status"] == "TENTATIVE") == ("expected" in event["title"].rpartition("(")[2])
            seen.add(event["status"])
    assert seen == {"TENTATIVE", "CONFIRMED"}


def test_3_7_2_there_is_no_method_and_every_event_is_transparent(calendars: list[Path]) -> None:
    for path in calendars:
        calendar = parsed_calendar(path)
        assert "method" not in calendar
        assert {str(event["transp"]) for event in calendar.walk("VEVENT")} == {"TRANSPARENT"}


def test_3_8_4_7_uids_are_unique_and_the_same_in_every_language(written: Events, site: Path) -> None:
    def uids(name: str) -> list[str]:
        return [event["uid"] for event in written[str(site / name)]]

    for name in written:
        assert len(set(uids(name))) == len(uids(name)), name
    assert uids("feeds/observances.ics") == uids("ar/feeds/observances.ics") == uids("feeds/main/observances.ics")
    assert not set(uids("feeds/observances.ics")) & set(uids("feeds/table/observances.ics"))


def test_3_6_5_timed_events_have_their_time_zone_with_them(site: Path) -> None:
    calendar = parsed_calendar(site / "feeds/evenings.ics")
    assert {str(zone["tzid"]) for zone in calendar.walk("VTIMEZONE")} == {"Australia/Melbourne"}
    events = calendar.walk("VEVENT")
    assert len(events) > 50
    for event in events:
        assert event["dtstart"].params["TZID"] == "Australia/Melbourne"
        assert moment(event["dtstart"].dt) < moment(event["dtend"].dt)


@pytest.mark.parametrize("name", ["Australia/Melbourne", "Africa/Casablanca", "Australia/Lord_Howe", "Asia/Jakarta"])
def test_3_6_5_a_time_zone_tells_every_hour_as_the_database_does(name: str) -> None:
    """Each hour of three years, by the last onset before it: offsets as zoneinfo has them, half hours and a summer
    time that rests in Ramadan (Morocco) included."""
    zone = ZoneInfo(name)
    onsets = []
    made: Any = vtimezone(zone, 2026, 2028)
    for part in made.subcomponents:
        utc = part["dtstart"].dt.replace(tzinfo=UTC) - part["tzoffsetfrom"].td
        onsets.append((utc, part["tzoffsetto"].td))
    assert onsets == sorted(onsets)
    hour = datetime(2026, 1, 1, tzinfo=UTC)
    while hour.year < 2029:
        told = [offset for onset, offset in onsets if onset <= hour][-1]
        assert told == hour.astimezone(zone).utcoffset(), hour
        hour += timedelta(hours=1)


def test_3_6_6_reminders_only_where_they_are_asked_for(site: Path, tmp_path: Path) -> None:
    main = parsed_calendar(site / "feeds/tags/main.ics")
    assert all(len(event.walk("VALARM")) == 1 for event in main.walk("VEVENT"))
    assert {str(alarm["trigger"].to_ical().decode()) for alarm in main.walk("VALARM")} == {"-PT6H"}
    plain = build(ROOT / "content", tmp_path / "site")
    assert b"VALARM" not in (plain / "feeds/tags/main.ics").read_bytes()


def test_rfc_7986_the_calendar_says_its_name_source_and_when_to_come_again(site: Path) -> None:
    calendar = parsed_calendar(site / "ar/feeds/tags/main.ics")
    assert str(calendar["source"]) == "https://calendar.three-harbours.example/ar/feeds/tags/main.ics"
    assert calendar["refresh-interval"].params["VALUE"] == "DURATION"
    assert calendar["name"].params["LANGUAGE"] == "ar"
    assert str(calendar["x-wr-calname"]) == str(calendar["name"])
    assert {"color", "last-modified", "url", "x-published-ttl"} <= {key.lower() for key in calendar}


def test_tags_years_and_the_rolling_span(written: Events, site: Path) -> None:
    """A tag's feed holds its observances and no others; a year's file all of the year; subscriptions the year before
    the present one, and on."""
    everything = {event["uid"] for event in written[str(site / "feeds/observances.ics")]}
    by_tag = {path.stem: {event["uid"] for event in written[str(path)]} for path in (site / "feeds/tags").glob("*.ics")}
    assert all(uids <= everything for uids in by_tag.values())
    assert {uid.partition("-14")[0] for uid in by_tag["feast"]} == {"eid-al-fitr", "eid-al-adha"}
    year = written[str(site / "feeds/years/1448.ics")]
    assert len([event for event in year if event["uid"].startswith("month-1448-")]) == 12
    assert {event["uid"] for event in year} > {uid for uid in by_tag["main"] if "-1448." in uid}
    assert all("-1448" in event["uid"] for event in year)


def test_a_subscription_begins_with_the_year_before(tmp_path: Path) -> None:
    content = tmp_path / "content"
    shutil.copytree(ROOT / "content", content, ignore=shutil.ignore_patterns("record"))
    site = (content / "site.yaml").read_text(encoding="utf-8")
    site = site.replace("{from: 1447, to: 1449}", "{from: 1445, to: 1449}")
    (content / "site.yaml").write_text(site, encoding="utf-8")
    feeds = build(content, tmp_path / "site") / "feeds"
    months = (feeds / "months.ics").read_text(encoding="utf-8")
    assert re.findall(r"UID:month-(\d+)-01", months) == ["1447", "1448", "1449"]
    assert "UID:month-1445-01" in (feeds / "years/1445.ics").read_text(encoding="utf-8")


# --- JSON -----------------------------------------------------------------------------------------


def documents(site: Path) -> list[tuple[Path, str]]:
    """Every JSON file of the site with the name of its schema."""
    found = []
    for path in sorted(site.rglob("*.json")):
        if path.parent.name == "schema":
            continue
        kind = "dates" if path.parent.name == "years" or path.stem == "next" else path.stem
        found.append((path, kind))
    assert {kind for _, kind in found} == {"basis", "calendar", "dates", "notices"}
    return found


def printed(*words: str) -> Any:
    """The JSON that a command prints of the demonstration."""
    command = [sys.executable, "-m", "moonwrit.cli", *words, "--json", "--content", str(ROOT / "content")]
    return json.loads(subprocess.run(command, capture_output=True, check=True).stdout)


@pytest.fixture(scope="session")
def commands() -> list[tuple[Any, str]]:
    return [
        (printed("months", "--as-of", "2026-12-01", "--also", "julian"), "months"),
        (printed("months", "--policy", "tabular", "--from", "1", "--to", "1"), "months"),
        (printed("evening", "2026-12-09"), "evening"),
        (printed("evening", "2026-06-21", "--place", "far north,80,20"), "evening"),
        (printed("differ", "--as-of", "2026-12-01"), "differences"),
    ]


def schema(site: Path, kind: str) -> Any:
    return json.loads((site / f"feeds/schema/{kind}.schema.json").read_bytes())


def test_every_json_is_as_its_schema_says(site: Path, commands: list[tuple[Any, str]]) -> None:
    """By the jsonschema library, formats included, and every schema by the metaschema of 2020-12."""
    validators = {}
    for path in (site / "feeds/schema").iterdir():
        jsonschema.Draft202012Validator.check_schema(json.loads(path.read_bytes()))
        kind = path.name.partition(".")[0]
        checker = jsonschema.FormatChecker()
        validators[kind] = jsonschema.Draft202012Validator(schema(site, kind), format_checker=checker)
    for path, kind in documents(site):
        validators[kind].validate(json.loads(path.read_bytes()))
    for value, kind in commands:
        validators[kind].validate(value)
    assert {kind for _, kind in documents(site)} | {kind for _, kind in commands} == set(validators)


@pytest.mark.judge("ajv")
def test_every_json_is_as_its_schema_says_by_a_second_validator(
    site: Path, commands: list[tuple[Any, str]], node: Callable[..., Any], tmp_path: Path
) -> None:
    pairs = [(str(path), str(site / f"feeds/schema/{kind}.schema.json")) for path, kind in documents(site)]
    for number, (value, kind) in enumerate(commands):
        (tmp_path / f"{number}.json").write_text(json.dumps(value), encoding="utf-8")
        pairs.append((str(tmp_path / f"{number}.json"), str(site / f"feeds/schema/{kind}.schema.json")))
    program = """
        const fs = require("fs"), Ajv = require("ajv/dist/2020").default, formats = require("ajv-formats").default;
        const read = (name) => JSON.parse(fs.readFileSync(name, "utf8")), known = {};
        const said = [];
        for (const [document, schema] of JSON.parse(fs.readFileSync(0, "utf8"))) {
          if (!known[schema]) {
            const ajv = new Ajv({ strict: true, allowUnionTypes: true, allErrors: true });
            formats(ajv);
            known[schema] = ajv.compile(read(schema));
          }
          if (!known[schema](read(document))) said.push([document, known[schema].errors]);
        }
        console.log(JSON.stringify(said));
    """
    assert node(program, stdin=json.dumps(pairs)) == []


def test_a_schema_refuses_what_it_should(site: Path) -> None:
    """A validator that says yes to everything would prove nothing."""
    validator = jsonschema.Draft202012Validator(schema(site, "dates"))
    good = json.loads((site / "feeds/next.json").read_bytes())
    assert validator.is_valid(good)
    for key, value in (("standing", "sure"), ("starts", "2026-1-1"), ("page", "javascript:alert(1)")):
        bad = {**good, "dates": [{**good["dates"][0], key: value}]}
        assert not validator.is_valid(bad), key


def test_jscalendar_says_what_icalendar_says(site: Path, written: Events) -> None:
    """RFC 8984: the same events with the same days, titles and sequence numbers, the duration in days."""
    for folder in ("feeds", "ar/feeds", "feeds/table"):
        group = json.loads((site / folder / "calendar.json").read_bytes())
        assert group["@type"] == "Group"
        events = {event["uid"]: event for event in written[str(site / folder / "observances.ics")]}
        assert {one["uid"] for one in group["entries"]} == set(events)
        for one in group["entries"]:
            event = events[one["uid"]]
            assert one["title"] == event["title"]
            assert one["start"] == f"{date.fromisoformat(event['starts'])}T00:00:00"
            days = date.fromisoformat(event["ends"]) - date.fromisoformat(event["starts"])
            assert one["duration"] == f"P{days.days}D"
            assert one["sequence"] == event["sequence"]


def test_next_holds_the_present_month_and_a_year_ahead(site: Path) -> None:
    value = json.loads((site / "feeds/next.json").read_bytes())
    assert value["months"][0]["starts"] <= "2026-12-01" <= value["months"][1]["starts"]
    assert all(one["ends"] >= value["months"][0]["starts"] for one in value["dates"])
    assert max(one["starts"] for one in value["dates"]) > "2027-11-30"
    assert (site / "feeds/next.json").stat().st_size < 40_000
    arabic = json.loads((site / "ar/feeds/next.json").read_bytes())
    assert (arabic["language"], arabic["direction"]) == ("ar", "rtl")
    assert arabic["site"] == "https://calendar.three-harbours.example/ar/"


# --- notices --------------------------------------------------------------------------------------

ATOM = "{http://www.w3.org/2005/Atom}"


def test_atom_is_as_rfc_4287_says_and_a_feed_parser_reads_it(site: Path) -> None:
    """4.1.1 and 4.1.2: id, title, updated once in feed and entries, an author, absolute ids that are all different."""
    for path in sorted(site.rglob("notices.atom")):
        root = ET.fromstring(path.read_bytes())
        assert root.tag == ATOM + "feed"
        entries = root.findall(ATOM + "entry")
        assert len(entries) > 10
        for element in (root, *entries):
            for child in ("id", "title", "updated"):
                assert len(element.findall(ATOM + child)) == 1
            moment = element.findtext(ATOM + "updated") or ""
            assert datetime.fromisoformat(moment).tzinfo is not None
        assert root.find(f"{ATOM}author/{ATOM}name") is not None
        (own,) = [link for link in root.findall(ATOM + "link") if link.get("rel") == "self"]
        assert own.get("href") == root.findtext(ATOM + "id")
        assert str(own.get("href")).endswith(path.relative_to(site).as_posix().replace("feeds/main/", "feeds/"))
        ids = [entry.findtext(ATOM + "id") or "" for entry in entries]
        assert len(set(ids)) == len(ids)
        assert all(name.startswith("https://") for name in ids)
        newest = max(entry.findtext(ATOM + "updated") or "" for entry in entries)
        assert newest <= (root.findtext(ATOM + "updated") or "")

        parsed = feedparser.parse(path.read_bytes())
        assert not parsed.bozo
        assert parsed.version == "atom10"
        told = json.loads(path.with_suffix(".json").read_bytes())
        assert [entry.title for entry in parsed.entries] == [item["title"] for item in told["items"]]
        assert [entry.link for entry in parsed.entries] == [item["url"] for item in told["items"]]


# --- pages ----------------------------------------------------------------------------------------


def test_microdata_says_what_the_feed_says(site: Path, written: Events) -> None:
    """schema.org events on an observance's page, read by an independent parser: days and titles as in the feed."""
    events = {event["uid"].partition(".")[0]: event for event in written[str(site / "feeds/years/1448.ics")]}
    for name in ("ashura", "eid-al-fitr", "ramadan"):
        items = microdata.get_items((site / f"observances/{name}/index.html").read_text(encoding="utf-8"))
        found = {str(item.startDate): item for item in items if str(item.itemtype[0]) == "https://schema.org/Event"}
        assert len(found) == 3
        event = events[f"{name}-1448"]
        item = found[str(date.fromisoformat(event["starts"]))]
        assert item.name == event["title"]
        assert str(item.location.name) == "Three Harbours"
        assert str(item.eventStatus).startswith("https://schema.org/Event")


def test_sitemap_and_canonical_links_agree(site: Path) -> None:
    """Every page but the missing one and the frames is in the sitemap, under the address that it gives itself."""
    root = ET.fromstring((site / "sitemap.xml").read_bytes())
    listed = {element.text for element in root.iter("{http://www.sitemaps.org/schemas/sitemap/0.9}loc")}
    canonical = set()
    for path in site.rglob("*.html"):
        found = re.findall(r'<link rel="canonical" href="([^"]+)">', path.read_text(encoding="utf-8"))
        canonical |= set(found)
        framed = path.parent.name == "embed" and path.name != "index.html"
        assert len(found) == (path.name != "404.html" and not framed and path.parent.parent.name != "embed"), path
        if found:
            place = path.relative_to(site).as_posix().removesuffix("index.html")
            assert found[0] == f"https://calendar.three-harbours.example/{place}"
    assert listed == canonical
    assert len(listed) > 100
    assert "Sitemap: https://calendar.three-harbours.example/sitemap.xml" in (site / "robots.txt").read_text()


# --- on other sites -------------------------------------------------------------------------------


@pytest.mark.judge("jsqr")
def test_qr_codes_lead_to_the_feeds(site: Path, node: Callable[..., Any], chromium: str) -> None:
    """Read from the screen by another library, on a dark page: the webcal address of each subscription."""
    for folder in ("", "ar/"):
        read = node(HERE / "read_qr.js", chromium, site / folder / "subscribe/index.html")
        feeds = f"webcal://calendar.three-harbours.example/{folder}feeds/"
        assert read == [feeds + name for name in ("observances.ics", "months.ics", "evenings.ics")]


def test_the_script_for_other_sites_is_small(site: Path) -> None:
    scripts = sorted((site / "embed").rglob("*.js"))
    assert len(scripts) == 6
    for path in scripts:
        assert path.stat().st_size < 6000, path


@pytest.mark.judge("axe")
def test_another_origin_shows_the_dates(site: Path, node: Callable[..., Any], chromium: str) -> None:
    """In Chromium, from a second origin and without a word of permission from the first: the list in the host's font
    and colour, right to left in Arabic, reached by keyboard, without a fault that axe-core knows; where the script is
    blocked, or nothing is left to show, the link that stands in the element."""
    found = node(HERE / "embedded.js", chromium, site)
    for name, seen in found.items():
        assert seen["faults"] == [], name
        assert seen["strangers"] == [], name
        assert seen.get("violations", []) == [], name
    english = found["/en"]
    assert english["titles"] == ["Ramadan", AWKWARD, "Day of Arafah"]
    assert english["when"][0] == "Tue 9 Feb to Wed 10 Mar 2027 (expected)"
    assert english["today"] == "21 Jumada al-Thani 1448"
    assert (english["direction"], english["language"]) == ("ltr", "en")
    assert english["font"] == "monospace"
    assert english["colour"] == "rgb(10, 60, 10)"
    assert english["focus"] == "Ramadan"
    assert english["links"][0] == "https://calendar.three-harbours.example/observances/ramadan/"
    assert found["/strict"]["titles"] == english["titles"]
    assert found["/ar"]["direction"] == found["/frame"]["direction"] == "rtl"
    assert found["/ar"]["titles"][0] == "رمضان"
    assert found["/ar"]["links"][0] == "https://calendar.three-harbours.example/ar/observances/ramadan/"
    for name in ("/blocked", "/late"):
        assert found[name]["fallback"] == "Fallback"
        assert found[name]["focus"] == "Fallback"
