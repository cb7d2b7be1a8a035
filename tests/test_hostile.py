"""Content written by somebody who means harm, or by a broken program.

Text from outside stays text, in every page and feed; what cannot be taken is one message that names the file; and
neither time nor memory goes beyond a bound.
"""

from __future__ import annotations

import json
import re
import resource
import shutil
import subprocess
import sys
from collections.abc import Callable, Iterator
from dataclasses import replace
from datetime import UTC, date, datetime
from html.parser import HTMLParser
from pathlib import Path
from typing import Any
from xml.etree import ElementTree as ET

import icalendar
import pytest
import yaml
from click.testing import CliRunner
from hypothesis import example, given, settings
from hypothesis import strategies as st
from pydantic import TypeAdapter, ValidationError

from blotted import shape
from demonstration import one_language
from moonwrit import journal
from moonwrit.building import assembled, content_of, held
from moonwrit.cli import main
from moonwrit.content.models import Text
from moonwrit.errors import ContentError, MoonwritError
from moonwrit.publish.edition import Edition
from moonwrit.publish.icalendar import observances_feed
from moonwrit.publish.jscalendar import calendar_feed
from moonwrit.publish.language import Language
from moonwrit.publish.notices import atom_feed, json_feed
from moonwrit.publish.pieces import Parts

ROOT = Path(__file__).resolve().parent.parent
TEXT: TypeAdapter[str] = TypeAdapter(Text)

# Markup, script, template and format syntax, ends of comments and sections, lines of a feed, paths, formulas.
HARM = (
    "</script></title></style><script>alert(1)</script>\"'><img src=x onerror=alert(1)><!-- ]]> --> &lt;b&gt; "
    "{{ 7*191 }} {% include '/etc/passwd' %} {# #} ${7*191} %(reason)s %s %n {0} `id` $(id) =cmd|' /C calc'!A0 "
    "../../../../etc/passwd C:\\n\\N\\ \\, \\; javascript:alert(1)\n"
    "END:VEVENT\nBEGIN:VEVENT\nSUMMARY;X=\"y\":injected\n\n</entry><entry>\n\",\"injected\":[{\"a\":1}]//*/"
)
TAME = "Text of one line,\nof another,\nof a third,\nof a fourth\n\nand after a gap of a sixth\nand last"

# Where people write text of their own; whoever is asked to send a report or a list of places can write here.
FIELDS: list[tuple[str, tuple[str | int, ...]]] = [
    ("site.yaml", ("community",)),
    ("site.yaml", ("authority",)),
    ("site.yaml", ("calendars", "main", "name")),
    ("places.yaml", ("wattle-harbour", "name")),
    ("places.yaml", ("lantern-harbour", "name")),
    ("regions.yaml", ("three-harbours", "name")),
    ("policies.yaml", ("harbour-sighting", "name")),
    ("policies.yaml", ("harbour-sighting", "summary")),
    ("policies.yaml", ("harbour-sighting", "source")),
    ("policies.yaml", ("tabular", "name")),
    ("observances.yaml", ("eid-al-fitr", "name")),
    ("observances.yaml", ("eid-al-fitr", "about")),
    ("observances.yaml", ("white-days", "name")),
    ("record/reports.yaml", (1, "note")),
    ("record/reports.yaml", (1, "names")),
    ("record/decisions.yaml", (4, "by")),
    ("record/decisions.yaml", (4, "text")),
    ("record/amendments.yaml", (0, "by")),
    ("record/amendments.yaml", (0, "reason")),
    ("look.yaml", ("footer",)),
    ("look.yaml", ("logo", "alt")),
]


def mark(number: int) -> str:
    return f"field{number}:"


def with_text(content: Path, text: str) -> Path:
    """The demonstration with ``text`` in each of the fields, behind a mark of its own, and languages besides."""
    shutil.copytree(ROOT / "content", content)
    one_language(content)
    (content / "record/journal.jsonl").unlink()
    (content / "record/amendments.yaml").write_text("- {at: '2026-11-20T00:00:00Z', since: 1450-01}\n")
    documents = {
        file: yaml.safe_load((content / file).read_text(encoding="utf-8")) for file in sorted({f for f, _ in FIELDS})
    }
    documents["policies.yaml"]["tabular"]["arithmetic"]["pattern"] = "16"
    documents["site.yaml"]["languages"] = ["ar"]
    documents["record/reports.yaml"][1]["names_public"] = True
    for number, (file, path) in enumerate(FIELDS):
        value = documents[file]
        for part in path[:-1]:
            value = value[part]
        said = mark(number) + text
        value[path[-1]] = [said] if path[-1] == "names" else said
    for file, document in documents.items():
        dumped = yaml.safe_dump(document, allow_unicode=True, sort_keys=False, default_style='"')
        dumped = re.sub(r"!!(int|float|bool|null|timestamp) \"(.*)\"", r"\2", dumped)
        (content / file).write_text(dumped, encoding="utf-8")
    # What the placeholders of texts of one's own become.
    page = "# {community}\n\n{authority}: {date eid-al-fitr 1448}\n"
    (content / "pages/harm.md").write_text(page, encoding="utf-8")
    (content / "notices/2026-11-30-harm.md").write_text(page, encoding="utf-8")
    return content


