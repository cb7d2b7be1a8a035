"""Content folders, whole and faulty: each fault is named with its file, its line and how to mend it."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from datetime import date, datetime, timedelta, timezone
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from moonwrit.content import Content, load, schemas, yaml
from moonwrit.content.load import OPTIONAL, RECORD, SHAPES
from moonwrit.errors import ContentError

EXAMPLE = Path(__file__).resolve().parents[2] / "content"

# The least that a community has to write, one value a line so that line numbers can be read off.
FILES = {
    "site.yaml": """\
community: Council
address: https://example.org/
years:
  from: 1447
  to: 1448
contact: us@example.org
authority: The council
calendars:
  main:
    name: Calendar
    policy: seen
    region: all
""",
    "places.yaml": """\
north:
  name: North
  latitude: -38.1
  longitude: 145
  timezone: Australia/Melbourne
south:
  name:
    en: South
    ar: الجنوب
  latitude: -39
  longitude: 145
  elevation: 10
  timezone: Australia/Melbourne
""",
    "regions.yaml": """\
all:
  name: All
  places:
    - north
    - south
""",
    "policies.yaml": """\
seen:
  name: Seen
  decided_by: record
  adopted: 2025-06-01
  published: umm-al-qura
""",
    "observances.yaml": """\
fast:
  name: Fast
  when:
    month: 9
    day: 1
    run: month
""",
    "record/decisions.yaml": """\
- month: 1448-07
  starts: 2026-12-10
  basis: sighted
  by: The committee
  at: 2026-12-01T09:00:00+11:00
""",
}
PUBLISHED = frozenset({"umm-al-qura", "tabular-16-civil"})

Write = Callable[..., Path]


@pytest.fixture
def write(tmp_path: Path) -> Write:
    """``write("places.yaml", "from", "to")``: the content with that one text replaced; its folder."""

    def written(file: str = "", old: str = "", new: str = "") -> Path:
        for name, text in FILES.items():
            if name == file:
                assert text.count(old) == 1, f"{old!r} stands {text.count(old)} times in {name}"
                text = text.replace(old, new)
            (tmp_path / name).parent.mkdir(exist_ok=True)
            (tmp_path / name).write_text(text, encoding="utf-8")
        return tmp_path

    return written


def message(folder: Path, published: frozenset[str] | None = PUBLISHED) -> str:
    """What is said of the faulty content in ``folder``, without the folder's own name."""
    with pytest.raises(ContentError) as caught:
        load(folder, published)
    text = str(caught.value)
    assert text.startswith(str(folder))
    return text.removeprefix(f"{folder}/")


def test_values_are_typed_and_in_the_order_written(write: Write) -> None:
    content = load(write(), PUBLISHED)
    assert [*content.places] == ["north", "south"]
    assert content.places["south"].name == {"en": "South", "ar": "الجنوب"}
    assert content.places["north"].latitude == -38.1
    assert content.places["north"].elevation == 0.0
    assert content.policies["seen"].adopted == date(2025, 6, 1)
    melbourne = timezone(timedelta(hours=11))
    assert content.decisions[0].at == datetime(2026, 12, 1, 9, tzinfo=melbourne)
    assert content.site.years.first == 1447
    assert content.observances["fast"].when.run == "month"


def test_lines_are_known_to_later_layers(write: Write) -> None:
    content = load(write(), PUBLISHED)
    assert content.line_of("places.yaml", "south", "latitude") == 10
    assert content.line_of("regions.yaml", "all", "places", 1) == 5
    # What is not written has the line of what is around it.
    assert content.line_of("places.yaml", "north", "elevation") == 1
    error = content.error("policies.yaml", ("seen", "published"), "it does not reach so far", "ask for less")
    assert str(error) == f"{content.folder}/policies.yaml:5: it does not reach so far; ask for less"


