"""Outlines of regions: GeoJSON (RFC 7946) that holds polygons, and nothing else."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from moonwrit.content.outlines import MAX_BYTES, read_outline
from moonwrit.errors import ContentError

RING: list[list[float]] = [[144, -39], [146, -39], [146.5, -38], [144, -39]]
AS_READ = ((144.0, -39.0), (146.0, -39.0), (146.5, -38.0), (144.0, -39.0))
POLYGON: dict[str, Any] = {"type": "Polygon", "coordinates": [RING]}


def outline(folder: Path, value: Any) -> Any:
    file = folder / "bay.geojson"
    file.write_text(value if isinstance(value, str) else json.dumps(value), encoding="utf-8")
    return read_outline(file)


@pytest.mark.parametrize(
    ("value", "polygons"),
    [
        (POLYGON, 1),
        ({"type": "MultiPolygon", "coordinates": [[RING], [RING]]}, 2),
        ({"type": "Feature", "properties": {"name": "Bay"}, "geometry": POLYGON}, 1),
        ({"type": "FeatureCollection", "features": [{"type": "Feature", "geometry": POLYGON}] * 3}, 3),
        # A third coordinate is a height, and of no use here.
        ({"type": "Polygon", "coordinates": [[[*point, 12] for point in RING]]}, 1),
    ],
)
def test_polygons_are_read(tmp_path: Path, value: Any, polygons: int) -> None:
    assert outline(tmp_path, value) == ((AS_READ,),) * polygons


def test_holes_follow_the_outer_ring(tmp_path: Path) -> None:
    assert outline(tmp_path, {"type": "Polygon", "coordinates": [RING, RING[::-1]]}) == ((AS_READ, AS_READ[::-1]),)


@pytest.mark.parametrize(
    ("value", "said"),
    [
        ({"type": "Point", "coordinates": [0, 0]}, ': "Point" is not an outline; keep nothing but polygons in it'),
        ([1], ": this is not GeoJSON; keep nothing but polygons in it"),
        ({"type": "Feature", "geometry": None}, ": this is not GeoJSON; keep nothing but polygons in it"),
        ({"type": "Polygon", "coordinates": 3}, ': "Polygon" is not an outline; keep nothing but polygons in it'),
        (
            {"type": "FeatureCollection", "features": []},
            ": there is no polygon in it; export the outline as a Polygon",
        ),
        (
            {"type": "Polygon", "coordinates": [RING, RING[:3]]},
            ": ring 2 of polygon 1 is not closed; give at least three points, and the first again at the end",
        ),
        (
            # Latitude first is the usual mistake.
            {"type": "Polygon", "coordinates": [[point[::-1] for point in RING]]},
            ": ring 1 of polygon 1 has a point that is not on the Earth; "
            "give longitude from -180 to 180 and latitude from -90 to 90, in this order",
        ),
        (
            {"type": "Polygon", "coordinates": [[[float("nan"), 0]] * 4]},
            ": ring 1 of polygon 1 has a point that is not on the Earth; "
            "give longitude from -180 to 180 and latitude from -90 to 90, in this order",
        ),
        (
            {"type": "Polygon", "coordinates": [[["144", "-39"]] * 4]},
            ": ring 1 of polygon 1 has a point that is not on the Earth; "
            "give longitude from -180 to 180 and latitude from -90 to 90, in this order",
        ),
        ('{"type":\n"Polygon"', ":2: this is not JSON (Expecting ',' delimiter); export it again"),
        ("[" * 100_000, ": this is not GeoJSON; export it again as GeoJSON, in UTF-8"),
        (" " * (MAX_BYTES + 1), ": the outline is larger than 8 MB; simplify it"),
    ],
    ids=lambda value: value[:60] if isinstance(value, str) else None,
)
def test_what_is_refused(tmp_path: Path, value: Any, said: str) -> None:
    with pytest.raises(ContentError) as caught:
        outline(tmp_path, value)
    assert str(caught.value) == f"{tmp_path}/bay.geojson{said}"


@pytest.mark.parametrize(
    ("ring", "what"),
    [
        # A bow tie: its two long sides cross in the middle.
        ([[0, 0], [10, 10], [10, 0], [0, 10], [0, 0]], "crosses itself near"),
        # A spike that comes back onto another side.
        ([[0, 0], [10, 0], [10, 10], [5, -1], [0, 10], [0, 0]], "crosses itself near"),
        # Fiji drawn the short way round on the map, the long way round in numbers.
        ([[177, -19], [-178, -19], [-178, -16], [177, -16], [177, -19]], "crosses the antimeridian"),
    ],
)
def test_a_ring_that_is_no_outline_is_refused(tmp_path: Path, ring: list[list[float]], what: str) -> None:
    file = tmp_path / "outline.geojson"
    file.write_text(json.dumps({"type": "Polygon", "coordinates": [ring]}), encoding="utf-8")
    with pytest.raises(ContentError, match=what):
        read_outline(file)


def test_a_long_coast_is_taken(tmp_path: Path) -> None:
    """Thousands of sides that only meet at their ends: a star-shaped coast, checked in reasonable time."""
    import math

    points = [
        [(20 + 5 * (i % 2)) * math.cos(i * math.pi / 2000), (20 + 5 * (i % 2)) * math.sin(i * math.pi / 2000)]
        for i in range(4000)
    ]
    file = tmp_path / "outline.geojson"
    file.write_text(json.dumps({"type": "Polygon", "coordinates": [[*points, points[0]]]}), encoding="utf-8")
    assert len(read_outline(file)[0][0]) == 4001