@pytest.fixture(scope="module")
def sites(tmp_path_factory: pytest.TempPathFactory) -> dict[str, dict[str, bytes]]:
    """The site with plain texts, and the same one with texts that mean harm."""
    built = {}
    for name, text in (("tame", TAME), ("harm", HARM)):
        folder = tmp_path_factory.mktemp(name)
        output = folder / "all" / "site"
        content = with_text(folder / "content", text)
        words = ["publish", "--as-of", "2026-12-01", "--content", str(content), "--output", str(output)]
        done = CliRunner().invoke(main, words)
        assert done.exit_code == 0, done.output
        assert [entry.name for entry in output.parent.iterdir()] == ["site"]
        built[name] = {p.relative_to(output).as_posix(): p.read_bytes() for p in output.rglob("*") if p.is_file()}
    return built


def pairs(sites: dict[str, dict[str, bytes]], ending: str) -> Iterator[tuple[str, str, str]]:
    found = [path for path in sites["tame"] if path.endswith(ending)]
    assert found
    for path in found:
        yield path, sites["tame"][path].decode(), sites["harm"][path].decode()


def test_no_other_file_is_written(sites: dict[str, dict[str, bytes]]) -> None:
    """Expected: texts name no file; the paths are those of the plain site."""
    assert sites["tame"].keys() == sites["harm"].keys()


class Skeleton(HTMLParser):
    """Tags with their attributes' names, the values of those that lead somewhere or do something, and all text."""

    def __init__(self, page: str) -> None:
        super().__init__(convert_charrefs=True)
        self.tags: list[tuple[str, list[tuple[str, str | None]]]] = []
        self.texts: list[str] = []
        self.feed(page)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        telling = ("href", "src", "action", "style", "id", "class", "rel", "type", "property", "itemprop")
        self.tags.append((tag, [(name, value if name in telling else "") for name, value in attrs]))
        self.texts += [value or "" for _, value in attrs]

    def handle_endtag(self, tag: str) -> None:
        self.tags.append(("/" + tag, []))

    def handle_data(self, data: str) -> None:
        self.texts.append(data)

    def handle_comment(self, data: str) -> None:
        self.tags.append(("<!--", []))


def test_pages_and_pictures_have_no_other_tag(sites: dict[str, dict[str, bytes]]) -> None:
    """Expected: the same tags, attributes, links and styles, and in the texts exactly what was written."""
    shown: set[int] = set()
    for path, tame, harm in pairs(sites, ".html"):
        one, other = Skeleton(tame), Skeleton(harm)
        assert one.tags == other.tags, path
        for number in range(len(FIELDS)):
            whole = [text for text in other.texts if mark(number) + HARM[:40] in text]
            for text in whole:
                assert mark(number) + HARM in text.replace("\r\n", "\n"), path
            if whole:
                shown.add(number)
    assert len(shown) >= 15, [FIELDS[number] for number in set(range(len(FIELDS))) - shown]


def properties(feed: str) -> list[str]:
    """The name of each line of an iCalendar file, unfolded (RFC 5545, 3.1)."""
    assert feed.replace("\r\n", "").count("\n") == feed.replace("\r\n", "").count("\r") == 0
    return [re.split("[:;]", line, maxsplit=1)[0] for line in feed.replace("\r\n ", "").split("\r\n")]


def test_no_line_is_added_to_a_calendar_feed(sites: dict[str, dict[str, bytes]]) -> None:
    """Expected: the same properties in the same order, and titles and places that read back as written."""
    for path, tame, harm in pairs(sites, ".ics"):
        assert properties(tame) == properties(harm), path
    eid, place = FIELDS.index(("observances.yaml", ("eid-al-fitr", "name"))), FIELDS.index(
        ("places.yaml", ("wattle-harbour", "name")))

    def values(path: str, name: str) -> list[str]:
        calendar: Any = icalendar.Calendar.from_ical(sites["harm"][path])
        return [str(event[name]) for event in calendar.walk("VEVENT")]

    titles = [title for title in values("feeds/observances.ics", "summary") if mark(eid) in title]
    assert titles
    assert all(title.startswith(mark(eid) + HARM) for title in titles)
    assert mark(place) + HARM in values("feeds/evenings.ics", "location")


def test_json_and_atom_keep_their_structure(sites: dict[str, dict[str, bytes]]) -> None:
    """Expected: the same keys, numbers and elements; texts alone differ."""
    for path, tame, harm in pairs(sites, ".json"):
        assert shape(json.loads(tame)) == shape(json.loads(harm)), path
    for path, tame, harm in pairs(sites, ".atom"):
        one, other = ([(e.tag, sorted(e.attrib)) for e in ET.fromstring(text).iter()] for text in (tame, harm))
        assert one == other, path
    written = FIELDS.index(("record/decisions.yaml", (4, "text")))
    feed = ET.fromstring(sites["harm"]["feeds/notices.atom"])
    assert any(mark(written) + HARM in (element.text or "") for element in feed.iter())


def test_the_script_for_other_sites_differs_in_its_data_alone(sites: dict[str, dict[str, bytes]]) -> None:
    """Expected: one line of JSON between the same lines of program."""
    for path, tame, harm in pairs(sites, ".js"):
        (one, data), (other, harmful) = (re.subn(r"const data = (.*);", "", text) for text in (tame, harm))
        assert (one, data, harmful) == (other, 1, 1), path
        found = re.search(r"const data = (.*);\n", harm)
        assert found is not None
        assert any(HARM in row[2] for row in json.loads(found[1])["dates"]), path