def test_a_place_keeps_its_zone_apart_from_the_machine_s(write: Write) -> None:
    zone = load(write()).places["north"].zone
    assert zone.key == "Australia/Melbourne"
    # Summer time in Victoria, ten hours ahead and one more (common practice, no source).
    assert datetime(2026, 12, 1, tzinfo=zone).utcoffset() == timedelta(hours=11)
    assert datetime(2026, 7, 1, tzinfo=zone).utcoffset() == timedelta(hours=10)


def test_content_cannot_be_changed(write: Write) -> None:
    content: Any = load(write())
    with pytest.raises(TypeError):
        content.places["west"] = content.places["north"]
    with pytest.raises(AttributeError):
        content.site = None
    with pytest.raises(ValueError, match="frozen"):
        content.places["north"].latitude = 0.0


# Faults in one file: the text that is replaced, what by, and all that is then said.
FAULTS = [
    (
        "places.yaml", "  elevation: 10\n", "  elevation: 10\n  colour: red\n",
        'places.yaml:13: unknown key "colour"; '
        "known here: elevation, latitude, longitude, name, timezone",
    ),
    (
        "places.yaml", "elevation:", "elevatoin:",
        'places.yaml:12: unknown key "elevatoin"; did you mean "elevation"?',
    ),
    (
        "site.yaml", "authority:", "authorty:",
        'site.yaml:7: unknown key "authorty"; did you mean "authority"?',
    ),
    (
        "site.yaml", "authority: The council\n", "",
        'site.yaml:1: the file has no "authority"; add it',
    ),
    (
        # The keys of the file are meant, and not the names that the program has for them.
        "site.yaml", "  from: 1447\n", "  from: 1447\n  first: 1447\n",
        'site.yaml:5: unknown key "first"; known here: from, to',
    ),
    (
        "places.yaml", "latitude: -38.1", "latitude: -98.1",
        "places.yaml:3: latitude is -98.1, which is below -90; "
        "write degrees north of the equator, -90 to 90; south is negative",
    ),
    (
        "places.yaml", "  latitude: -39\n  longitude: 145", "  latitude: -39\n  longitude: 181",
        "places.yaml:11: longitude is 181, which is above 180; "
        "write degrees east of Greenwich, -180 to 180; west is negative",
    ),
    (
        "places.yaml", "latitude: -38.1", 'latitude: "-38.1"',
        'places.yaml:3: latitude is "-38.1", which is not a number; write it without quotes: -38.1',
    ),
    (
        "places.yaml", "latitude: -38.1", "latitude: 38.1 S",
        'places.yaml:3: latitude is "38.1 S", which is not a number; '
        "write degrees north of the equator, -90 to 90; south is negative",
    ),
    (
        "places.yaml", "latitude: -38.1", "latitude: true",
        "places.yaml:3: latitude is true, which is not a number; "
        "write degrees north of the equator, -90 to 90; south is negative",
    ),
    (
        "places.yaml", "elevation: 10", "elevation:",
        "places.yaml:12: elevation is empty; write metres above sea level, -500 to 9000",
    ),
    (
        "places.yaml", "North\n  latitude: -38.1\n", "North\n",
        'places.yaml:1: north has no "latitude"; '
        "add it: degrees north of the equator, -90 to 90; south is negative",
    ),
    (
        "places.yaml", "longitude: 145\n  timezone: Australia/Melbourne\nsouth",
        "longitude: 145\n  timezone: Melbourne\nsouth",
        'places.yaml:5: timezone: time zone "Melbourne" is unknown; did you mean "Australia/Melbourne"?',
    ),
    (
        "places.yaml", "longitude: 145\n  timezone: Australia/Melbourne\nsouth",
        "longitude: 145\n  timezone: localtime\nsouth",
        'places.yaml:5: timezone: time zone "localtime" is unknown; write for instance Australia/Melbourne',
    ),
    (
        "places.yaml", "name: North", "name: 12",
        "places.yaml:2: name: this is not text; put it in quotes",
    ),
    (
        "places.yaml", "name: North", "name:",
        "places.yaml:2: name: no text is written; write it after the colon",
    ),
    (
        "places.yaml", "name: North", "name: [North]",
        "places.yaml:2: name: this is a list; write one text, or a text for each language (en: ..., ar: ...)",
    ),
    (
        "places.yaml", "name: North", 'name: " "',
        "places.yaml:2: name: text is empty; write something or drop the key",
    ),
    (
        "places.yaml", "name: North", 'name: "No\\x07rth"',
        "places.yaml:2: name: text holds a control character; remove it",
    ),
    (
        "places.yaml", "    ar: الجنوب", "    arabic: الجنوب",
        'places.yaml:7: name: "arabic" is not a language code; write for instance en, ar, tr',
    ),
    (
        "places.yaml", "    en: South\n", "",
        'places.yaml:7: name has no text in the site\'s language, "en"; add en: ...',
    ),
    (
        "places.yaml", "    en: South", "    en: 7",
        'places.yaml:8: en is 7, which is not text; put it in quotes: "7"',
    ),
    (
        "places.yaml", "south:", "South Harbour:",
        'places.yaml:6: "South Harbour" cannot be a name here; use small letters, digits and single hyphens',
    ),
    (
        "site.yaml", "authority: The council", "authority: The council\nlanguage: English",
        'site.yaml:8: language: "English" is not a language code; write for instance en, ar, tr',
    ),
    (
        "site.yaml", "https://example.org/", "example.org",
        'site.yaml:2: address is "example.org", which is not of the form wanted; '
        "write the address under which the site will stand, for instance https://example.org/calendar/",
    ),
    (
        "site.yaml", "to: 1448", "to: 1440",
        "site.yaml:3: years: to: 1440 comes before from: 1447; swap them",
    ),
    (
        "site.yaml", "from: 1447", "from: 0",
        "site.yaml:4: from is 0, which is below 1; write the first Hijri year, for instance 1447",
    ),
    (
        "site.yaml", "years:\n  from: 1447\n  to: 1448", "years: 1447",
        "site.yaml:3: years is 1447, which is not a mapping; write its keys and values, indented",
    ),
    (
        "record/decisions.yaml", "2026-12-01T09:00:00+11:00", "2026-02-30T09:00:00+11:00",
        'record/decisions.yaml:5: at: "2026-02-30T09:00:00+11:00" is not a date and time '
        "(there is no such date and time); write for instance 2026-12-01T09:00:00+11:00",
    ),
    (
        "record/decisions.yaml", "2026-12-01T09:00:00+11:00", '"1796083200"',
        'record/decisions.yaml:5: at: "1796083200" is not a date and time; '
        "write for instance 2026-12-01T09:00:00+11:00",
    ),
    (
        "record/decisions.yaml", "2026-12-01T09:00:00+11:00", "20261201",
        "record/decisions.yaml:5: at is 20261201, which is not a date and time; "
        "write a date and time such as 2026-12-01T09:00:00+11:00",
    ),
    (
        "record/decisions.yaml", "T09:00:00+11:00", "",
        "record/decisions.yaml:5: at: 2026-12-01T00:00:00 has no time zone; write it as 2026-12-01T09:00:00+11:00",
    ),
    (
        "site.yaml", "  main:\n    name: Calendar\n    policy: seen\n    region: all\n", "  {}\n",
        "site.yaml:8: calendars is an empty mapping, which is too short; write at least 1 below it",
    ),
    (
        "policies.yaml", "2025-06-01", "2025-06-31",
        'policies.yaml:4: adopted: "2025-06-31" is not a date (there is no such date); '
        "write for instance 2026-12-01",
    ),
    (
        "policies.yaml", "decided_by: record", "decided_by: records",
        'policies.yaml:3: decided_by is "records", which is not known here; did you mean "record"?',
    ),
    (
        "policies.yaml", "  published: umm-al-qura", "  arithmetic:\n    pattern: 17",
        'policies.yaml:6: pattern is "17", which is not known here; known here: 15, 16, fatimid, habash',
    ),
    (
        "observances.yaml", "month: 9", "month: 13",
        "observances.yaml:4: month is 13, which is above 12; "
        "write a lunar month, 1 (Muharram) to 12 (Dhu al-Hijja), or every",
    ),
    (
        "observances.yaml", "month: 9", "month: evry",
        'observances.yaml:4: month is "evry", which is not one of the values allowed here; '
        "write a lunar month, 1 (Muharram) to 12 (Dhu al-Hijja), or every",
    ),
    (
        "observances.yaml", "month: 9", "month: 9.5",
        "observances.yaml:4: month is 9.5, which is not one of the values allowed here; "
        "write a lunar month, 1 (Muharram) to 12 (Dhu al-Hijja), or every",
    ),
    (
        "observances.yaml", "month: 9", 'month: "9"',
        'observances.yaml:4: month is "9", which is not one of the values allowed here; '
        "write it without quotes: 9",
    ),
    (
        "observances.yaml", "    run: month\n", "    night: yes\n",
        'observances.yaml:6: night is "yes", which is not true or false; '
        "write true for the night before the day, from the sunset of the evening before",
    ),
    (
        "observances.yaml", "    day: 1\n    run: month\n", "    last: freitag\n",
        'observances.yaml:5: last is "freitag", which is not known here; did you mean "friday"?',
    ),
    (
        "observances.yaml", "    run: month\n", "    last: friday\n",
        "observances.yaml:3: when: say exactly one of day, last and last_nights",
    ),
    (
        "observances.yaml", "    run: month\n", "    odd: true\n",
        "observances.yaml:3: when: odd goes with last_nights; drop it or say last_nights: 10",
    ),
    (
        "observances.yaml", "  name: Fast\n", "  name: Fast\n  tags: main\n",
        'observances.yaml:3: tags is "main", which is not a list; write a list of words of your own, such as main',
    ),
    (
        "observances.yaml", "  name: Fast\n", "  name: Fast\n  tags: [main, 7]\n",
        'observances.yaml:3: item 2 of tags is 7, which is not text; put it in quotes: "7"',
    ),
    (
        "observances.yaml", FILES["observances.yaml"], "- fast\n",
        "observances.yaml:1: the file is a list, which is not a mapping; write its keys and values, indented",
    ),
    (
        "observances.yaml", "    run: month\n", "    run: month\n    day: 2\n",
        'observances.yaml:7: the key "day" is repeated; it is first on line 5; keep one of them',
    ),
    # Faults between files.
    (
        "regions.yaml", "- south", "- sout",
        'regions.yaml:5: place "sout" is not defined; did you mean "south"?',
    ),
    (
        "regions.yaml", "\n    - north\n    - south", " []",
        "regions.yaml:3: places is an empty list, which is too short; write a list of one or more places",
    ),
    (
        "site.yaml", "region: all", "region: nowhere",
        'site.yaml:12: region "nowhere" is not defined; known here: all',
    ),
    (
        "site.yaml", "policy: seen", "policy: umm-al-qurra",
        'site.yaml:11: policy "umm-al-qurra" is not defined; did you mean "umm-al-qura"?',
    ),
    (
        "policies.yaml", "published: umm-al-qura", "published: tabular-16",
        'policies.yaml:5: published policy "tabular-16" is not defined; did you mean "tabular-16-civil"?',
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  test:\n    criterion: yallop-1997\n  where:\n    place: nort",
        'policies.yaml:8: place "nort" is not defined; did you mean "north"?',
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  test: {criterion: yallop-1997}\n  where:\n    any_of:\n    - north\n    - nort",
        'policies.yaml:9: place "nort" is not defined; did you mean "north"?',
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  test: {criterion: yallop-1997}\n  where:\n    any_of: al",
        'policies.yaml:7: region "al" is not defined; did you mean "all"?',
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  test: {criterion: yallop-1997}\n  where:\n    within: all",
        'policies.yaml:7: region "all" has no outline; give it one in regions.yaml',
    ),
    (
        "regions.yaml", "  name: All\n", "  name: All\n  outline: ../all.geojson\n",
        'regions.yaml:3: the outline "../all.geojson" lies outside the content folder; '
        "keep it beside regions.yaml and give its name alone",
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  adopts:\n  - umm-al-qura\n  - sein",
        'policies.yaml:7: policy "sein" is not defined; did you mean "seen"?',
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  test: {criterion: yallop-1997}\n  where:\n    any_of: [north,\n     3]",
        'policies.yaml:8: item 2 of any_of is 3, which is not text; put it in quotes: "3"',
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  test:\n    criterion: yallop-1997\n    acept: [A]\n  where: {place: north}",
        'policies.yaml:7: unknown key "acept"; did you mean "accept"?',
    ),
    (
        "policies.yaml", "  published: umm-al-qura",
        "  test:\n    all:\n    - quantity: altitude\n      frame: geocentric\n      at_least: high\n"
        "  where: {place: north}",
        'policies.yaml:9: at_least is "high", which is not a number; write a number',
    ),
]


