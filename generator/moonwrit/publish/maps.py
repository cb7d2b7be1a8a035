"""Maps of one evening: where the policy's test is met, over the Earth and around the region.

Plate carrée, west to the left in every language. What a surface means is said by its pattern as well as its tint:
tinted where the test is met, plain where it is not, dotted where it was close, hatched where the Moon sets first or the
Sun does not set. The maps begin and end where the date does, so that no line has to be carried across.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from functools import cache, cached_property
from html import escape
from math import ceil, cos, floor, radians

import contourpy
import numpy as np

from moonwrit.almanac import Almanac
from moonwrit.content.models import in_language
from moonwrit.policy import NamedPlace
from moonwrit.policy.conditions import CLOSE_SHARE
from moonwrit.policy.everywhere import Asked, asked_everywhere
from moonwrit.policy.scopes import MAX_LATITUDE_DEG
from moonwrit.publish.language import Language
from moonwrit.sky import Array
from moonwrit.sky.horizon import reckoned_longitude_deg
from moonwrit.sky.land import Outline, land, outline
from moonwrit.sky.maps import Grid

STEP_DEG = 3.0
"""Of the grid that is drawn: between its points shares are straight to a few thousandths."""
WIDTH = 720
LETTER = 24.0
"""The largest size of letters (``.map text``), on narrow screens; labels are placed to be clear of each other then."""
_AHEAD = 1e3
_LEAST_SPAN_DEG = 16.0
"""A region's map is at least so high."""
_MOST_LATITUDE_DEG = 84.0


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


@dataclass(frozen=True, slots=True)
class Spot:
    """A place on the map, at its reckoned longitude."""

    name: str
    longitude_deg: float
    latitude_deg: float
    met: bool


class Chart:
    """The maps of one evening, drawn once for all languages."""

    def __init__(self, on: date, asked: Asked, places: Sequence[NamedPlace], outlined: Outline | None = None) -> None:
        self.on = on
        self.asked = asked
        known: dict[tuple[float, float], NamedPlace] = {}
        for place in (*places, *asked.named_places()):
            known.setdefault((place.latitude_deg, place.longitude_deg), place)
        self.of_region = len({(place.latitude_deg, place.longitude_deg) for place in places})
        found = asked.met(list(known.values()))
        self.spots = tuple(
            Spot(place.name, reckoned_longitude_deg(place.zone, place.longitude_deg, on.toordinal()),
                 place.latitude_deg, bool(met))
            for place, met in zip(known.values(), found, strict=True)
        )
        self.outlined = outlined

    @cached_property
    def world(self) -> _Surface:
        east = max(180.0, *(10.0 * ceil(spot.longitude_deg / 10) + 10 for spot in self.spots if spot.longitude_deg > 180), 0)
        west = min(-180.0, *(10.0 * floor(spot.longitude_deg / 10) - 10 for spot in self.spots if spot.longitude_deg < -180), 0)
        west = east - 360 if east > 180 else west
        furthest = max(abs(spot.latitude_deg) for spot in self.spots)
        end = min(_MOST_LATITUDE_DEG, max(MAX_LATITUDE_DEG, 4.0 * ceil(furthest / 4) + 4))
        box = Box(west, -end, west + 360, end, round(WIDTH * end / 180))
        return _Surface(box, self.asked, STEP_DEG)

    @cached_property
    def region(self) -> _Surface:
        around = self.spots[:self.of_region]
        points = [(spot.longitude_deg, spot.latitude_deg) for spot in around]
        if self.outlined is not None:
            west, south, east, north = self.outlined.bounds()
            points += [(west, south), (east, north)]
        longitudes, latitudes = zip(*points, strict=True)
        middle, centre = (max(longitudes) + min(longitudes)) / 2, (max(latitudes) + min(latitudes)) / 2
        shrink = max(0.3, cos(radians(centre)))
        wide, high = 1.4 * (max(longitudes) - min(longitudes)), 1.4 * (max(latitudes) - min(latitudes))
        # Twice as wide as high on the ground, unless the region is taller.
        high = max(high, _LEAST_SPAN_DEG, wide * shrink / 2)
        wide = max(wide, min(2 * high, 80.0) / shrink)
        south, north = max(-_MOST_LATITUDE_DEG, centre - high / 2), min(_MOST_LATITUDE_DEG, centre + high / 2)
        west, east = max(-220.0, middle - wide / 2), min(220.0, middle + wide / 2)
        box = Box(west, south, east, north, round(WIDTH * (north - south) / ((east - west) * shrink)))
        return _Surface(box, self.asked, max(east - west, north - south) / 24)

    @cached_property
    def share_met(self) -> float:
        """The part of the Earth between the map's parallels where the test is met, by area."""
        surface = self.world
        weights = np.broadcast_to(np.cos(np.radians(surface.grid.latitude_deg))[:, None], surface.share.shape)
        return float((weights * surface.met).sum() / weights.sum())

    @cached_property
    def first_met(self) -> tuple[float, float] | None:
        """Latitude and longitude near which the evening, going westward, first meets the test."""
        surface = self.world
        columns = np.flatnonzero(surface.met.any(axis=0))
        if not len(columns):
            return None
        column = int(columns[-1])
        row = int(np.nanargmax(np.where(surface.met[:, column], surface.share[:, column], np.nan)))
        return float(surface.grid.latitude_deg[row]), float(surface.grid.longitude_deg[column])


