"""What is fuzzed: each target takes bytes and raises nothing but what it is meant to refuse with.

``make fuzz`` runs them with atheris, guided by coverage (``guided.py``); what is worth keeping is put into
``corpus/<target>/``, which ``test_corpus.py`` replays.
"""

from __future__ import annotations

import re
import tempfile
from collections import defaultdict
from collections.abc import Callable
from datetime import date
from html.parser import HTMLParser
from pathlib import Path
from xml.etree import ElementTree as ET

import icalendar
from pydantic import TypeAdapter, ValidationError

from moonwrit import journal
from moonwrit.content import own
from moonwrit.content.faults import validated
from moonwrit.content.load import OPTIONAL, RECORD, SHAPES, load
from moonwrit.content.look import read_logo, too_faint
from moonwrit.content.models import Observance, Text
from moonwrit.content.outlines import read_outline
from moonwrit.content.own import Own, Placeholder, dated, read_texts
from moonwrit.content.tables import read_table
from moonwrit.content.yaml import parse
from moonwrit.errors import ContentError
from moonwrit.observances import occurrences
from moonwrit.policy import FIXED, Evidence, Month
from moonwrit.publish import catalogue as catalogues
from moonwrit.publish import sandbox
from moonwrit.publish.icalendar import FeedText
from moonwrit.publish.language import Language
from moonwrit.publish.own import look_sheet
from moonwrit.publish.render import Renderer

HERE = Path(__file__).parent
CORPUS = HERE / "corpus"
FILE = Path("it.yaml")
EXAMPLE = load(HERE.parent.parent / "content")
SHEET = re.compile(r"(@media screen and \(prefers-color-scheme: (light|dark)\) \{\n  :root \{\n"
                   r"(    --[a-z]+: #[0-9A-Fa-f]{3,6};\n)+  \}\n\}\n)*")
# What is fuzzed runs some fifty times slower.
sandbox.MAX_STEPS = 10_000
own.MAX_EFFORT = 40_000_000
_OBSERVANCES: TypeAdapter[dict[str, Observance]] = TypeAdapter(dict[str, Observance])
_TEXT: TypeAdapter[str] = TypeAdapter(Text)


def _whole(fault: ContentError) -> None:
    assert str(fault).strip()
    assert "\n" not in str(fault)


def content(data: bytes) -> None:
    """A content file: by the first byte, which."""
    shapes = {**SHAPES, **RECORD}
    shape = list(shapes.values())[data[0] % len(shapes)] if data else shapes["site.yaml"]
    try:
        validated(parse(data[1:], FILE), shape)
    except ContentError as fault:
        _whole(fault)


def rules(data: bytes) -> None:
    """Observance rules, and the dates they give in a year: each inside its month, but for nights and long runs."""
    try:
        wanted = validated(parse(data, FILE), _OBSERVANCES)
    except ContentError as fault:
        _whole(fault)
        return
    months, starts = [], date(2026, 6, 17)
    for number in range(1, 13):
        length = 29 + number % 2
        evidence = Evidence(starts, True)
        months.append(Month(
            1448, number, starts, length, "calculated", "settled", "", FIXED, evidence))
        starts = date.fromordinal(starts.toordinal() + length)
    found = occurrences(wanted, months)
    assert len({one.key for one in found}) == len(found)
    for one in found:
        month = months[one.month - 1]
        assert 1 <= one.day <= month.length
        assert -1 <= (one.starts - month.starts).days < month.length
        assert 0 <= (one.ends - one.starts).days < 30


def text(data: bytes) -> None:
    """Any text that the content takes reads back from a line of a feed, which stays one line."""
    try:
        said = _TEXT.validate_python(data.decode("utf-8", "ignore"))
    except ValidationError:
        return
    event = icalendar.Event()
    event.add("summary", FeedText(said))
    lines = event.to_ical().decode().replace("\r\n ", "").split("\r\n")
    assert [line.partition(":")[0] for line in lines] == ["BEGIN", "SUMMARY", "END", ""], lines
    assert str(icalendar.Event.from_ical(event.to_ical())["summary"]) == said


def _from_file(data: bytes, read: Callable[[Path], object], name: str) -> None:
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / name
        file.parent.mkdir(parents=True, exist_ok=True)
        file.write_bytes(data)
        try:
            read(file)
        except ContentError as fault:
            _whole(fault)


def lines(data: bytes) -> None:
    """The journal."""
    _from_file(data, lambda file: journal.read(file.parent.parent), journal.FILE)


def outline(data: bytes) -> None:
    """GeoJSON."""
    _from_file(data, read_outline, "it.geojson")