# --- any text at all ------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def saying(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str, str], Edition]:
    """A year with one observance, of a given name and text about it, by a community and an authority called so."""
    content = tmp_path_factory.mktemp("small") / "content"
    shutil.copytree(ROOT / "content", content)
    one_language(content)
    site = (content / "site.yaml").read_text(encoding="utf-8")
    (content / "site.yaml").write_text(site.replace("from: 1447, to: 1449", "from: 1448, to: 1448"), encoding="utf-8")
    shutil.rmtree(content / "pages", ignore_errors=True)
    (content / "record/journal.jsonl").unlink()
    (content / "observances.yaml").write_text("eid: {name: Eid, when: {month: 10, day: 1}, tags: [main]}\n")
    read, today = content_of(content), date(2026, 12, 1)
    almanacs = assembled(read, today)
    (almanac,), ledger = almanacs, held(read, content, almanacs, today)

    def said(name: str, about: str) -> Edition:
        eid = almanac.observances["eid"].model_copy(update={"name": {"": name}, "about": {"": about}})
        site = almanac.site.model_copy(update={"community": {"": name}, "authority": {"": about}})
        changed = replace(almanac, observances={"eid": eid}, site=site)
        return Edition(changed, ledger, Language("en", {}))

    return said


def whole(parts: Parts) -> bytes:
    return b"".join(piece.make() for piece in parts)


def taken(text: str) -> str | None:
    """The text as the content takes it; None where it is refused."""
    try:
        return TEXT.validate_python(text)
    except ValidationError:
        return None


anything = st.text(st.characters(exclude_categories=["Cs"]) | st.sampled_from(
    "\r\n\0\t\x0b\x0c\x1b\x85\u2028\u2029\u202e\u2066\ufeff\ufffe\\;:,\"'<>&]{}%="), max_size=120)


@settings(deadline=None, max_examples=60)
@given(name=anything, about=anything)
@example("\\N\\n\\\\n", "a\n\n b\n\tc")
@example("x" * 74 + "é" * 40, "\ud7ff\ue000\U0010ffff")
@example("a\u2028b", "c\rd")
def test_any_text_that_is_taken_reads_back_from_every_feed(
    saying: Callable[[str, str], Edition], name: str, about: str
) -> None:
    """Expected: refused, or in iCalendar, JSCalendar, Atom, JSON Feed and JSON equal to what was written, and no more
    events than before."""
    said, told = taken(name), taken(about)
    if said is None or told is None:
        return
    edition = saying(said, told)
    calendar: Any = icalendar.Calendar.from_ical(whole(observances_feed(edition)))
    (event,) = calendar.walk("VEVENT")
    assert str(event["summary"]) == f"{said} (expected)"
    assert str(event["description"]).startswith(told + "\n\n")
    (entry,) = (one for one in json.loads(whole(calendar_feed(edition)))["entries"] if one["uid"].startswith("eid"))
    assert entry["title"] == f"{said} (expected)"
    author = ET.fromstring(whole(atom_feed(edition))).findtext("{*}author/{*}name")
    assert author == said
    assert json.loads(whole(json_feed(edition)))["authors"] == [{"name": said}]


@pytest.fixture(scope="module")
def desk(tmp_path_factory: pytest.TempPathFactory) -> Path:
    content = tmp_path_factory.mktemp("desk") / "content"
    shutil.copytree(ROOT / "content", content)
    one_language(content)
    return content


@settings(deadline=None, max_examples=40)
@given(note=anything, observer=anything)
@example("- outcome: seen\n  names_public: true", "*a &b !!c")
@example("yes", "18:30")
@example("\ud800", "x")
def test_a_report_is_recorded_as_written_or_refused(desk: Path, note: str, observer: str) -> None:
    """Expected: exit 0 and one more report with exactly this text, or exit 1, one message, and the file as it was."""
    file = desk / "record/reports.yaml"
    before = file.read_bytes()
    known = content_of(desk).reports
    try:
        done = CliRunner(env={"SOURCE_DATE_EPOCH": "1796810400"}).invoke(main, [
            "record", "report", "--content", str(desk), "--evening", "2026-12-09", "--place", "wattle-harbour",
            "--outcome", "not-seen", f"--note={note}", f"--name={observer}",
        ], catch_exceptions=False)
        if done.exit_code:
            assert done.exit_code == 1
            assert done.stderr.count("\n") == 1
            assert "reports.yaml" in done.stderr
            assert file.read_bytes() == before
        else:
            *earlier, made = content_of(desk).reports
            assert tuple(earlier) == known
            assert (made.note, made.names) == (taken(note), (taken(observer),))
    finally:
        file.write_bytes(before)


