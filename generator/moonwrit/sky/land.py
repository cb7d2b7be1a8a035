"""Outlines on the Earth: land (Natural Earth) and the regions of a community, and which points lie inside.

The land outlines are Natural Earth 4.1.0 at 1:110 million (public domain), by way of the npm package
world-atlas 2.0.2 (ISC), as GeoJSON rounded to 0.01 degree.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
import numpy.typing as npt

from moonwrit.sky.ephemeris import Array

_HALVINGS = 8


@dataclass(frozen=True, slots=True)
class Outline:
    """Polygons: each a list of rings [vertex, (longitude, latitude)] in degrees, the outer ring first."""

    polygons: tuple[tuple[Array, ...], ...]

    def contains(self, longitude_deg: Array, latitude_deg: Array) -> npt.NDArray[np.bool_]:
        """Which points lie inside; any shape. Even-odd rule, straight edges in longitude and latitude."""
        inside = np.zeros(np.broadcast(longitude_deg, latitude_deg).shape, dtype=bool)
        for polygon in self.polygons:
            for ring in polygon:
                inside ^= _in_ring(ring, longitude_deg, latitude_deg)
        return inside

    def holding(self, *points: tuple[float, float]) -> Outline:
        """The polygons that hold one of the points (longitude, latitude)."""
        return Outline(tuple(
            polygon for polygon in self.polygons
            if any(Outline((polygon,)).contains(np.array(lon), np.array(lat)) for lon, lat in points)
        ))

    def bounds(self) -> tuple[float, float, float, float]:
        """West, south, east, north."""
        outer = np.concatenate([polygon[0] for polygon in self.polygons])
        west, south = outer.min(axis=0)
        east, north = outer.max(axis=0)
        return float(west), float(south), float(east), float(north)

    def grid(self, step_deg: float) -> tuple[Array, Array]:
        """Longitudes and latitudes [point] of a square grid inside, ``step_deg`` apart; closer where the outline
        is too small to hold a point of it, down to one of its own points where it is next to nothing."""
        west, south, east, north = self.bounds()
        for _ in range(_HALVINGS):
            longitude, latitude = np.meshgrid(
                np.arange(np.floor(west / step_deg) + 0.5, np.ceil(east / step_deg)) * step_deg,
                np.arange(np.floor(south / step_deg) + 0.5, np.ceil(north / step_deg)) * step_deg,
            )
            inside = self.contains(longitude, latitude)
            if inside.any():
                return longitude[inside], latitude[inside]
            step_deg /= 2
        point = self.polygons[0][0][:1]
        return point[:, 0], point[:, 1]

    def grid_of_each(self, step_deg: float) -> tuple[Array, Array]:
        """As ``grid``, with at least one point in every polygon, however small."""
        parts = [Outline((polygon,)).grid(step_deg) for polygon in self.polygons]
        return np.concatenate([part[0] for part in parts]), np.concatenate([part[1] for part in parts])


def _in_ring(ring: Array, longitude_deg: Array, latitude_deg: Array) -> npt.NDArray[np.bool_]:
    x1, y1 = ring[:-1, 0], ring[:-1, 1]
    x2, y2 = ring[1:, 0], ring[1:, 1]
    x, y = np.asarray(longitude_deg)[..., None], np.asarray(latitude_deg)[..., None]
    spans = (y1 > y) != (y2 > y)
    with np.errstate(divide="ignore", invalid="ignore"):
        crossing_x = x1 + (y - y1) * (x2 - x1) / (y2 - y1)
    odd: npt.NDArray[np.bool_] = np.count_nonzero(spans & (x < crossing_x), axis=-1) % 2 == 1
    return odd


def outline(geometry: dict[str, object]) -> Outline:
    """From a GeoJSON Polygon or MultiPolygon geometry (RFC 7946). Raises ValueError for anything else."""
    kind, coordinates = geometry.get("type"), geometry.get("coordinates")
    if kind == "Polygon":
        coordinates = [coordinates]
    elif kind != "MultiPolygon":
        raise ValueError(f"a Polygon or MultiPolygon is needed, not {kind}")
    assert isinstance(coordinates, list)
    return Outline(tuple(
        tuple(np.array([position[:2] for position in ring], dtype=np.float64) for ring in polygon)
        for polygon in coordinates
    ))


@cache
def land() -> Outline:
    """All land of Natural Earth at 1:110 million."""
    text = files("moonwrit.sky").joinpath("data/land-110m.geojson").read_text(encoding="utf-8")
    return outline(json.loads(text)["features"][0]["geometry"])


@cache
def american_mainland() -> Outline:
    """North and South America without their islands."""
    return land().holding((-100.0, 40.0), (-60.0, -10.0))
