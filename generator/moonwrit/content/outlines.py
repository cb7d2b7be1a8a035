"""The outline of a region: a GeoJSON file (RFC 7946) beside regions.yaml."""

from __future__ import annotations

import json
from collections.abc import Iterator
from itertools import pairwise
from pathlib import Path
from typing import Any

from moonwrit.errors import ContentError

MAX_BYTES = 8 * 1024 * 1024
MAX_POINTS = 20_000
MAX_POINTS_IN_ALL = 30_000
MAX_SIDES_ABOVE = 1000
"""No more sides of a ring than these may share a longitude: those of a coast are some dozens, and every two of them are
held against each other."""

_Position = tuple[float, float]
Polygons = tuple[tuple[tuple[_Position, ...], ...], ...]
"""Polygons; each is rings, the outer one first; each ring is (longitude, latitude) in degrees, closed."""


def read_outline(file: Path) -> Polygons:
    """The polygons in ``file``: a Polygon or a MultiPolygon, alone, in a Feature or in a FeatureCollection.

    Raises ContentError where the file cannot be read or holds anything else.
    """
    try:
        with file.open("rb") as stream:
            data = stream.read(MAX_BYTES + 1)
        if len(data) > MAX_BYTES:
            raise ContentError(file, 0, "the outline is larger than 8 MB", "simplify it")
        root = json.loads(data.decode("utf-8-sig"))
    except FileNotFoundError:
        raise ContentError(file, 0, "the file is missing", "put the outline beside regions.yaml") from None
    except OSError as error:
        raise ContentError(file, 0, f"the file cannot be read ({error.strerror})", "make it readable") from None
    except json.JSONDecodeError as error:
        raise ContentError(file, error.lineno, f"this is not JSON ({error.msg})", "export it again") from None
    except (UnicodeDecodeError, RecursionError, ValueError):
        raise ContentError(file, 0, "this is not GeoJSON", "export it again as GeoJSON, in UTF-8") from None
    polygons = tuple(
        tuple(_ring(file, f"ring {r + 1} of polygon {p + 1}", ring) for r, ring in enumerate(polygon))
        for p, polygon in enumerate(_polygons(file, root))
    )
    if sum(len(ring) for polygon in polygons for ring in polygon) > MAX_POINTS_IN_ALL:
        raise ContentError(file, 0, f"the outline has more than {MAX_POINTS_IN_ALL} points", "simplify it")
    if not polygons:
        raise ContentError(file, 0, "there is no polygon in it", "export the outline as a Polygon")
    return polygons


def _polygons(file: Path, value: Any) -> Iterator[list[Any]]:
    kind = value.get("type") if isinstance(value, dict) else None
    match kind:
        case "FeatureCollection" if isinstance(value.get("features"), list):
            for feature in value["features"]:
                yield from _polygons(file, feature)
        case "Feature":
            yield from _polygons(file, value.get("geometry"))
        case "MultiPolygon" if _lists(value.get("coordinates")):
            yield from value["coordinates"]
        case "Polygon" if _lists([value.get("coordinates")]):
            yield value["coordinates"]
        case _:
            what = f"{json.dumps(kind)} is not an outline" if kind else "this is not GeoJSON"
            raise ContentError(file, 0, what, "keep nothing but polygons in it")


def _lists(value: Any) -> bool:
    return isinstance(value, list) and all(isinstance(inner, list) and inner for inner in value)


def _ring(file: Path, name: str, ring: Any) -> tuple[_Position, ...]:
    if not _lists(ring) or not all(map(_on_earth, ring)):
        mend = "give longitude from -180 to 180 and latitude from -90 to 90, in this order"
        raise ContentError(file, 0, f"{name} has a point that is not on the Earth", mend)
    if len(ring) < 4 or ring[0] != ring[-1]:
        mend = "give at least three points, and the first again at the end"
        raise ContentError(file, 0, f"{name} is not closed", mend)
    if len(ring) > MAX_POINTS:
        raise ContentError(file, 0, f"{name} has more than {MAX_POINTS} points", "simplify it")
    points = tuple((float(point[0]), float(point[1])) for point in ring)
    if any(abs(one[0] - other[0]) > 180 for one, other in pairwise(points)):
        mend = "cut the polygon in two at 180 degrees (RFC 7946, 3.1.9)"
        raise ContentError(file, 0, f"{name} crosses the antimeridian", mend)
    try:
        where = _crossing(points)
    except OverflowError:
        raise ContentError(file, 0, f"{name} goes to and fro too often to be checked", "simplify it") from None
    if where is not None:
        what = f"{name} crosses itself near {where[0]:g}, {where[1]:g}"
        raise ContentError(file, 0, what, "draw it so that its sides meet only at its points")
    return points


def _crossing(points: tuple[_Position, ...]) -> _Position | None:
    """Where two sides of a ring cross or touch that are not neighbours; None where none do.

    Sides are swept from west to east, so that only those that overlap in longitude are compared. Raises OverflowError
    where these are too many.
    """
    sides = sorted(
        (min(one[0], other[0]), max(one[0], other[0]), number, one, other)
        for number, (one, other) in enumerate(pairwise(points))
        if one != other
    )
    last = len(points) - 2
    near: list[tuple[float, int, _Position, _Position]] = []
    for west, east, number, one, other in sides:
        near = [side for side in near if side[0] >= west]
        if len(near) > MAX_SIDES_ABOVE:
            raise OverflowError(len(near))
        for _, earlier, start, end in near:
            if abs(number - earlier) <= 1 or {number, earlier} == {0, last}:
                continue
            if _meet(one, other, start, end):
                return one
        near.append((east, number, one, other))
    return None


def _meet(a: _Position, b: _Position, c: _Position, d: _Position) -> bool:
    """Do the sides ab and cd share a point?"""

    def turn(p: _Position, q: _Position, r: _Position) -> float:
        return (q[0] - p[0]) * (r[1] - p[1]) - (q[1] - p[1]) * (r[0] - p[0])

    if max(a[1], b[1]) < min(c[1], d[1]) or max(c[1], d[1]) < min(a[1], b[1]):
        return False
    if max(a[0], b[0]) < min(c[0], d[0]) or max(c[0], d[0]) < min(a[0], b[0]):
        return False
    return turn(a, b, c) * turn(a, b, d) <= 0 and turn(c, d, a) * turn(c, d, b) <= 0


def _on_earth(point: list[Any]) -> bool:
    numbers = len(point) >= 2 and all(type(number) in (int, float) for number in point[:2])
    return numbers and abs(point[0]) <= 180 and abs(point[1]) <= 90  # and so no NaN


__all__ = ["MAX_BYTES", "Polygons", "read_outline"]