@pytest.mark.parametrize(("file", "old", "new", "said"), FAULTS, ids=[said for *_, said in FAULTS])
def test_a_fault_is_named(write: Write, file: str, old: str, new: str, said: str) -> None:
    assert message(write(file, old, new)) == said


def test_a_missing_file(write: Write) -> None:
    folder = write()
    (folder / "regions.yaml").unlink()
    assert message(folder) == "regions.yaml: the file is missing; add it, with {} where it has nothing to say"
    (folder / "region.yml").write_text(FILES["regions.yaml"], encoding="utf-8")
    assert message(folder) == 'regions.yaml: the file is missing; rename "region.yml" to regions.yaml'


OUTLINED = "  outline: all.geojson\n"
TRIANGLE = '{"type": "Polygon", "coordinates": [[[0, 0], [1, 0], [0, 1], [0, 0]]]}'


def test_a_region_may_have_an_outline(write: Write) -> None:
    folder = write("regions.yaml", "  name: All\n", "  name: All\n" + OUTLINED)
    (folder / "all.geojson").write_text(TRIANGLE, encoding="utf-8")
    assert load(folder).outlines == {"all": ((((0.0, 0.0), (1.0, 0.0), (0.0, 1.0), (0.0, 0.0)),),)}


def test_a_missing_or_faulty_outline_is_named(write: Write) -> None:
    folder = write("regions.yaml", "  name: All\n", "  name: All\n" + OUTLINED)
    assert message(folder) == "all.geojson: the file is missing; put the outline beside regions.yaml"
    (folder / "all.geojson").write_text('{"type": "Point"}', encoding="utf-8")
    assert message(folder) == 'all.geojson: "Point" is not an outline; keep nothing but polygons in it'


