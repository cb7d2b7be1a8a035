"""Digests of values: equal for equal values in any process, and for nothing else.

What is drawn from values alone need not be drawn again while their digest is the same (see ``pieces``). A value whose
parts are not known to this module is refused, so that nothing a result hangs on can be left out unseen.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import fields, is_dataclass
from datetime import date, datetime, time, timedelta
from functools import cache, partial
from hashlib import blake2b
from pathlib import PurePath
from types import FunctionType, MethodType, NoneType
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
from markupsafe import Markup
from pydantic import BaseModel

_PLAIN = frozenset({
    NoneType, bool, int, float, str, bytes, date, datetime, time, timedelta, range, Markup, ZoneInfo,
})
SIZE = 16

Parts = Callable[[Any], Iterable[object]]


class Digests:
    """``of`` values, which must not change afterwards: each is looked at once."""

    def __init__(self) -> None:
        # With the value itself, whose id is another's once it is gone.
        self._known: dict[int, tuple[object, str]] = {}

    def of(self, *values: object) -> bytes:
        """Raises TypeError for a value that is none of those known here."""
        return _hashed(self._all(values))

    def _all(self, values: Iterable[object]) -> str:
        known = self._known
        return ",".join([known[id(one)][1] if id(one) in known else self._text(one) for one in values])

    def _text(self, value: Any) -> str:
        kind: type = type(value)
        if kind in _PLAIN:
            return f"{kind.__name__} {value!r}"
        if kind is tuple or kind is list:
            return f"({self._all(value)})"
        text = f"{kind.__module__}.{kind.__qualname__} {_hashed(self._all(_parts_of(kind)(value))).hex()}"
        self._known[id(value)] = (value, text)
        return text


@cache
def _parts_of(kind: type) -> Parts:
    """What tells a value of this kind from others."""
    if hasattr(kind, "digested"):
        return lambda value: (value.digested,)
    if issubclass(kind, BaseModel):
        return _attributes(list(kind.model_fields))
    if is_dataclass(kind):
        return _attributes([one.name for one in fields(kind)])
    if issubclass(kind, Mapping):
        return lambda value: (part for item in value.items() for part in item)
    if issubclass(kind, tuple):  # with named parts
        return iter
    if issubclass(kind, frozenset):
        return lambda value: sorted(value, key=repr)
    if issubclass(kind, np.ndarray):
        return lambda value: (value.dtype.str, value.shape, value.tobytes())
    if issubclass(kind, np.generic | PurePath):
        return lambda value: (repr(value),)
    if issubclass(kind, partial):
        return lambda value: (value.func, value.args, value.keywords)
    if issubclass(kind, MethodType):
        return lambda value: (value.__self__, value.__func__)
    if issubclass(kind, FunctionType):
        return _of_function
    raise TypeError(f"{kind.__qualname__} cannot be digested")


def _attributes(names: list[str]) -> Parts:
    return lambda value: [getattr(value, name) for name in names]


def _of_function(value: FunctionType) -> Iterable[object]:
    """Which of the program's functions it is, for their code is digested with the program; and what it holds."""
    held = [cell.cell_contents for cell in value.__closure__ or ()]
    return (value.__module__, value.__qualname__, value.__code__.co_firstlineno, value.__code__.co_code, held,
            value.__defaults__, value.__kwdefaults__)


def _hashed(text: str) -> bytes:
    return blake2b(text.encode("utf-8", "surrogatepass"), digest_size=SIZE).digest()


__all__ = ["SIZE", "Digests"]