@settings(deadline=None, max_examples=60)
@given(st.dictionaries(
    st.sampled_from(["calendar", "key", "starts", "ends", "standing", "seq", "at", "was", "because"]),
    st.none() | st.booleans() | st.integers() | st.floats() | anything | st.lists(st.integers(), max_size=2)
    | st.sampled_from(["2026-01-01", "9999-12-31", "2026-01-01T00:00:00", "0001-01-01T00:00:00+14:00"]),
))
@example({"at": "2026-01-01T00:00:00"})
@example({"seq": float("inf")})
@example({"key": "month-1448-01\r\nX-INJECTED:1"})
@example({"ends": "9999-12-31"})
def test_a_journal_line_is_an_entry_or_one_message(
    tmp_path_factory: pytest.TempPathFactory, changes: dict[str, Any]
) -> None:
    """Expected: an entry whose names are names and whose moment has a zone, or a message with the line's number."""
    whole = {"calendar": "main", "key": "month-1448-01", "starts": "2026-06-17", "ends": "2026-07-15",
             "standing": "settled", "seq": 1, "at": "2026-06-16T11:05:00Z"}
    folder = tmp_path_factory.mktemp("journal")
    (folder / "record").mkdir()
    lines = [json.dumps(whole | changes), json.dumps(whole | {"key": "month-1448-02"}), ""]
    (folder / journal.FILE).write_text("\n".join(lines), encoding="utf-8")
    said = ""
    try:
        first, _ = journal.read(folder)
    except ContentError as fault:
        said = str(fault)
    if said:
        assert said.startswith(f"{folder / journal.FILE}:1: ")
        return
    assert re.fullmatch(r"[a-z0-9-]+/[a-z0-9-]+", f"{first.calendar}/{first.key}")
    assert first.at.astimezone(UTC) < datetime.max.replace(tzinfo=UTC)
    assert first.ends.toordinal() + 1 < date.max.toordinal()
    assert first.because is None or taken(first.because) == first.because


# --- what cannot be taken -------------------------------------------------------------------------------

Write = Callable[[Path], int | None]
"""Spoils a content folder, and says on which line."""


def put(file: str, data: bytes | str) -> Write:
    def write(content: Path) -> None:
        (content / file).write_bytes(data if isinstance(data, bytes) else data.encode())
    return write


def change(file: str, old: str, new: str) -> Write:
    def edit(content: Path) -> int:
        before, found, after = (content / file).read_text(encoding="utf-8").partition(old)
        assert found, f"{file} no longer holds {old!r}"
        (content / file).write_text(before + new + after, encoding="utf-8")
        return before.count("\n") + 1
    return edit


def encoded(file: str, encoding: str) -> Write:
    def write(content: Path) -> None:
        (content / file).write_bytes((content / file).read_text(encoding="utf-8").encode(encoding))
    return write


def outline(text: str | bytes) -> Write:
    def edit(content: Path) -> None:
        change("regions.yaml", "  places:", "  outline: it.geojson\n  places:")(content)
        (content / "it.geojson").write_bytes(text if isinstance(text, bytes) else text.encode())
    return edit


def table(text: str | bytes) -> Write:
    def edit(content: Path) -> None:
        (content / "policies.yaml").write_bytes((content / "policies.yaml").read_bytes() + (
            b"\ntheirs:\n  name: Theirs\n  decided_by: calculation\n  table: it.csv\n"))
        (content / "it.csv").write_bytes(text if isinstance(text, bytes) else text.encode())
    return edit


def own(file: str, data: bytes | str) -> Write:
    def write(content: Path) -> None:
        (content / file).parent.mkdir(parents=True, exist_ok=True)
        put(file, data)(content)
    return write


def written(data: bytes | str) -> Write:
    return own("pages/x.md", data)


def part(data: bytes | str) -> Write:
    return own("theme/parts/x.html", data)


def logo(data: bytes | str, name: str = "logo.svg") -> Write:
    def write(content: Path) -> None:
        (content / "look.yaml").write_text(f"logo: {{file: {name}, alt: x}}\n")
        put(name, data)(content)
    return write