def charts(almanac: Almanac) -> dict[date, Chart]:
    """A chart for the 29th evening before each month; none where the policy does not ask the sky itself."""
    places = [
        NamedPlace(in_language(place.name, almanac.site.language), place.latitude, place.longitude, place.elevation,
                   place.zone)
        for place in almanac.places.values()
    ]
    months = list(almanac.months)
    return {
        month.evidence.evening: Chart(month.evidence.evening, asked, places)
        for month, asked in zip(months, asked_everywhere(almanac.method, months), strict=False)
    }


# --- surfaces -----------------------------------------------------------------------------------------


class _Surface:
    """What the test finds in a box, and what is drawn of it: the same in every language."""

    def __init__(self, box: Box, asked: Asked, step_deg: float) -> None:
        self.box = box
        self.grid = Grid.over(box.west, box.south, box.east, box.north, step_deg)
        self.share, lag = asked.over(self.grid)
        self.lag_days = np.clip(np.nan_to_num(lag, nan=-1440.0, posinf=1440.0, neginf=-1440.0) / 52, -1, 1)

    @property
    def met(self) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
        return np.nan_to_num(self.share, nan=-1.0) >= 0

    @cached_property
    def layers(self) -> Mapping[str, str]:
        """Paths by kind."""
        share = np.nan_to_num(self.share, nan=-1.0)
        # The Moon sets first, and the test is not even nearly met.
        first = np.minimum(-self.lag_days, -CLOSE_SHARE - share)
        lines = self._contours(share).lines(0.0)
        return {
            "met": self._filled(share, 0.0, _AHEAD),
            "near": self._filled(share, -CLOSE_SHARE, CLOSE_SHARE),
            "first": self._filled(first, 0.0, _AHEAD),
            "limit": "".join(_open(self.box.at(line)) for line in lines),
        }

    def _contours(self, values: Array) -> contourpy.ContourGenerator:
        return contourpy.contour_generator(
            self.grid.longitude_deg, self.grid.latitude_deg, values,
            fill_type=contourpy.FillType.OuterOffset, line_type=contourpy.LineType.Separate,
        )

    def _filled(self, values: Array, low: float, high: float) -> str:
        polygons, offsets = self._contours(values).filled(low, high)
        return "".join(
            _closed(self.box.at(points[first:end]))
            for points, starts in zip(polygons, offsets, strict=True)
            for first, end in zip(starts[:-1], starts[1:], strict=True)
        )


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


def _open(points: Array) -> str:
    return _steps(points)


def _closed(points: Array) -> str:
    drawn = _steps(points[:-1])
    return drawn and drawn + "z"


# --- land ---------------------------------------------------------------------------------------------


@cache
def _coast(box: Box) -> str:
    """The outlines of land inside the box."""
    return _outlines(land(), box)