def test_a_missing_folder(tmp_path: Path) -> None:
    with pytest.raises(ContentError) as caught:
        load(tmp_path / "absent")
    expected = f"{tmp_path}/absent: there is no such content folder; name the folder that holds site.yaml"
    assert str(caught.value) == expected


def test_a_file_that_is_a_folder(write: Write) -> None:
    folder = write()
    (folder / "places.yaml").unlink()
    (folder / "places.yaml").mkdir()
    said = "places.yaml: the file cannot be read (Is a directory); give its path, and the right to read it"
    assert message(folder) == said


def test_an_empty_file(write: Write) -> None:
    folder = write("observances.yaml", FILES["observances.yaml"], "# nothing yet\n")
    assert message(folder) == "observances.yaml: the file is empty; write its keys, or {} where it has none"
    (folder / "observances.yaml").write_text("{}\n", encoding="utf-8")
    assert load(folder).observances == {}


def test_the_first_fault_is_reported_and_the_others_counted(write: Write) -> None:
    folder = write("places.yaml", "latitude: -38.1", "latitude: 91\n  longitud: 3")
    (folder / "observances.yaml").write_text("fast:\n  name: Fast\n", encoding="utf-8")
    (folder / "site.yaml").write_text(FILES["site.yaml"].replace("all", "al"), encoding="utf-8")
    assert message(folder) == 'site.yaml:12: region "al" is not defined; did you mean "all"? (and 3 more)'