def table(data: bytes) -> None:
    """A table of month starts."""
    _from_file(data, read_table, "it.csv")


class Tame(HTMLParser):
    """HTML that runs nothing: the elements of a text, links to pages, and nothing in what was put in."""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        tags = "a|blockquote|br|code|em|h[2-6]|hr|[ou]l|li|p|pre|strong|table|tbody|td|th|thead|tr"
        assert re.fullmatch(tags, tag), tag
        for name, value in attrs:
            assert (tag, name) in (("a", "href"), ("a", "title"), ("ol", "start")), (tag, name)
            if name == "href":
                bare = re.sub(r"[\x00-\x20]", "", value or "")
                scheme = re.match(r"([A-Za-z][A-Za-z0-9+.-]*):", bare)
                assert scheme is None or scheme[1].lower() in ("http", "https", "mailto", "webcal"), value

    def handle_comment(self, data: str) -> None:
        raise AssertionError(data)

    def handle_decl(self, decl: str) -> None:
        raise AssertionError(decl)

    unknown_decl = handle_pi = handle_comment


def _value(_: Placeholder) -> str:
    return "<script>*_`\"'&[a](javascript:b)\n\n# {community} \\ ]]>-->"


def markdown(data: bytes) -> None:
    """A page or a notice of a community's own, with values put in that mean harm."""
    with tempfile.TemporaryDirectory() as folder:
        (Path(folder) / "2026-11-20-it.md").write_bytes(data)
        faults: list[ContentError] = []
        found = dated(read_texts(Path(folder), EXAMPLE.site, EXAMPLE.observances, faults), Path(folder), faults)
    for fault in faults:
        _whole(fault)
    if faults:
        return
    assert len(found) == 1
    for texts in found.values():
        for text in texts.values():
            for address in ("", "https://calendar.example/notices/it/"):
                page = Tame()
                page.feed(text.html(_value, address))
                page.close()
            assert "\n" not in text.heading(lambda _: "x")
            assert not re.search(r"[\ue000-\uf8ff]", text.text(_value))


def look(data: bytes) -> None:
    """``look.yaml``, and the style sheet made of it."""
    try:
        document = parse(data, FILE)
        wanted = validated(document, OPTIONAL["look.yaml"])
    except ContentError as fault:
        _whole(fault)
        return
    for faint in too_faint(document, wanted.colours):
        _whole(faint)
    assert SHEET.fullmatch((look_sheet(wanted) or b"").decode())
    assert wanted.logo is None or wanted.logo.file == Path(wanted.logo.file).name


def _taken(file: Path) -> None:
    found = read_logo(file)
    assert 1 <= found.shown_height <= 40
    assert 1 <= found.shown_width <= 192
    if file.suffix == ".svg":
        for element in ET.fromstring(found.data).iter():
            assert not re.search("script|foreign|image|style|animate|set$|handler", element.tag, re.IGNORECASE)
            for name, value in element.attrib.items():
                assert not name.rpartition("}")[2].lower().startswith("on")
                assert not name.endswith("href") or value.startswith("#")


def logo(data: bytes) -> None:
    """A picture: SVG, or PNG after a first byte P."""
    png = data[:1] == b"P"
    _from_file(data[1:] if png else data, _taken, "logo.png" if png else "logo.svg")


def template(data: bytes) -> None:
    """A template of a community's own, in the sandbox."""
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "theme/parts/it.html"
        file.parent.mkdir(parents=True)
        file.write_bytes(data.decode("utf-8", "ignore").encode())
        renderer = Renderer(EXAMPLE.site, Language("en"), Own(theme=Path(folder) / "theme"))
        try:
            assert b"root:x:" not in renderer.text("parts/it.html", {})
        except ContentError as fault:
            _whole(fault)
        assert [one.name for one in Path(folder).rglob("*")] == ["theme", "parts", "it.html"]


def _translated(file: Path) -> None:
    for message in catalogues.read(file):
        originals, texts = ([one] if isinstance(one, str) else one or () for one in (message.id, message.string))
        values: dict[str, str] = defaultdict(str)
        for original in originals if message.id else ():
            try:
                _ = original % values
            except (TypeError, ValueError):
                return
        for text in texts if message.id else ():
            _ = text % values
            assert "\n" not in text or any("\n" in original for original in originals)


def catalogue(data: bytes) -> None:
    """A message catalogue: what it says takes the values that the original takes, and lies in one line."""
    _from_file(data, _translated, "fr.po")


TARGETS: dict[str, Callable[[bytes], None]] = {
    target.__name__: target for target in (
        content, rules, text, lines, outline, table, markdown, look, logo, template, catalogue)
}
