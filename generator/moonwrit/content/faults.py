"""What a schema finds wrong in a document, as plain sentences at the right line."""

from __future__ import annotations

import difflib
import json
import re
from collections.abc import Iterator, Mapping, Sequence
from typing import Any, TypeVar

from pydantic import TypeAdapter, ValidationError
from pydantic_core import ErrorDetails

from moonwrit.content.yaml import Document, KeyPath
from moonwrit.errors import ContentError, did_you_mean

T = TypeVar("T")
Schema = Mapping[str, Any]

# What is wanted where a value is of the wrong kind, by pydantic's name of the error.
_WANTED = {
    "string_type": "text",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "float_type": "a number",
    "bool_type": "true or false",
    "list_type": "a list",
    "dict_type": "a mapping",
    "model_type": "a mapping",
    "date_type": "a date such as 2026-12-01",
    "date_parsing": "a date such as 2026-12-01",
    "date_from_datetime_parsing": "a date such as 2026-12-01",
    "date_from_datetime_inexact": "a date such as 2026-12-01",
    "datetime_type": "a date and time such as 2026-12-01T09:00:00+11:00",
    "datetime_parsing": "a date and time such as 2026-12-01T09:00:00+11:00",
    "datetime_from_date_parsing": "a date and time such as 2026-12-01T09:00:00+11:00",
    "time_type": "a time such as 18:30",
    "time_parsing": "a time such as 18:30",
}
_BOUNDS = {
    "less_than_equal": ("le", "is above {}", "{} or less"),
    "less_than": ("lt", "is not below {}", "less than {}"),
    "greater_than_equal": ("ge", "is below {}", "{} or more"),
    "greater_than": ("gt", "is not above {}", "more than {}"),
}


def schema_of(shape: TypeAdapter[Any]) -> dict[str, Any]:
    """The JSON Schema (2020-12) of a document of this ``shape``."""
    schema = shape.json_schema(by_alias=True)
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}


def checked(document: Document, shape: TypeAdapter[T], faults: list[ContentError]) -> T | None:
    """The document as a value of ``shape``, or None after adding all that is wrong to ``faults``.

    Values are taken strictly, as JSON has them: text is no number, 0 is not false, a number is no date.
    """
    try:
        return shape.validate_json(json.dumps(document.value), strict=True, by_alias=True, by_name=False)
    except ValidationError as error:
        faults += _in_words(document, error.errors(include_url=False), schema_of(shape))
        return None


def validated(document: Document, shape: TypeAdapter[T]) -> T:
    """The document as a value of ``shape``. Raises ContentError: the first fault, and how many more."""
    faults: list[ContentError] = []
    value = checked(document, shape, faults)
    if value is None:
        raise first_of(faults)
    return value


def first_of(faults: Sequence[ContentError]) -> ContentError:
    """The first of ``faults`` (at least one), which also says how many more there are."""
    first = faults[0]
    if len(faults) == 1:
        return first
    return ContentError(first.file, first.line, first.what, f"{first.mend} (and {len(faults) - 1} more)".strip())


def _in_words(document: Document, errors: Sequence[ErrorDetails], schema: Schema) -> list[ContentError]:
    """One fault for each place in the document, by line."""
    by_place: dict[tuple[KeyPath, str], list[ErrorDetails]] = {}
    unknown = [error["loc"] for error in errors if error["type"] == "extra_forbidden"]
    for path, error in _meant(document, errors):
        # A missing key has no place of its own: it is told apart by its name.
        missing = str(error["loc"][-1]) if error["type"] == "missing" else ""
        beside = [str(loc[-1]) for loc in unknown if loc[:-1] == error["loc"][:-1]]
        if missing and difflib.get_close_matches(missing, beside):
            continue  # misspelt rather than missing, and reported as such
        by_place.setdefault((path, missing), []).append(error)
    faults = [_fault(document, path, found, schema) for (path, _), found in by_place.items()]
    return sorted(faults, key=lambda fault: fault.line)


