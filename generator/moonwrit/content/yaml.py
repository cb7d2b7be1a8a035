"""YAML read as it was written, with the line of every value.

PyYAML follows YAML 1.1, where ``18:30`` is the number 1110, ``no`` is false, a repeated key silently
wins and a few aliases can unfold into gigabytes. Here a plain word is a number, ``true``, ``false`` or
nothing only where JSON would say so; everything else, dates and times included, stays the text that
was written, and keys are always text. Aliases, tags, repeated keys, tabs and control characters are
refused.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import yaml

from moonwrit.errors import ContentError
from moonwrit.files import utf8

MAX_BYTES = 2 * 1024 * 1024
MAX_DEPTH = 40
MAX_VALUES = 150_000
"""More than fit into 2 MB of real content. A file of nothing but brackets would hold a million: a minute, and 1 GB."""

_CONSTANTS = {"": None, "~": None, "null": None, "true": True, "false": False}
# Longer runs of digits, and those with a leading zero, are codes rather than quantities.
_INT = re.compile(r"[-+]?(0|[1-9][0-9]{0,17})")
_FLOAT = re.compile(r"[-+]?(0|[1-9][0-9]{0,17})\.[0-9]+([eE][-+]?[0-9]{1,2})?")
_REFUSED = re.compile(r"[\x00-\x09\x0b-\x1f\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff]")

# What PyYAML says, and how to mend what most often lies behind it.
_MENDS = (
    ("mapping values are not allowed", "put text that holds a colon and a space in quotes"),
    ("expected <block end>", "begin all keys of one block in the same column, and items with a hyphen"),
    ("could not find expected ':'", "write each key as key: value"),
    ("unexpected end of stream", "close the quotes or the bracket that begin here"),
    ("expected ',' or", "close the bracket, and put commas between its items"),
    ("cannot start any token", "put text that begins with this character in quotes"),
    ("another document", "keep one document in a file; remove the line ---"),
)



KeyPath = tuple[str | int, ...]
"""Keys of mappings and positions in lists (from 0), from the outside in."""


@dataclass(frozen=True, slots=True)
class Document:
    """A YAML file as plain values: dict (keys are text), list, str, int, float, bool and None.

    ``lines`` maps the path of each value (keys, and positions in lists from 0) to the line, from 1, on
    which its key or its item begins; the empty path is the whole document.
    """

    file: Path
    value: Any
    lines: Mapping[KeyPath, int] = field(repr=False)

    def at(self, *path: str | int) -> Any:
        """The value at ``path``. Raises LookupError where there is none."""
        value = self.value
        for part in path:
            value = value[part]
        return value

    def line_of(self, *path: str | int) -> int:
        """The line of the value at ``path``, or of the nearest value around it that exists."""
        while path not in self.lines:
            path = path[:-1]
        return self.lines[path]

    def error(self, path: KeyPath, what: str, mend: str = "") -> ContentError:
        """An error that points at the value at ``path``."""
        return ContentError(self.file, self.line_of(*path), what, mend)


def read(file: Path, empty: Any = None) -> Document:
    """Read ``file``; ``empty`` is its value where nothing is written in it.

    Raises ContentError where it cannot be read, breaks a rule named above, or is empty and may not be.
    """
    try:
        with file.open("rb") as stream:
            data = stream.read(MAX_BYTES + 1)
    except FileNotFoundError:
        raise ContentError(file, 0, "the file is missing", "add it") from None
    except OSError as error:
        what = f"the file cannot be read ({error.strerror})"
        raise ContentError(file, 0, what, "give its path, and the right to read it") from None
    return parse(data, file, empty)


def parse(data: bytes, file: Path, empty: Any = None) -> Document:
    """Read YAML from ``data``, as ``read`` does; ``file`` is the name that errors give."""
    if len(data) > MAX_BYTES:
        raise ContentError(file, 0, "the file is larger than 2 MB", "split or shorten it")
    text = utf8(data, file)
    if refused := _REFUSED.search(text):
        line = text.count("\n", 0, refused.start()) + 1
        if refused.group() == "\t":
            raise ContentError(file, line, "a tab is written here", "use spaces")
        code = f"U+{ord(refused.group()):04X}"
        raise ContentError(file, line, f"the control character {code} is written here", "remove it")

    loader = _Loader(text, file)
    try:
        node = loader.get_single_node()
    except yaml.MarkedYAMLError as error:
        raise _plain_error(error, file) from None
    except (yaml.YAMLError, ValueError, OverflowError):
        line = loader.get_mark().line + 1
        raise ContentError(file, line, "a character cannot be read", "remove it or its escape") from None
    lines: dict[KeyPath, int] = {}
    value = None if node is None else _value(node, (), _line(node), lines, file)
    if value is None and empty is not None:
        return Document(file, empty, {(): 1})
    if value is None:
        raise ContentError(file, 0, "the file is empty", "write its keys, or {} where it has none")
    return Document(file, value, lines)


class _Loader(yaml.SafeLoader):
    """Composes nodes, whose tags nothing reads: the meaning of a plain word is given by ``_value``."""

    def __init__(self, text: str, file: Path) -> None:
        super().__init__(text)
        self.file = file
        self.depth = 0
        self.count = 0

    def compose_node(self, parent: yaml.Node | None, index: int) -> yaml.Node | None:
        event = self.peek_event()  # type: ignore[no-untyped-call]
        line = event.start_mark.line + 1
        if isinstance(event, yaml.AliasEvent):
            mend = "write the value out, or put text that begins with * in quotes"
            raise ContentError(self.file, line, f"the alias *{event.anchor} is not followed", mend)
        if event.anchor is not None:
            mend = "remove it, or put text that begins with & in quotes"
            raise ContentError(self.file, line, f"the anchor &{event.anchor} is not used", mend)
        if event.tag is not None:
            tag = event.tag.replace("tag:yaml.org,2002:", "!!")
            mend = "remove it, or put text that begins with ! in quotes"
            raise ContentError(self.file, line, f"the tag {tag} is not used", mend)
        self.count += 1
        if self.count > MAX_VALUES:
            raise ContentError(self.file, line, f"there are more than {MAX_VALUES} values in it", "split or shorten it")
        nests = isinstance(event, yaml.CollectionStartEvent)
        self.depth += nests
        if self.depth > MAX_DEPTH:
            what = f"values are nested deeper than {MAX_DEPTH} levels"
            raise ContentError(self.file, line, what, "write them flatter")
        node = super().compose_node(parent, index)
        self.depth -= nests
        return node


def _line(node: yaml.Node) -> int:
    return int(node.start_mark.line) + 1


def _value(
    node: yaml.Node,
    path: KeyPath,
    line: int,
    lines: dict[KeyPath, int],
    file: Path,
) -> Any:
    """The plain value of ``node``; adds its line and those of all below it to ``lines``."""
    lines[path] = line
    if isinstance(node, yaml.SequenceNode):
        return [_value(item, (*path, i), _line(item), lines, file) for i, item in enumerate(node.value)]
    if isinstance(node, yaml.MappingNode):
        mapping: dict[str, Any] = {}
        for key_node, value_node in node.value:
            at = _line(key_node)
            if not isinstance(key_node, yaml.ScalarNode) or not key_node.value:
                raise ContentError(file, at, "a key must be plain text", "write it as key: value")
            key = _text(key_node, file)
            if key in mapping:
                what = f'the key "{key}" is repeated; it is first on line {lines[*path, key]}'
                raise ContentError(file, at, what, "keep one of them")
            mapping[key] = _value(value_node, (*path, key), at, lines, file)
        return mapping
    text = _text(node, file)
    if isinstance(node, yaml.ScalarNode) and node.style is not None:  # quoted, or a block of text
        return text
    if text in _CONSTANTS:
        return _CONSTANTS[text]
    if _INT.fullmatch(text):
        return int(text)
    return float(text) if _FLOAT.fullmatch(text) else text


def _text(node: yaml.Node, file: Path) -> str:
    text = str(node.value)
    if any("\ud800" <= character <= "\udfff" for character in text):
        raise ContentError(file, _line(node), "half of a character pair is written here", "write it whole")
    return text


def _plain_error(error: yaml.MarkedYAMLError, file: Path) -> ContentError:
    problem = error.problem or "it cannot be read"
    # Where something is never closed, the beginning is the place to look at.
    unclosed = "unexpected end of stream" in problem or "expected ',' or" in problem
    mark = (error.context_mark if unclosed else None) or error.problem_mark or error.context_mark
    mend = next((mend for sign, mend in _MENDS if sign in problem), "look at the indentation and quotes here")
    return ContentError(file, mark.line + 1 if mark else 0, f"this is not YAML ({problem})", mend)


__all__ = ["MAX_BYTES", "MAX_DEPTH", "MAX_VALUES", "Document", "KeyPath", "parse", "read"]