def drawn(shapes: str, box: str = "0 0 120 40") -> Write:
    return logo(f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="{box}">\n{shapes}</svg>')


def linked(name: str, to: str) -> Write:
    """A link in the place of a file or folder, to what is there."""
    def write(content: Path) -> None:
        there = content / name
        if there.is_dir():
            shutil.rmtree(there)
        there.parent.mkdir(parents=True, exist_ok=True)
        there.unlink(missing_ok=True)
        there.symlink_to(to)
    return write


BOMB = "a: &a [x, x, x, x, x, x, x, x, x]\n" + "".join(
    f"{b}: &{b} [*{a}, *{a}, *{a}, *{a}, *{a}, *{a}, *{a}, *{a}, *{a}]\n" for a, b in zip("abcdefgh", "bcdefghi",
                                                                                      strict=True))
LONG = 50 * 1024 * 1024
NAME = ("places.yaml", "name: Wattle Harbour", "name: ")
LATITUDE = ("places.yaml", "latitude: -38.10", "latitude: ")
STARTS = ("record/decisions.yaml", "starts: '2025-06-28'", "starts: ")
ADDRESS = ("site.yaml", "https://calendar.three-harbours.example/")
SQUARE = "[[0,0],[1,0],[1,1],[0,0]]"
HEAD = "year,month,starts\n"

REFUSED: dict[str, tuple[Write, str]] = {
    "alias bomb": (put("observances.yaml", BOMB), "observances.yaml:1: the anchor &a"),
    "python object": (change(*NAME[:2], 'name: !!python/object/apply:os.system ["id"]'), "places.yaml:{line}: the tag"),
    "merge key": (change(*NAME[:2], "<<: {name: x}"), 'places.yaml:'),
    "deep nesting": (change(*NAME[:2], "name: " + "[" * 5000), "places.yaml:{line}: values are nested deeper"),
    "deep blocks": (put("places.yaml", "".join(f"{' ' * i}a:\n" for i in range(200))), "places.yaml:41: values are"),
    "50 MB of YAML": (put("record/reports.yaml", b"#" * LONG), "record/reports.yaml: the file is larger than 2 MB"),
    "too many values": (put("record/reports.yaml", "[" + "[],\n" * 200_000 + "]"), "record/reports.yaml:150000: there"),
    "UTF-16": (encoded("places.yaml", "utf-16"), "places.yaml:1: a character is not UTF-8"),
    "UTF-16 without a mark": (encoded("site.yaml", "utf-16-le"), "site.yaml:1: "),
    "Latin-1": (put("places.yaml", "a: 1\nb: é\n".encode("latin-1")), "places.yaml:2: a character is not UTF-8"),
    "binary": (put("policies.yaml", bytes(range(256))), "policies.yaml:2: "),
    "NUL": (change(*NAME[:2], "name: a\0b"), "places.yaml:{line}: the control character U+0000"),
    "escaped NUL": (change(*NAME[:2], r'name: "a\0b"'), "places.yaml:{line}: name: text holds a control character"),
    "escaped CR": (change(*NAME[:2], r'name: "a\r\nX:b"'), "places.yaml:{line}: name: text holds a control character"),
    "line separator": (change(*NAME[:2], r'name: "a\Lb"'), "places.yaml:{line}: name: text holds a control character"),
    "next line": (change(*NAME[:2], r'name: "a\Nb"'), "places.yaml:{line}: name: text holds a control character"),
    "C1": (change(*NAME[:2], r'name: "a\x9bb"'), "places.yaml:{line}: name: text holds a control character"),
    "not a character": (change(*NAME[:2], r'name: "a\uFFFEb"'), "places.yaml:{line}: name: text holds a contr"),
    "override": (change(*NAME[:2], "name: a\u202eb"), "places.yaml:{line}: name: text holds U+202E, which turns"),
    "isolate": (change(*NAME[:2], "name: a\u2067b"), "places.yaml:{line}: name: text holds U+2067, which turns"),
    "1e308": (change(*LATITUDE[:2], "latitude: 1.0e308"), 'places.yaml:{line}: latitude is "1.0e308", which is not'),
    "1e99": (change(*LATITUDE[:2], "latitude: 1.0e99"), "places.yaml:{line}: latitude is 1e+99, which is above 90"),
    "not a number": (change(*LATITUDE[:2], "latitude: .nan"), 'places.yaml:{line}: latitude is ".nan", which is not'),
    "10^30 years": (change("site.yaml", "to: 1449", f"to: {10**30}"), "site.yaml:{line}: to is "),
    "10^17 years": (change("site.yaml", "to: 1449", f"to: {10**17}"), "site.yaml:{line}: "),
    "year 9999": (change(*STARTS[:2], "starts: '9999-12-31'"), "cannot begin on 9999-12-31; it begins about 2025-06-2"),
    "year 0": (change(*STARTS[:2], "starts: '0000-01-01'"), 'decisions.yaml:{line}: starts: "0000-01-01" is not'),
    "year 10000": (change(*STARTS[:2], "starts: '10000-01-01'"), "record/decisions.yaml:{line}: starts: "),
    "path in a name": (change("places.yaml", "wattle-harbour:", "../../etc:"), 'yaml:{line}: "../../etc" cannot be'),
    "path in a tag": (change("observances.yaml", "tags: [main]", "tags: [../../x]"), "observances.yaml:{line}: "),
    "path in a language": (change("site.yaml", "language: en", "language: ../x"), "site.yaml:{line}: "),
    "path in a zone": (
        change("places.yaml", "timezone: Australia/Melbourne\n", "timezone: ../../etc/passwd\n"), "places.yaml:{line}: "
    ),
    "a long name": (change("observances.yaml", "ashura:", "a" * 300 + ":"), 'observances.yaml:{line}: "aaaaaaaaaaaa'),
    "outline elsewhere": (change("regions.yaml", "  places:", "  outline: ../../etc/passwd\n  places:"),
                          'regions.yaml:{line}: the outline "../../etc/passwd" lies outside'),
    "outline of a folder": (change("regions.yaml", "  places:", "  outline: ..\n  places:"), "cannot be read"),
    "address of script": (change(*ADDRESS, "javascript:alert(1)//x"), "site.yaml:{line}: "),
    "address that closes": (change(*ADDRESS, 'https://a.example/"><script>'), "site.yaml:{line}: "),
    "address with a line": (change(*ADDRESS, r'"https://a.example/\r\nX:1"'), "site.yaml:{line}: "),
    "address with control": (change(*ADDRESS, r'"https://a.example/\x01"'), "site.yaml:{line}: "),
    "address of brackets": (change(*ADDRESS, "https://[/"), "site.yaml:{line}: "),
    "address that folds": (change(*ADDRESS, "https://a\u2100b/"), "site.yaml:{line}: "),
    "GeoJSON of 50 MB": (outline(b" " * LONG), "it.geojson: the outline is larger than 8 MB"),
    "GeoJSON, deep": (outline("[" * 100_000), "it.geojson: this is not GeoJSON"),
    "GeoJSON, deep features": (outline('{"type":"Feature","geometry":' * 900 + "1" + "}" * 900), "it.geojson: "),
    "GeoJSON, UTF-16": (outline(SQUARE.encode("utf-16")), "it.geojson: this is not GeoJSON"),
    "GeoJSON, huge": (outline('{"type":"Polygon","coordinates":[[[1e308,0],[1e400,0],[0,0]]]}'), "not on the Earth"),
    "GeoJSON, huge whole": (outline(f'{{"type":"Polygon","coordinates":[[[{"9" * 5000},0]]]}}'), "not GeoJSON"),
    "GeoJSON, NaN": (outline('{"type":"Polygon","coordinates":[[[NaN,0],[1,1],[0,1],[NaN,0]]]}'), "not on the Earth"),
    "GeoJSON, type": (outline('{"type":{"a":[1]}}'), "it.geojson: "),
    "CSV of 50 MB": (table(b"1,1,x\n" * (LONG // 6)), "it.csv: the table is larger than 2 MB"),
    "CSV, one field": (table(HEAD + "1," + "1" * 200_000), "it.csv"),
    "CSV, huge years": (table(HEAD + f"{10**30},1,2026-01-01\n{10**30},2,2026-01-31\n"), "it.csv:2: this is not"),
    "CSV, 5000 figures": (table(HEAD + "9" * 5000 + ",1,2026-01-01\n"), "it.csv:2: this is not a month"),
    "CSV, formula": (table(HEAD + "=cmd|'/C calc'!A0,1,2026-01-01\n"), "it.csv:2: this is not a month"),
    "CSV, NUL": (table(HEAD + "1447\0,1,2026-01-01\n"), "it.csv"),
    "CSV, UTF-16": (table(HEAD.encode("utf-16")), "it.csv: this is not a table"),
    "journal, deep": (put("record/journal.jsonl", "[" * 100_000 + "\n{}\n"), "record/journal.jsonl:1: this line is no"),
    "journal, 50 MB": (put("record/journal.jsonl", b" " * LONG + b"\n"), "record/journal.jsonl: the journal is larger"),
    "page of 50 MB": (written(b"# T\n" + b"x" * LONG), "pages/x.md: the text is larger than 256 kB"),
    "page, UTF-16": (written("# T\nx".encode("utf-16")), "pages/x.md:1: a character is not UTF-8"),
    "page, Latin-1": (written("# T\n\né".encode("latin-1")), "pages/x.md:3: a character is not UTF-8"),
    "page, NUL": (written("# T\n\nx\0"), "pages/x.md:3: the character U+0000 is written here; remove it"),
    "page, CR": (written("# T\rEND:VEVENT\n\nx"), "pages/x.md:1: the character U+000D"),
    "page, override": (written("# T\nx\u202ey"), "pages/x.md:2: the character U+202E"),
    "page, script": (written("# T\n\n[x](java&#115;cript:alert(1))"), 'pages/x.md:3: the link "javascript:ale'),
    "page, data": (written("# T\n\n[x][y]\n\n[y]: DATA:text/html,x"), 'pages/x.md:5: the link "DATA:text/html'),
    "page, picture": (written("# T\n\n![x](//a.example/x.png)"), "pages/x.md:3: a picture is put in here"),
    "page, template words": (written("# T\n{{ ''.__class__ }}"), "pages/x.md:2: "),
    "page, template block": (written("# T\n{% include '../site.yaml' %}"), "yaml' %}\" is no placeholder; "),
    "page, huge year": (written(f"# T\n{{date eid-al-fitr {'9' * 9999}}}"), "pages/x.md:2: "),
    "page, quoted deep": (written("# T\n" + "> " * 9000), "x.md:1: lists or quotations are nested too deeply"),
    "page, listed deep": (written("# T\n" + "1. " * 9000), "x.md:1: lists or quotations are nested too deeply"),
    "page, brackets": (written("# T\n\n" + "[" * 9000), "pages/x.md:3: the paragraphs up to this one are too"),
    "page linked": (linked("pages/x.md", "/etc/passwd"), "pages/x.md: this is not a Markdown file"),
    "pages linked": (linked("pages", "record"), "content/pages: this is a link to somewhere else"),
    "page of a strange name": (own("pages/a\nb\x1b[2J\u202e.md", "# T\nx"), "/a\ufffdb\ufffd[2J\ufffd.md: "),
    "notice of year 1": (own("notices/0001-01-01-x.md", "# T\nx"), "notices/0001-01-01-x.md: the name does not"),
    "notice of 9999": (own("notices/9999-12-31-x.md", "# T\nx"), "notices/9999-12-31-x.md: the name does not"),
    "look, alias bomb": (put("look.yaml", BOMB), "look.yaml:1: the anchor &a"),
    "look, deep": (put("look.yaml", "colours:\n  " + "{a: " * 5000), "look.yaml:2: values are nested deeper"),
    "look of 50 MB": (put("look.yaml", b"#" * LONG), "look.yaml: the file is larger than 2 MB"),
    "look, UTF-16": (encoded("look.yaml", "utf-16"), "look.yaml:1: a character is not UTF-8"),
    "look, rules": (put("look.yaml", "colours:\n  ink: '#000;}*{background:url(//a.example)'\n"), "look.yaml:2: ink "),
    "look, a line": (put("look.yaml", 'colours:\n  ink: "#000000\\n"\n'), "look.yaml:2: ink is "),
    "look, a number": (put("look.yaml", f"colours:\n  ink: {10**17}\n"), "look.yaml:2: ink is "),
    "look, footer": (put("look.yaml", 'footer: "a\\x1bb"\n'), "look.yaml:1: footer: text holds a control character"),
    "logo above": (put("look.yaml", "logo:\n  alt: x\n  file: ../logo.svg\n"), "look.yaml:3: file is "),
    "logo elsewhere": (put("look.yaml", "logo:\n  alt: x\n  file: /etc/logo.svg\n"), "look.yaml:3: file is "),
    "logo linked": (linked("logo.svg", "/etc/passwd"), "logo.svg: the logo is a link to another file"),
    "logo of 50 MB": (logo(b" " * LONG), "logo.svg: the logo is larger than 256 kB"),
    "logo, script": (drawn("<script>alert(1)</script>"), "logo.svg:2: the logo holds <script>, which is no shape"),
    "logo, handler": (drawn('<rect onload="alert(1)"/>'), "logo.svg:2: the logo has the attribute onload"),
    "logo, HTML": (drawn("<foreignObject/>"), "logo.svg:2: the logo holds <foreignObject>, which is no shape"),
    "logo, link": (drawn('<use href="//a.example/x.svg#a"/>'), "logo.svg:2: href leads out of the logo"),
    "logo, style": (drawn('<g style="fill:url(//a.example)"/>'), "logo.svg:2: style leads out of the logo"),
    "logo, sheet": (logo('<?xml-stylesheet href="//a"?><svg/>'), "logo.svg:1: the logo has a processing instruction"),
    "logo, entities": (logo('<!DOCTYPE x [<!ENTITY a "b">]>\n<svg/>'), "logo.svg:1: the logo has a DOCTYPE"),
    "logo, unfolding": (drawn("".join(f'<g id="a{i}">{f"""<use href="#a{i + 1}"/>""" * 9}</g>' for i in range(7))),
                        "logo.svg:2: the logo has more than 50000 elements"),
    "logo, a circle": (drawn('<g id="a"><use href="#a"/></g>\n'), "logo.svg:3: parts of the logo refer to one another"),
    "logo, endless": (drawn("", f"0 0 {'9' * 400} 1"), "logo.svg:1: the logo does not say its size"),
    "logo, thin": (drawn("", f"0 0 1 0.{'0' * 300}1"), "logo.svg:1: the logo does not say its size"),
    "logo, not SVG": (logo("GIF89a"), "logo.svg:1: this is not SVG"),
    "logo, not PNG": (logo("<svg/>", "logo.png"), "logo.png: this is not a PNG picture"),
    "logo, huge PNG": (logo(b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR" + b"\x7f" * 17, "logo.png"), "logo.png: the logo has 213"),
    "logo, UTF-16": (logo("<svg/>".encode("utf-16")), "logo.svg: the logo is not UTF-8"),
    "template linked": (linked("theme/parts/x.html", "/etc/passwd"), "theme/parts/x.html: this is a link to somewhere"),
    "template of 50 MB": (part(b"x" * LONG), "theme/parts/x.html: the text is larger than 256 kB"),
    "template, UTF-16": (part("x".encode("utf-16")), "theme/parts/x.html:1: a character is not UT"),
    "template of no name": (own("theme/robots.txt", "x"), "theme/robots.txt: the theme has no template of this name"),
    "catalogue as template": (own("theme/locale/fr.po", "x"), "theme/locale/fr.po: the theme has no template of this"),
    "theme linked": (linked("theme", "record"), "content/theme: this is a link to somewhere else"),
    "template that runs": (own("theme/pages/home.html", "\n{{ cycler.__init__.__globals__.os.popen('id').read() }}"),
                           "theme/pages/home.html:2: the template fails (access to attribute '__init__'"),
    "journal, UTF-16": (put("record/journal.jsonl", "{}\n".encode("utf-16")), "record/journal.jsonl: "),
}


@pytest.mark.parametrize("case", REFUSED)
def test_what_cannot_be_taken_is_one_message(case: str, tmp_path: Path) -> None:
    """Expected: exit 1, one short line that begins with the place, nothing written, and within seconds."""
    write, said = REFUSED[case]
    content = tmp_path / "content"
    shutil.copytree(ROOT / "content", content)
    one_language(content)
    line = write(content)
    before = sorted(tmp_path.rglob("*"))
    done = CliRunner().invoke(
        main, ["publish", "--content", str(content), "--output", str(tmp_path / "site")], catch_exceptions=False)
    message = done.stderr.removeprefix("moonwrit: ").removesuffix("\n")
    assert done.exit_code == 1, done.output
    assert "\n" not in message
    assert message.startswith(f"{content}/")
    assert said.replace("{line}", str(line)) in message
    assert len(message) - len(str(content)) < 700
    assert not re.search(r"[\x00-\x1f\x7f-\x9f\u2028\u2029\u202a-\u202e\u2066-\u2069]", message)
    assert sorted(tmp_path.rglob("*")) == before


# The files that cost most for their size, each as large as it may be; loaded in a process of its own.
COSTLY: dict[str, Write] = {
    "brackets": put("record/reports.yaml", "[" + ("[" * 38 + "]" * 38 + ",") * 26_000 + "]"),
    "lists": put("record/reports.yaml", "- 1\n" * 520_000),
    "keys": put("places.yaml", "".join(f"k{i}: 1\n" for i in range(140_000))),
    "one text": put("record/reports.yaml", '"' + "\\u0061" * 340_000 + '"'),
    "unclosed": put("record/reports.yaml", "{a: " * 39 + "'" + "x\n" * 1_000_000),
    "comments": put("record/reports.yaml", "#\n" * 1_000_000),
    "to and fro": outline(json.dumps({"type": "Polygon", "coordinates": [[
        *([30.0 * (-1) ** i, i / 200] for i in range(15_000)), [40, 80], [40, -1], [30, 0]]]})),
    "many rings": outline(json.dumps({"type": "MultiPolygon", "coordinates": [json.loads(f"[{SQUARE}]")] * 150_000})),
    "rows": table(HEAD + "1447,1,2026-01-01\n" * 110_000),
    "paragraphs": written("# T\n\n" + "a\n\n" * 80_000),
    "open links": written("# T\n\n" + "[" * 3_100),
    "quotations": written("# T\n\n" + ("> " * 18 + "a\n\n") * 6_000),
    "shapes": drawn("".join(f'<g id="a{i}"><use href="#a{i + 1}"/></g>' for i in range(7)) + "<g/>" * 60_000),
}
TAKEN = ("comments", "open links", "quotations")
LOADING = r"""
import re, resource, sys
from pathlib import Path
from moonwrit.building import content_of
from moonwrit.errors import ContentError
try:
    content_of(Path(sys.argv[1]))
    print("taken")
except ContentError as fault:
    print(str(fault)[:300])
used = resource.getrusage(resource.RUSAGE_SELF)
# Not ru_maxrss, which begins with what the process that started this one had.
peak = int(re.search(r"VmHWM:\s*(\d+)", Path("/proc/self/status").read_text())[1]) // 1024
print(used.ru_utime + used.ru_stime, peak)
"""
SECONDS, MEGABYTES = 25, 600


@pytest.mark.parametrize("case", COSTLY)
def test_loading_stays_within_bounds(case: str, tmp_path: Path) -> None:
    """Expected: taken, or refused with a message, within 25 s of computing and 600 MB."""
    content = tmp_path / "content"
    shutil.copytree(ROOT / "content", content)
    one_language(content)
    COSTLY[case](content)
    done = subprocess.run(
        [sys.executable, "-c", LOADING, str(content)], capture_output=True, encoding="utf-8", check=True,
        preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_CPU, (4 * SECONDS, 4 * SECONDS)),
    )
    message, used = done.stdout.splitlines()
    seconds, megabytes = map(float, used.split())
    assert message == "taken" if case in TAKEN else str(content) in message
    assert seconds < SECONDS
    assert megabytes < MEGABYTES


def test_a_byte_order_mark_is_no_fault(tmp_path: Path) -> None:
    """Expected: editors of one system put it before UTF-8; the content reads as without it."""
    shutil.copytree(ROOT / "content", tmp_path / "content")
    one_language(tmp_path / "content")
    plain = content_of(ROOT / "content")
    for file in (tmp_path / "content").glob("*.yaml"):
        file.write_bytes(b"\xef\xbb\xbf" + file.read_bytes().replace(b"\n", b"\r\n"))
    read = content_of(tmp_path / "content")
    assert (read.places, read.policies, read.observances) == (plain.places, plain.policies, plain.observances)


@settings(deadline=None, max_examples=60)
@given(st.recursive(
    st.none() | st.booleans() | st.integers(-10**18, 10**18) | st.floats(allow_nan=False, allow_infinity=False)
    | anything | st.sampled_from(["month", "every", "last", "friday", "1448-09", "2026-02-18", "16", "earth"]),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(
        st.sampled_from(["name", "when", "month", "day", "run", "last_nights", "odd", "night", "tags", "places", "test",
                         "where", "all", "any", "criterion", "limit", "quantity", "anywhere", "of", "table"]),
        inner, max_size=4),
    max_leaves=12,
), st.sampled_from(["places.yaml", "regions.yaml", "policies.yaml", "observances.yaml", "record/decisions.yaml"]))
def test_any_structure_is_taken_or_refused_in_words(desk: Path, value: Any, file: str) -> None:
    """Expected: a message that begins with the file's place, or the content; never another exception."""
    path = desk / file
    before = path.read_bytes()
    entry = [value] if file.startswith("record/") else {"it": value}
    path.write_text(json.dumps(entry, ensure_ascii=True), encoding="utf-8")
    said = str(desk)
    try:
        content_of(desk)
    except MoonwritError as fault:
        said = str(fault)
    finally:
        path.write_bytes(before)
    assert said.startswith(str(desk))
    assert "\n" not in said
