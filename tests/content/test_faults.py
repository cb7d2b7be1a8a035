"""Faults in shapes that the content files do not have (yet): unions of models, lists of lists, bounds."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated, Any, Literal

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import BaseModel, ConfigDict, Discriminator, Field, Tag, TypeAdapter

from moonwrit.content.faults import checked, schema_of, validated
from moonwrit.content.load import SHAPES
from moonwrit.content.models import Day, Moment
from moonwrit.content.yaml import parse
from moonwrit.errors import ContentError


class _Strict(BaseModel):
    model_config = ConfigDict(extra="forbid")


class Circle(_Strict):
    radius: Annotated[float, Field(gt=0, lt=10)]
    colour: Literal["red", "blue"] = "red"


class Box(_Strict):
    width: float
    height: float


def _kind(value: Any) -> str:
    return "radius" if "radius" in value else "box"


class Shapes(_Strict):
    either: Circle | Box | None = None
    # The mark of the first member is spelt like one of its keys.
    told: (
        Annotated[Annotated[Circle, Tag("radius")] | Annotated[Box, Tag("box")], Discriminator(_kind)] | None
    ) = None
    names: list[str] | str | None = None
    grid: list[list[int]] = []
    few: Annotated[list[int], Field(max_length=2)] = []
    on: Day | None = None
    at: Moment | None = None


def said(text: str) -> str:
    with pytest.raises(ContentError) as caught:
        validated(parse(text.encode(), Path("shapes.yaml")), TypeAdapter(Shapes))
    return str(caught.value).removeprefix("shapes.yaml:")


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (
            "either:\n  width: 1\n  height: tall\n",
            '3: height is "tall", which is not a number; write a number',
        ),
        (
            "either:\n  width: 1\n",
            '1: either has no "height"; add it',
        ),
        (
            "either:\n  radius: 1\n  colour: rad\n",
            '3: colour is "rad", which is not known here; did you mean "red"?',
        ),
        (
            "either: round\n",
            '1: either is "round", which is not one of the values allowed here; '
            "write its keys and values, indented",
        ),
        (
            "told:\n  radius: 1\n  colour: rad\n",
            '3: colour is "rad", which is not known here; did you mean "red"?',
        ),
        (
            "told:\n  radius: 1\n  height: 1\n",
            '3: unknown key "height"; it does not go with the keys beside it',
        ),
        (
            "told:\n  radius: 10\n",
            "2: radius is 10, which is not below 10; write less than 10",
        ),
        (
            "told:\n  radius: 0.0\n",
            "2: radius is 0.0, which is not above 0; write more than 0",
        ),
        (
            "names:\n  - a\n  - 3\n",
            '3: item 2 of names is 3, which is not text; put it in quotes: "3"',
        ),
        (
            "names: 3\n",
            '1: names is 3, which is not one of the values allowed here; put it in quotes: "3"',
        ),
        (
            "grid:\n  - [1, 2]\n  - [3,\n     four]\n",
            '4: item 2 of item 2 of grid is "four", which is not a whole number; write a whole number',
        ),
        (
            "few: [1, 2, 3]\n",
            "1: few is a list, which is too long; write at most 2",
        ),
        (
            "on: 2026-02-29\n",
            '1: on: "2026-02-29" is not a date (there is no such date); write for instance 2026-12-01',
        ),
        (
            "at: 2026-12-01\n",
            "1: at: 2026-12-01T00:00:00 has no time zone; write it as 2026-12-01T09:00:00+11:00",
        ),
        (
            "at: 18:30\n",
            '1: at: "18:30" is not a date and time; write for instance 2026-12-01T09:00:00+11:00',
        ),
    ],
)
def test_a_fault_is_named(text: str, expected: str) -> None:
    assert said(text) == expected


def test_the_order_is_that_of_lines_and_the_rest_is_counted() -> None:
    assert said("names: 3\ncolour: red\nfew: 1\n").endswith('put it in quotes: "3" (and 2 more)')
    assert said("x: 1\nnames: 3\n").startswith('1: unknown key "x"; known here: at, either, few')


def test_what_is_right_comes_back() -> None:
    shapes = validated(parse(b"told: {width: 1, height: 2.5}\ngrid: [[1], []]\n", Path("x")), TypeAdapter(Shapes))
    assert shapes.told == Box(width=1.0, height=2.5)
    assert shapes.grid == [[1], []]


# Properties


def _keys(schema: Any) -> set[str]:
    """Every key that a schema knows, at any depth."""
    if isinstance(schema, dict):
        own = set(schema.get("properties", {}))
        return own.union(*(_keys(inner) for inner in schema.values()))
    return set().union(*(_keys(inner) for inner in schema)) if isinstance(schema, list) else set()


_KEYS = sorted({"north", "en", "nonsense"}.union(*(_keys(schema_of(shape)) for shape in SHAPES.values())))
_LEAVES = [None, True, 0, 9, 31, -1.5, "", "every", "no", "18:30", "2026-12-01", "2026-02-30", "A"]
_ANY = st.recursive(
    st.sampled_from(_LEAVES),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.sampled_from(_KEYS), inner, max_size=6),
    max_leaves=25,
)


@settings(deadline=None, max_examples=300)
@given(st.sampled_from(sorted(SHAPES)), st.dictionaries(st.sampled_from(_KEYS), _ANY, max_size=4))
def test_whatever_is_wrong_is_said_in_one_line(file: str, value: dict[str, Any]) -> None:
    document = parse(json.dumps(value, indent=1).encode(), Path(file))
    faults: list[ContentError] = []
    result = checked(document, SHAPES[file], faults)
    assert (result is None) == bool(faults)
    assert [fault.line for fault in faults] == sorted(fault.line for fault in faults)
    for fault in faults:
        assert 1 <= fault.line <= json.dumps(value, indent=1).count("\n") + 1
        assert str(fault).startswith(f"{file}:{fault.line}: ")
        assert "\n" not in str(fault)