def _path(document: Document, error: ErrorDetails) -> KeyPath:
    """Where the error's value stands in the document.

    Pydantic's ``loc`` is the path with marks put in between for the members of unions and for keys, and
    a mark may be spelt like a key. Of the paths that can be read out of it, one is taken at which the
    document holds the value that the error names; then one with the same end; then the longest.
    """
    paths: list[KeyPath] = [()]
    for part in error["loc"]:
        paths += [(*path, part) for path in paths if (*path, part) in document.lines]
    end = error["loc"][-1:]
    return max(paths, key=lambda path: (document.at(*path) == error["input"], path[-1:] == end, len(path)))


def _meant(document: Document, errors: Sequence[ErrorDetails]) -> list[tuple[KeyPath, ErrorDetails]]:
    """The errors with their paths, without those of union members that the writer hardly meant.

    A value that fits no member of a union is reported for every member. Members of which only the
    inside is at fault are nearer than those of another kind altogether; the one with the fewest errors
    is kept.
    """
    found = [(_path(document, error), error) for error in errors]
    unions: dict[tuple[str | int, ...], dict[str | int, list[int]]] = {}
    for number, (path, error) in enumerate(found):
        loc = error["loc"][:-1] if error["type"] == "missing" else error["loc"]
        shared = next((i for i, part in enumerate(loc) if part not in path), None)
        if shared is not None and loc[shared] != "[key]":
            unions.setdefault(loc[:shared], {}).setdefault(loc[shared], []).append(number)
    dropped: set[int] = set()
    for loc, members in unions.items():
        inside = [m for m in members.values() if any(len(found[n][0]) > len(loc) or _lacks(found[n]) for n in m)]
        if inside:
            kept = min(inside, key=len)
            dropped.update(n for member in members.values() if member is not kept for n in member)
    return [one for number, one in enumerate(found) if number not in dropped]


def _lacks(found: tuple[KeyPath, ErrorDetails]) -> bool:
    return found[1]["type"] == "missing"


def _fault(document: Document, path: KeyPath, errors: Sequence[ErrorDetails], schema: Schema) -> ContentError:
    name = _name(path)
    error = errors[0]
    match error["type"]:
        case "missing":
            key = str(error["loc"][-1])
            description = _description(schema, (*path, key))
            mend = f"add it: {description}" if description else "add it"
            return document.error(path, f'{name} has no "{key}"', mend)
        case "extra_forbidden":
            known = {key for node in _nodes(schema, path[:-1]) for key in node.get("properties", {})}
            elsewhere = path[-1] in known  # a key of another member of a union
            mend = "it does not go with the keys beside it" if elsewhere else did_you_mean(str(path[-1]), known)
            return document.error(path, f'unknown key "{path[-1]}"', mend)
        case "value_error" | "assertion_error":
            what, _, mend = str(error.get("ctx", {}).get("error", error["msg"])).partition("; ")
            of_key = not path or error["loc"][-1] == "[key]"
            return document.error(path, what if of_key else f"{name}: {what}", mend)
    reasons, wanted = zip(*map(_reason, errors), strict=True)
    reason = reasons[0]
    if len(errors) > 1:  # the members of a union; the one whose bounds are passed was meant
        bounds = (said for said, member in zip(reasons, errors, strict=True) if member["type"] in _BOUNDS)
        reason = next(bounds, "is not one of the values allowed here")
    value = error["input"]
    what = f"{name} is empty" if value is None else f"{name} is {_shown(value)}, which {reason}"
    instead = _description(schema, path) or " or ".join(dict.fromkeys(wanted))
    return document.error(path, what, _respelt(errors) or f"write {instead}")


