"""A part of the Earth as a flat picture: its box, and the paths of lines, surfaces and coasts in it.

Plate carrée. Coordinates of paths are in units of the view box, to a tenth.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from moonwrit.sky import Array
from moonwrit.sky.land import Outline, land

WIDTH = 720


@dataclass(frozen=True, slots=True)
class Box:
    """What a map shows, in degrees, longitudes as they are reckoned (see ``sky.maps.Grid``); and its height in units of
    the view box, which is WIDTH wide."""

    west: float
    south: float
    east: float
    north: float
    height: int

    @property
    def view(self) -> Array:
        """[west, north] and units for a degree east and south."""
        return np.array([WIDTH / (self.east - self.west), self.height / (self.north - self.south)])

    def at(self, points: Array) -> Array:
        """Longitudes and latitudes [point, 2] as units, to a tenth."""
        placed: Array = np.round((points - [self.west, self.north]) * self.view * [1, -1], 1)
        return placed

    def holds(self, longitude_deg: float, latitude_deg: float) -> bool:
        return self.west <= longitude_deg <= self.east and self.south <= latitude_deg <= self.north


def _steps(points: Array) -> str:
    """A path through points in units: the first as it is, the others from the one before, in tenths."""
    tenths = np.round(points * 10).astype(np.int64)
    keep = np.concatenate([[True], (np.diff(tenths, axis=0) != 0).any(axis=1)])
    tenths = tenths[keep]
    steps = " ".join(f"{_tenth(x)} {_tenth(y)}" for x, y in np.diff(tenths, axis=0).tolist())
    x, y = tenths[0].tolist()
    return f"M{_tenth(x)} {_tenth(y)}l{steps}" if steps else ""


def _tenth(value: int) -> str:
    return f"{value / 10:g}"


def open_path(points: Array) -> str:
    return _steps(points)


def closed_path(points: Array) -> str:
    drawn = _steps(points[:-1])
    return drawn and drawn + "z"


@cache
def coast_path(box: Box) -> str:
    """The outlines of land inside the box."""
    return outline_path(land(), box)


def outline_path(shape: Outline, box: Box) -> str:
    finest = 1.5 / float(box.view.max())
    parts = []
    for turn in (-360.0, 0.0, 360.0):
        for polygon in shape.polygons:
            for ring in polygon:
                moved = ring + np.array([turn, 0.0])
                low, high = moved.min(axis=0), moved.max(axis=0)
                if low[0] > box.east or high[0] < box.west or low[1] > box.north or high[1] < box.south:
                    continue
                cut = _clipped(_simplified(moved, finest), box)
                if len(cut) > 3:
                    parts.append(closed_path(box.at(cut)))
    return "".join(parts)


def _simplified(ring: Array, finest: float) -> Array:
    """A closed ring without the points that lie within ``finest`` of the line through those kept (Douglas, Peucker)."""
    keep = np.zeros(len(ring), dtype=bool)
    far = int(np.argmax(((ring - ring[0]) ** 2).sum(axis=1)))
    keep[[0, far, -1]] = True
    spans = [(0, far), (far, len(ring) - 1)]
    while spans:
        first, last = spans.pop()
        if last - first < 2:
            continue
        along = ring[last] - ring[first]
        off = ring[first + 1:last] - ring[first]
        length = float(np.hypot(*along))
        away = np.abs(along[0] * off[:, 1] - along[1] * off[:, 0]) / length if length else np.hypot(*off.T)
        at = int(np.argmax(away))
        if away[at] > finest:
            middle = first + 1 + at
            keep[middle] = True
            spans += [(first, middle), (middle, last)]
    kept: Array = ring[keep]
    return kept


def _clipped(ring: Array, box: Box) -> Array:
    """What of a closed ring lies inside the box, closed along its edges (Sutherland, Hodgman)."""
    for axis, edge, side in ((0, box.west, 1), (0, box.east, -1), (1, box.south, 1), (1, box.north, -1)):
        inside = side * (ring[:, axis] - edge) >= 0
        if inside.all() or not len(ring):
            continue
        out: list[Array] = []
        for a, b, a_in, b_in in zip(ring[:-1], ring[1:], inside[:-1], inside[1:], strict=True):
            if a_in:
                out.append(a)
            if a_in != b_in:
                cut = a + (b - a) * (edge - a[axis]) / (b[axis] - a[axis])
                cut[axis] = edge
                out.append(cut)
        ring = np.array([*out, out[0]]) if out else np.zeros((0, 2))
    return ring


__all__ = ["WIDTH", "Box", "closed_path", "coast_path", "open_path", "outline_path"]