def test_published_names_are_not_asked_for_where_they_are_not_given(write: Write) -> None:
    assert load(write("policies.yaml", "umm-al-qura", "anything")).policies["seen"].published == "anything"
    assert load(write("site.yaml", "policy: seen", "policy: anything")).site.calendars["main"].policy == "anything"


def test_a_calendar_may_use_a_published_policy(write: Write) -> None:
    content = load(write("site.yaml", "policy: seen", "policy: tabular-16-civil"), PUBLISHED)
    assert content.site.calendars["main"].policy == "tabular-16-civil"


# The example, and the schemas.


def test_the_example_is_whole() -> None:
    content = load(EXAMPLE, frozenset({"umm-al-qura"}))
    assert isinstance(content, Content)
    calendar = content.site.calendars["main"]
    assert calendar.policy in content.policies
    assert len(content.regions[calendar.region].places) == 3
    assert {place.timezone for place in content.places.values()} == {"Australia/Melbourne"}
    assert len(content.observances) == 16
    languages = {code for one in content.observances.values() for code in one.name}
    assert languages == {"en", "ar", "tr", "ur", "id", "fr"}


def test_the_schemas_are_schemas_and_the_example_keeps_them() -> None:
    assert [*schemas()] == [*SHAPES, *RECORD, *OPTIONAL]
    for file in FILES:
        schema = schemas()[file]
        assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
        jsonschema.Draft202012Validator.check_schema(schema)
        validator = jsonschema.Draft202012Validator(schema)
        validator.validate(yaml.read(EXAMPLE / file).value)
        validator.validate(yaml.parse(FILES[file].encode(), Path(file)).value)