def _reason(error: ErrorDetails) -> tuple[str, str]:
    """``(what is wrong with the value, what is wanted instead)``."""
    kind = error["type"]
    context = error.get("ctx", {})
    if kind in _BOUNDS:
        bound, reason, wanted = _BOUNDS[kind]
        limit = f"{context[bound]:g}"
        return reason.format(limit), wanted.format(limit)
    if kind in _WANTED:
        wanted = _WANTED[kind]
        detail = f" ({context['error']})" if "error" in context else ""
        mend = "its keys and values, indented" if wanted == "a mapping" else wanted
        return f"is not {wanted.split(' such as')[0]}{detail}", mend
    if kind in ("literal_error", "enum"):
        words = _words(error)
        return "is not known here", f"one of {', '.join(words)}" if len(words) > 1 else f'"{words[0]}"'
    if kind == "too_short":
        return "is too short", f"at least {context['min_length']} below it"
    if kind == "too_long":
        return "is too long", f"at most {context['max_length']}"
    if kind == "string_pattern_mismatch":
        return "is not of the form wanted", f"text of the form {context['pattern']}"
    return f"cannot be used ({error['msg'][:1].lower()}{error['msg'][1:]})", "another value"


def _respelt(errors: Sequence[ErrorDetails]) -> str:
    """How to mend a value that would be right with quotes, or without, or with another spelling."""
    value = errors[0]["input"]
    kinds = {error["type"] for error in errors}
    words = [word for error in errors if error["type"] == "literal_error" for word in _words(error)]
    if isinstance(value, (int, float)) and ("string_type" in kinds or str(value) in words):
        return f'put it in quotes: "{_shown(value)}"'
    if isinstance(value, str):
        if kinds & {"int_type", "float_type"} and re.fullmatch(r"[-+]?[0-9]{1,18}(\.[0-9]+)?", value):
            return f"write it without quotes: {value}"
        if kinds == {"literal_error"}:
            return did_you_mean(value, words)
    return ""


def _words(error: ErrorDetails) -> list[str]:
    return re.findall(r"'([^']*)'", str(error.get("ctx", {}).get("expected", "")))


def _name(path: KeyPath) -> str:
    if not path:
        return "the file"
    if isinstance(path[-1], int):
        return f"item {path[-1] + 1} of {_name(path[:-1])}"
    return path[-1]


def _shown(value: Any) -> str:
    if isinstance(value, dict):
        return "a mapping" if value else "an empty mapping"
    if isinstance(value, list):
        return "a list" if value else "an empty list"
    text = json.dumps(value, ensure_ascii=False)
    return text if len(text) <= 60 else f"{text[:56]}..."


def _nodes(schema: Schema, path: KeyPath) -> list[Schema]:
    """The parts of ``schema`` that may describe the value at ``path``, references followed."""
    nodes = [*_alternatives(schema, schema)]
    for part in path:
        nodes = [end for node in nodes for below in _below(node, part) for end in _alternatives(below, schema)]
    return nodes


def _description(schema: Schema, path: KeyPath) -> str:
    """What the field at ``path`` is for: its own description, and not that of the model it holds."""
    if not path:
        return ""
    found = (below for node in _nodes(schema, path[:-1]) for below in _below(node, path[-1]))
    return next((str(below["description"]) for below in found if "description" in below), "")


def _below(node: Schema, part: str | int) -> Iterator[Schema]:
    if isinstance(part, int):
        below = [node.get("items")]
    elif part in node.get("properties", {}):
        below = [node["properties"][part]]
    else:
        below = [*node.get("patternProperties", {}).values(), node.get("additionalProperties")]
    yield from (schema for schema in below if isinstance(schema, dict))


def _alternatives(node: Schema, root: Schema) -> Iterator[Schema]:
    if "$ref" in node:
        yield from _alternatives(root["$defs"][node["$ref"].rpartition("/")[2]], root)
    for choice in (*node.get("anyOf", ()), *node.get("oneOf", ()), *node.get("allOf", ())):
        yield from _alternatives(choice, root)
    yield node


__all__ = ["checked", "first_of", "schema_of", "validated"]