def _outlines(shape: Outline, box: Box) -> str:
    finest = 1.5 / float(box.view.max())
    parts = []
    for turn in (-360.0, 0.0, 360.0):
        for polygon in shape.polygons:
            for ring in polygon:
                moved = ring + [turn, 0.0]
                low, high = moved.min(axis=0), moved.max(axis=0)
                if low[0] > box.east or high[0] < box.west or low[1] > box.north or high[1] < box.south:
                    continue
                cut = _clipped(_simplified(moved, finest), box)
                if len(cut) > 3:
                    parts.append(_closed(box.at(cut)))
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


# --- pictures -----------------------------------------------------------------------------------------


def world_map(chart: Chart, language: Language) -> str:
    """The Earth between two parallels, from the date line to the date line."""
    _ = language.gettext
    title = _("Where on Earth the policy's test is met on the evening of %(date)s") % {
        "date": language.long_date(chart.on)
    }
    return _drawn(chart, chart.world, title, "world", language, 30)


def region_map(chart: Chart, language: Language) -> str:
    """The places of the region and what is around them."""
    _ = language.gettext
    title = _("Where around the region the policy's test is met on the evening of %(date)s") % {
        "date": language.long_date(chart.on)
    }
    return _drawn(chart, chart.region, title, "region", language, 5)


def told(chart: Chart, language: Language) -> list[str]:
    """What the map of the Earth shows, in sentences."""
    _ = language.gettext
    box = chart.world.box
    between = {"south": parallel(box.south, language), "north": parallel(box.north, language)}
    if chart.first_met is None:
        out = [_("The test is met nowhere between %(south)s and %(north)s.") % between]
    else:
        latitude, longitude = chart.first_met
        out = [
            _("The test is met over %(share)s%% of the Earth between %(south)s and %(north)s.") % {
                "share": language.number(chart.share_met * 100, 0), **between
            },
            _("Going west with the evening, it is first met near %(latitude)s, %(longitude)s.") % {
                "latitude": parallel(latitude, language), "longitude": meridian(longitude, language),
            },
        ]
    for met, sentence in ((True, _("It is met at: %(places)s.")), (False, _("It is not met at: %(places)s."))):
        if names := [language.name(spot.name) for spot in chart.spots if spot.met == met]:
            out.append(sentence % {"places": language.listing(names)})
    return out


def parallel(latitude_deg: float, language: Language) -> str:
    _ = language.gettext
    degrees = {"degrees": language.number(abs(latitude_deg), 0)}
    if round(latitude_deg) == 0:
        return _("the equator")
    return (_("%(degrees)s° N") if latitude_deg > 0 else _("%(degrees)s° S")) % degrees


def meridian(longitude_deg: float, language: Language) -> str:
    _ = language.gettext
    east = round((longitude_deg + 180) % 360 - 180)
    degrees = {"degrees": language.number(abs(east), 0)}
    return (_("%(degrees)s° E") if east >= 0 else _("%(degrees)s° W")) % degrees


def key(language: Language) -> list[tuple[str, str]]:
    """Swatches and what they mean; they use the patterns of the map of the Earth on the same page."""
    _ = language.gettext
    surfaces = (
        (("met",), _("met")), (("met", "near"), _("met, close to the limit")),
        (("near",), _("not met, close to the limit")), ((), _("not met")),
        (("first",), _("not met, and the Moon sets before the Sun or the Sun does not set")),
    )
    swatches = [
        ("".join(_surface(kind, "M0 0h32v18h-32z", "world") for kind in kinds), name) for kinds, name in surfaces
    ]
    swatches += [
        (_spot(16, 9, True), _("a place where it is met")), (_spot(16, 9, False), _("a place where it is not met")),
    ]
    return [
        (f'<svg class="map swatch" aria-hidden="true" viewBox="0 0 32 18">{drawn}</svg>', name)
        for drawn, name in swatches
    ]


def _surface(kind: str, path: str, of: str) -> str:
    fill = {"near": f' fill="url(#{of}-dots)"', "first": f' fill="url(#{of}-hatch)"'}.get(kind, "")
    return f'<path class="{kind}"{fill} fill-rule="evenodd" d="{path}"/>' if path else ""