@pytest.mark.parametrize(
    ("file", "value"),
    [
        ("places.yaml", {"north": {"name": "N", "latitude": 91, "longitude": 0, "timezone": "UTC"}}),
        ("places.yaml", {"north": {"name": {"english": "N"}, "latitude": 0, "longitude": 0, "timezone": "UTC"}}),
        ("observances.yaml", {"fast": {"name": "F", "when": {"month": "evry", "day": 1}}}),
        ("observances.yaml", {"fast": {"name": "F", "when": {"month": 9, "day": 1}, "colour": "red"}}),
        ("regions.yaml", {"all": {"name": "A", "places": []}}),
    ],
)
def test_the_schemas_refuse_what_loading_refuses(file: str, value: Any) -> None:
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.Draft202012Validator(schemas()[file]).validate(value)


def test_reading_content_loads_no_astronomy() -> None:
    program = (
        "import sys, pathlib; from moonwrit.content import load; load(pathlib.Path(sys.argv[1]));"
        "print(*sorted({name.partition('.')[0] for name in sys.modules}))"
    )
    done = subprocess.run(
        [sys.executable, "-c", program, str(EXAMPLE)],
        capture_output=True, text=True, check=True, env={"PYTHONPATH": ":".join(sys.path)},
    )
    loaded = set(done.stdout.split())
    assert {"moonwrit", "pydantic", "yaml"} <= loaded
    assert not loaded & {"numpy", "skyfield", "jplephem", "babel", "jinja2", "icalendar", "rich", "click"}
