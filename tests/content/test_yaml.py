"""YAML as it was written: what YAML 1.1 makes of plain words, and what is refused."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
import yaml as pyyaml
from hypothesis import example, given, settings
from hypothesis import strategies as st

from moonwrit.content.yaml import MAX_BYTES, MAX_DEPTH, Document, parse, read
from moonwrit.errors import ContentError

FILE = Path("it.yaml")


def value(text: str) -> Any:
    return parse(text.encode(), FILE).value


def refusal(data: str | bytes) -> str:
    with pytest.raises(ContentError) as caught:
        parse(data if isinstance(data, bytes) else data.encode(), FILE)
    return str(caught.value)


@pytest.mark.parametrize(
    ("written", "read"),
    [
        # Times, codes, dates and yes/no words stay as they are written (YAML 1.1 reads 1110, False, ...).
        ("18:30", "18:30"),
        ("no", "no"),
        ("on", "on"),
        ("yes", "yes"),
        ("True", "True"),
        ("2026-12-01", "2026-12-01"),
        ("2026-12-01T09:00:00+11:00", "2026-12-01T09:00:00+11:00"),
        ("007", "007"),
        ("0x1F", "0x1F"),
        ("0o17", "0o17"),
        ("1_000", "1_000"),
        ("1e3", "1e3"),
        ("9" * 19, "9" * 19),
        (".inf", ".inf"),
        (".nan", ".nan"),
        ("=", "="),
        ('"12"', "12"),
        ("'true'", "true"),
        ('""', ""),
        ("|\n  12", "12"),
        # Numbers, true and false, and nothing.
        ("12", 12),
        ("-3", -3),
        ("+3", 3),
        ("0", 0),
        ("-38.10", -38.1),
        ("1.5e3", 1500.0),
        ("true", True),
        ("false", False),
        ("null", None),
        ("~", None),
        ("", None),
    ],
)
def test_a_plain_word(written: str, read: object) -> None:
    (result,) = value(f"key: {written}").values()
    assert (type(result), result) == (type(read), read)


def test_keys_are_text_as_written() -> None:
    assert value("no: 1\n1447: 2\n~: 3\n<<: 4\ntrue: 5") == {"no": 1, "1447": 2, "~": 3, "<<": 4, "true": 5}


def test_text_is_unicode_and_lines_may_end_as_on_windows() -> None:
    assert value("\ufeffname: عيد\r\nother: ı\r\n") == {"name": "عيد", "other": "ı"}


def test_every_value_knows_its_line() -> None:
    document = parse(
        b"# a comment\n"
        b"first:\n"
        b"  - a\n"
        b"  - {b: 1,\n"
        b"     c: 2}\n"
        b"second: >-\n"
        b"  long\n"
        b"  text\n"
        b"third:\n"
        b"    4\n",
        FILE,
    )
    assert document.value == {"first": ["a", {"b": 1, "c": 2}], "second": "long text", "third": 4}
    assert dict(document.lines) == {
        (): 2,
        ("first",): 2,
        ("first", 0): 3,
        ("first", 1): 4,
        ("first", 1, "b"): 4,
        ("first", 1, "c"): 5,
        ("second",): 6,
        ("third",): 9,
    }
    # A value that does not exist has the line of what is around it.
    assert document.line_of("first", 1, "d", "e") == 4
    assert document.line_of("fourth") == 2
    assert str(document.error(("third",), "too much", "write 3")) == "it.yaml:9: too much; write 3"


REFUSED = [
    ("a: 1\nb: 2\na: 3\n", 'it.yaml:3: the key "a" is repeated; it is first on line 1; keep one of them'),
    ("a:\n  b: 1\n  'b': 2\n", 'it.yaml:3: the key "b" is repeated; it is first on line 2; keep one of them'),
    (
        "a: &x 1\nb: *x\n",
        "it.yaml:1: the anchor &x is not used; remove it, or put text that begins with & in quotes",
    ),
    (
        "a: 1\nb: *x\n",
        "it.yaml:2: the alias *x is not followed; write the value out, or put text that begins with * in quotes",
    ),
    (
        "a: !!python/name:os.system x\n",
        "it.yaml:1: the tag !!python/name:os.system is not used; "
        "remove it, or put text that begins with ! in quotes",
    ),
    ("a:\n\tb: 1\n", "it.yaml:2: a tab is written here; use spaces"),
    ("a: 1\nb: x\ty\n", "it.yaml:2: a tab is written here; use spaces"),
    ("a: caf\xe9\n".encode("latin-1"), "it.yaml:1: a character is not UTF-8; save the file as UTF-8"),
    (b"a: 1\r\nb: \xff\r\n", "it.yaml:2: a character is not UTF-8; save the file as UTF-8"),
    ("a: 1\n".encode("utf-16"), "it.yaml:1: a character is not UTF-8; save the file as UTF-8"),
    ("a: 1\nb: x\x00y\n", "it.yaml:2: the control character U+0000 is written here; remove it"),
    ("a: 1\nb: x\u2028y\n", "it.yaml:2: the control character U+2028 is written here; remove it"),
    ("a: 1\rb: 2\r", "it.yaml:1: the control character U+000D is written here; remove it"),
    ("a: '\ufffe'\n", "it.yaml:1: the control character U+FFFE is written here; remove it"),
    ('a: 1\nb: "\\ud800"\n', "it.yaml:2: half of a character pair is written here; write it whole"),
    ('a: 1\nb: "\\UFFFFFFFF"\n', "it.yaml:2: a character cannot be read; remove it or its escape"),
    ("? [a]\n: b\n", "it.yaml:1: a key must be plain text; write it as key: value"),
    ("a: 1\n'': 2\n", "it.yaml:2: a key must be plain text; write it as key: value"),
    ("", "it.yaml: the file is empty; write its keys, or {} where it has none"),
    ("# only a comment\n", "it.yaml: the file is empty; write its keys, or {} where it has none"),
    (
        "a: 1\n---\nb: 2\n",
        "it.yaml:2: this is not YAML (but found another document); "
        "keep one document in a file; remove the line ---",
    ),
    (
        "a: Eid: the feast\n",
        "it.yaml:1: this is not YAML (mapping values are not allowed here); "
        "put text that holds a colon and a space in quotes",
    ),
    (
        "a:\n  b: 1\n c: 2\n",
        "it.yaml:3: this is not YAML (expected <block end>, but found '<block mapping start>'); "
        "begin all keys of one block in the same column, and items with a hyphen",
    ),
    (
        "a: 1\nb: 'open\nc: 2\n",
        "it.yaml:2: this is not YAML (found unexpected end of stream); "
        "close the quotes or the bracket that begin here",
    ),
    (
        "a: 1\nb: [1, 2\nc: 3\n",
        "it.yaml:2: this is not YAML (expected ',' or ']', but got ':'); "
        "close the bracket, and put commas between its items",
    ),
    (
        "a: @home\n",
        "it.yaml:1: this is not YAML (found character '@' that cannot start any token); "
        "put text that begins with this character in quotes",
    ),
    ("[" * 41, "it.yaml:1: values are nested deeper than 40 levels; write them flatter"),
    (b"#" * (MAX_BYTES + 1), "it.yaml: the file is larger than 2 MB; split or shorten it"),
]


@pytest.mark.parametrize(("data", "expected"), REFUSED, ids=[expected for _, expected in REFUSED])
def test_what_is_refused(data: str | bytes, expected: str) -> None:
    assert refusal(data) == expected


def test_nesting_is_allowed_up_to_the_limit() -> None:
    deepest = value("[" * MAX_DEPTH + "]" * MAX_DEPTH)
    for _ in range(MAX_DEPTH - 1):
        (deepest,) = deepest
    assert deepest == []


def test_files_are_read_by_name(tmp_path: Path) -> None:
    file = tmp_path / "it.yaml"
    with pytest.raises(ContentError, match="the file is missing; add it"):
        read(file)
    file.write_text("a: 18:30\n", encoding="utf-8")
    assert read(file) == Document(file, {"a": "18:30"}, {(): 1, ("a",): 1})
    file.write_bytes(b"#" * (MAX_BYTES + 1))
    with pytest.raises(ContentError, match="larger than 2 MB"):
        read(file)


# Properties

_PLAIN = st.recursive(
    st.none() | st.booleans() | st.integers(-(10**17), 10**17) | st.text(st.characters(exclude_categories=["C"])),
    lambda inner: st.lists(inner, max_size=4)
    | st.dictionaries(st.text(st.characters(categories=["L", "N"]), min_size=1), inner, max_size=4),
    max_leaves=20,
)


@settings(deadline=None)  # a busy machine is no fault
@given(st.dictionaries(st.text("abc", min_size=1), _PLAIN, min_size=1))
def test_what_another_writer_writes_is_read_back(values: dict[str, Any]) -> None:
    # Quoted throughout: what a plain word means is not the same for both.
    text = pyyaml.safe_dump(values, allow_unicode=True, default_style='"', default_flow_style=False)
    text = text.replace("!!int ", "").replace("!!bool ", "").replace("!!null ", "")

    def unquoted(value: Any) -> Any:
        if isinstance(value, dict):
            return {str(key): unquoted(inner) for key, inner in value.items()}
        if isinstance(value, list):
            return [unquoted(inner) for inner in value]
        if isinstance(value, bool) or value is None:
            return "null" if value is None else str(value).lower()
        return str(value)

    assert value(text) == unquoted(values)


@settings(deadline=None)  # a busy machine is no fault
@given(st.binary(max_size=60) | st.text("ab:-[]{}&*!?|>'\"%@#\\Ux0 \n,", max_size=60).map(str.encode))
@example(b'a: "\\UFFFFFFFF"')
@example(b"%YAML 9\n---\na")
def test_anything_is_read_or_refused_in_words(data: bytes) -> None:
    refused = None
    try:
        document = parse(data, FILE)
    except ContentError as error:
        refused = error
    if refused is None:
        assert all(1 <= line <= data.count(b"\n") + 1 for line in document.lines.values())
    else:
        assert str(refused).startswith("it.yaml")
        assert 0 <= refused.line <= data.count(b"\n") + 1
        assert "\n" not in str(refused)