def _spot(x: float, y: float, met: bool) -> str:
    return f'<circle class="spot {"met" if met else "unmet"}" cx="{x:g}" cy="{y:g}" r="6"/>'


def _patterns(of: str) -> str:
    return (
        f'<defs><pattern id="{of}-dots" width="9" height="9" patternUnits="userSpaceOnUse">'
        '<circle class="dot" cx="2.25" cy="2.25" r="1.3"/><circle class="dot" cx="6.75" cy="6.75" r="1.3"/></pattern>'
        f'<pattern id="{of}-hatch" width="8" height="8" patternUnits="userSpaceOnUse">'
        '<path class="hatch" d="M-2 2l4-4M0 8l8-8M6 10l4-4"/></pattern></defs>'
    )


def _drawn(chart: Chart, surface: _Surface, title: str, kind: str, language: Language, step: int) -> str:
    box = surface.box
    layers = surface.layers
    parts = [
        _patterns(kind),
        *(_surface(name, layers[name], kind) for name in ("first", "met", "near")),
        _graticule(box, step),
        f'<path class="land" d="{_coast(box)}"/>',
    ]
    if layers["limit"]:
        parts.append(f'<path class="limit" d="{layers["limit"]}"/>')
    if chart.outlined is not None:
        parts.append(f'<path class="outlined" d="{_outlines(chart.outlined, box)}"/>')
    parts += _named(chart.spots, box, language)
    parts.append(f'<path class="frame" d="M0 0h{WIDTH}v{box.height}h-{WIDTH}z"/>')
    text = " ".join(told(chart, language))
    return (
        f'<svg class="picture map {kind}" role="img" viewBox="0 0 {WIDTH} {box.height}">'
        f"<title>{escape(title)}</title><desc>{escape(text)}</desc>{''.join(parts)}</svg>"
    )


def _graticule(box: Box, step: int) -> str:
    x_of, y_of = box.view
    lines = [
        f"M{(longitude - box.west) * x_of:.1f} 0v{box.height}"
        for longitude in range(ceil((box.west + 1e-6) / step) * step, ceil(box.east), step)
    ]
    lines += [
        f"M0 {(box.north - latitude) * y_of:.1f}h{WIDTH}"
        for latitude in range(ceil((box.south + 1e-6) / step) * step, ceil(box.north), step)
    ]
    return f'<path class="grid" d="{"".join(lines)}"/>'


def _named(spots: Iterable[Spot], box: Box, language: Language) -> list[str]:
    """Places with their names, where there is room for these: beside, above or below, clear of all others."""
    at = [
        (spot, *box.at(np.array([spot.longitude_deg, spot.latitude_deg])).tolist())
        for spot in spots if box.holds(spot.longitude_deg, spot.latitude_deg)
    ]
    taken = [(x - 8, y - 8, x + 8, y + 8) for _, x, y in at]
    out = [_spot(x, y, spot.met) for spot, x, y in at]
    for spot, x, y in at:
        name = language.name(spot.name)
        wide = 0.6 * LETTER * len(name)
        for anchor, to_x, to_y in (
            ("start", x + 11, y + 8), ("end", x - 11, y + 8), ("middle", x, y - 12), ("middle", x, y + 28),
        ):
            left = {"start": to_x, "middle": to_x - wide / 2, "end": to_x - wide}[anchor]
            here = (left, to_y - 0.8 * LETTER, left + wide, to_y + 0.2 * LETTER)
            inside = here[0] >= 2 and here[1] >= 2 and here[2] <= WIDTH - 2 and here[3] <= box.height - 2
            if inside and not any(_overlap(here, other) for other in taken):
                taken.append(here)
                out.append(
                    f'<text class="name" x="{to_x:.1f}" y="{to_y:.1f}" text-anchor="{anchor}" paint-order="stroke">'
                    f"{escape(name)}</text>"
                )
                break
    return out


def _overlap(a: tuple[float, ...], b: tuple[float, ...]) -> bool:
    return a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]
