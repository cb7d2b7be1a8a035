"""What is fuzzed: each target takes bytes and raises nothing but what it is meant to refuse with.

``make fuzz`` runs them with atheris, guided by coverage (``guided.py``); what is worth keeping is put into
``corpus/<target>/``, which ``test_corpus.py`` replays.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from datetime import date
from pathlib import Path

import icalendar
from pydantic import TypeAdapter, ValidationError

from moonwrit import journal
from moonwrit.content.faults import validated
from moonwrit.content.load import RECORD, SHAPES
from moonwrit.content.models import Observance, Text
from moonwrit.content.outlines import read_outline
from moonwrit.content.tables import read_table
from moonwrit.content.yaml import parse
from moonwrit.errors import ContentError
from moonwrit.observances import occurrences
from moonwrit.policy import FIXED, Evidence, Month
from moonwrit.publish.icalendar import FeedText

HERE = Path(__file__).parent
CORPUS = HERE / "corpus"
FILE = Path("it.yaml")
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


TARGETS: dict[str, Callable[[bytes], None]] = {
    target.__name__: target for target in (content, rules, text, lines, outline, table)
}
