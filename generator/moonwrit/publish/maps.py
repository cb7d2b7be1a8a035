"""Maps of one evening: where the policy's test is met, over the Earth and around the region.

Plate carrée, west to the left in every language. What a surface means is said by its pattern as well as its tint:
tinted where the test is met, plain where it is not, dotted where it was close, hatched where the Moon sets first or the
Sun does not set. The maps begin and end where the date does, so that no line has to be carried across.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import date
from functools import cached_property
from html import escape
from itertools import pairwise
from math import ceil, cos, floor, radians
from typing import cast

import contourpy
import numpy as np
import numpy.typing as npt

from moonwrit.almanac import Almanac
from moonwrit.content.models import in_language
from moonwrit.policy import Month, NamedPlace
from moonwrit.policy.conditions import CLOSE_SHARE
from moonwrit.policy.everywhere import Asked, asked_everywhere
from moonwrit.policy.scopes import MAX_LATITUDE_DEG
from moonwrit.publish.language import Language
from moonwrit.publish.plate import WIDTH, Box, closed_path, coast_path, open_path, outline_path
from moonwrit.sky import Array
from moonwrit.sky.horizon import reckoned_longitude_deg
from moonwrit.sky.land import Outline, outline
from moonwrit.sky.maps import Grid

STEP_DEG = 3.0
"""Of the grid that is drawn: between its points shares are straight to a few thousandths."""
LETTER = 24.0
"""The largest size of letters (``.map text``), on narrow screens; labels are placed to be clear of each other then."""
_AHEAD = 1e3
_LEAST_SPAN_DEG = 16.0
"""A region's map is at least so high."""
_MOST_LATITUDE_DEG = 84.0


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
        # Where places keep the date of the other side of the date line, the map is moved to hold them.
        longitudes = [spot.longitude_deg for spot in self.spots]
        west, east = min(longitudes), max(longitudes)
        if east > 180:
            west = 10.0 * ceil(east / 10) + 10 - 360
        else:
            west = 10.0 * floor(west / 10) - 10 if west < -180 else -180.0
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


class Charts:
    """A chart for the 29th evening before each month of a calendar, made when it is asked for."""

    def __init__(self, almanac: Almanac) -> None:
        self.method, self._months = almanac.method, almanac.months
        self.places = tuple(
            NamedPlace.of(in_language(place.name, almanac.site.language), place) for place in almanac.places.values()
        )
        self.outlined: Outline | None = None
        if almanac.outline:
            self.outlined = outline({"type": "MultiPolygon", "coordinates": list(almanac.outline)})
        self._years: dict[int, list[Asked]] = {}
        self._made: dict[int, Chart] = {}

    def of(self, index: int) -> Charted | None:
        """Of the month with this index; None where the policy does not ask the sky itself."""
        return Charted(self, index, self._months[index]) if self.method.eras else None

    def made(self, index: int) -> Chart:
        if index not in self._made:
            on = self._months[index].evidence.evening
            self._made[index] = Chart(on, self._asked(index), self.places, self.outlined)
        return self._made[index]

    def _asked(self, index: int) -> Asked:
        """Twelve are asked together, which is faster; always the same twelve, so that the bytes are the same."""
        year, month = divmod(index, 12)
        if year not in self._years:
            self._years[year] = asked_everywhere(self.method, list(self._months[year * 12:year * 12 + 12]))
        return self._years[year][month]


@dataclass(frozen=True, slots=True)
class Charted:
    """A chart to be: all that it hangs on."""

    charts: Charts
    index: int
    month: Month

    @property
    def digested(self) -> object:
        charts = self.charts
        return (charts.method.eras, charts.places, charts.outlined, self.month.ordinal, self.month.evidence.evening)

    @property
    def chart(self) -> Chart:
        return self.charts.made(self.index)


# --- surfaces -----------------------------------------------------------------------------------------


class _Surface:
    """What the test finds in a box, and what is drawn of it: the same in every language."""

    def __init__(self, box: Box, asked: Asked, step_deg: float) -> None:
        self.box = box
        self.grid = Grid.over(box.west, box.south, box.east, box.north, step_deg)
        self.share, lag = asked.over(self.grid)
        self.lag_days = np.clip(np.nan_to_num(lag, nan=-1440.0, posinf=1440.0, neginf=-1440.0) / 52, -1, 1)

    @property
    def met(self) -> npt.NDArray[np.bool_]:
        return np.nan_to_num(self.share, nan=-1.0) >= 0

    @cached_property
    def layers(self) -> Mapping[str, str]:
        """Paths by kind."""
        share = np.nan_to_num(self.share, nan=-1.0)
        # The Moon sets first, and the test is not even nearly met.
        first = np.minimum(-self.lag_days, -CLOSE_SHARE - share)
        lines = cast("list[Array]", self._contours(share).lines(0.0))
        return {
            "met": self._filled(share, 0.0, _AHEAD),
            "close": self._filled(share, -CLOSE_SHARE, CLOSE_SHARE),
            "first": self._filled(first, 0.0, _AHEAD),
            "limit": "".join(open_path(self.box.at(line)) for line in lines),
        }

    def _contours(self, values: Array) -> contourpy.ContourGenerator:
        return contourpy.contour_generator(
            self.grid.longitude_deg, self.grid.latitude_deg, values,
            fill_type=contourpy.FillType.OuterOffset, line_type=contourpy.LineType.Separate,
        )

    def _filled(self, values: Array, low: float, high: float) -> str:
        found = self._contours(values).filled(low, high)
        polygons, offsets = cast("tuple[list[Array], list[npt.NDArray[np.uint32]]]", found)
        return "".join(
            closed_path(self.box.at(points[first:end]))
            for points, starts in zip(polygons, offsets, strict=True)
            for first, end in pairwise(starts.tolist())
        )


# --- pictures -----------------------------------------------------------------------------------------


def world_map(chart: Chart, language: Language, region: str) -> str:
    """The Earth between two parallels, from the date line to the date line. ``region`` is the region's name."""
    _ = language.gettext
    title = _("Where on Earth the policy's test is met on the evening of %(date)s") % {
        "date": language.long_date(chart.on)
    }
    spots = chart.spots
    near = spots[:chart.of_region]
    x_of, y_of = chart.world.box.view
    if len(near) > 1 and all(
        abs(spot.longitude_deg - near[0].longitude_deg) * x_of < 4 * LETTER
        and abs(spot.latitude_deg - near[0].latitude_deg) * y_of < 4 * LETTER for spot in near
    ):
        # Places that lie together go by the region's name.
        spots = (replace(near[0], name=region), *(replace(spot, name="") for spot in near[1:]), *spots[len(near):])
    return _drawn(chart, chart.world, title, "world", language, 30, _named(spots, chart.world.box, language, ()))


def region_map(chart: Chart, language: Language) -> str:
    """The places of the region and what is around them."""
    _ = language.gettext
    title = _("Where around the region the policy's test is met on the evening of %(date)s") % {
        "date": language.long_date(chart.on)
    }
    box = chart.region.box
    step = next(step for step in (1, 2, 5, 10, 20) if (box.north - box.south) / step < 7 or step == 20)
    ticks = _ticks(box, step, language)
    return _drawn(chart, chart.region, title, "region", language, step, _named(chart.spots, box, language, ticks))


def told(chart: Chart, language: Language) -> list[str]:
    """What the map of the Earth shows, in sentences."""
    _ = language.gettext
    box = chart.world.box
    between = {"south": parallel(box.south, language), "north": parallel(box.north, language)}
    share = {"share": language.number(chart.share_met * 100, 0), **between}
    if chart.first_met is None:
        out = [_("The test is met nowhere between %(south)s and %(north)s.") % between]
    else:
        latitude, longitude = chart.first_met
        out = [_("The test is met over %(share)s%% of the Earth between %(south)s and %(north)s.") % share]
        if longitude == box.east:
            out.append(_("It is met from the date line on, where the evening begins."))
        else:
            out.append(_("Going west with the evening, it is first met near %(latitude)s, %(longitude)s.") % {
                "latitude": parallel(latitude, language), "longitude": meridian(longitude, language),
            })
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
    whole, half = "M0 0h32v18h-32z", "M0 0h16v18h-16z"
    swatches = [
        (_surface("met", whole, "world"), _("met")),
        (_surface("met", half, "world") + _surface("close", whole, "world") + '<path class="limit" d="M16 0v18"/>',
         _("close to the limit, on either side of it")),
        ("", _("not met")),
        (_surface("first", whole, "world"), _("not met: the Moon sets before the Sun, or the Sun does not set")),
        (_spot(16, 9, True), _("a place where it is met")), (_spot(16, 9, False), _("a place where it is not met")),
    ]
    return [
        (f'<svg class="map swatch" aria-hidden="true" viewBox="0 0 32 18">{drawn}</svg>', name)
        for drawn, name in swatches
    ]


def _surface(kind: str, path: str, of: str) -> str:
    fill = {"close": f' fill="url(#{of}-dots)"', "first": f' fill="url(#{of}-hatch)"'}.get(kind, "")
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


def _drawn(
    chart: Chart, surface: _Surface, title: str, kind: str, language: Language, step: int, over: Sequence[str]
) -> str:
    box = surface.box
    layers = surface.layers
    parts = [
        _patterns(kind),
        *(_surface(name, layers[name], kind) for name in ("first", "met", "close")),
        _graticule(box, step),
        f'<path class="land" d="{coast_path(box)}"/>',
    ]
    if layers["limit"]:
        parts.append(f'<path class="limit" d="{layers["limit"]}"/>')
    if chart.outlined is not None:
        parts.append(f'<path class="outlined" d="{outline_path(chart.outlined, box)}"/>')
    parts += over
    parts.append(f'<path class="frame" d="M0 0h{WIDTH}v{box.height}h-{WIDTH}z"/>')
    text = " ".join(told(chart, language))
    return (
        f'<svg class="picture map {kind}" role="img" viewBox="0 0 {WIDTH} {box.height}">'
        f"<title>{escape(title)}</title><desc>{escape(text)}</desc>{''.join(parts)}</svg>"
    )


def _graticule(box: Box, step: int) -> str:
    lines = [f"M{x:.1f} 0v{box.height}" for x, _ in _meridians(box, step)]
    lines += [f"M0 {y:.1f}h{WIDTH}" for y, _ in _parallels(box, step)]
    return f'<path class="grid" d="{"".join(lines)}"/>'


def _meridians(box: Box, step: int) -> list[tuple[float, int]]:
    """Where they are drawn, and their longitudes."""
    degrees = range(ceil((box.west + 1e-6) / step) * step, ceil(box.east), step)
    return [((longitude - box.west) * float(box.view[0]), longitude) for longitude in degrees]


def _parallels(box: Box, step: int) -> list[tuple[float, int]]:
    degrees = range(ceil((box.south + 1e-6) / step) * step, ceil(box.north), step)
    return [((box.north - latitude) * float(box.view[1]), latitude) for latitude in degrees]


@dataclass(frozen=True, slots=True)
class _Label:
    """A text and the box that it fills at most: left, top, right, bottom."""

    text: str
    kind: str
    anchor: str
    x: float
    y: float

    @property
    def box(self) -> tuple[float, float, float, float]:
        wide = 0.6 * LETTER * len(self.text)
        left = {"start": self.x, "middle": self.x - wide / 2, "end": self.x - wide}[self.anchor]
        return left, self.y - 0.8 * LETTER, left + wide, self.y + 0.2 * LETTER

    def within(self, box: Box) -> bool:
        left, top, right, bottom = self.box
        return left >= 2 and top >= 2 and right <= WIDTH - 2 and bottom <= box.height - 2

    def __str__(self) -> str:
        return (
            f'<text class="{self.kind}" x="{self.x:.1f}" y="{self.y:.1f}" text-anchor="{self.anchor}" '
            f'paint-order="stroke">{escape(self.text)}</text>'
        )


def _ticks(box: Box, step: int, language: Language) -> list[_Label]:
    """The degrees of the parallels at the left and of the meridians below."""
    labels = [_Label(parallel(latitude, language), "tick", "start", 6, y - 5) for y, latitude in _parallels(box, step)]
    labels += [
        _Label(meridian(longitude, language), "tick", "start", x + 5, box.height - 8)
        for x, longitude in _meridians(box, step)
    ]
    kept: list[_Label] = []
    for label in labels:
        if label.within(box) and not any(_overlap(label.box, other.box) for other in kept):
            kept.append(label)
    return kept


def _named(spots: Iterable[Spot], box: Box, language: Language, ticks: Sequence[_Label]) -> list[str]:
    """Places with their names, where there is room for these: beside, above or below, clear of all others."""
    at = [
        (spot, *box.at(np.array([spot.longitude_deg, spot.latitude_deg])).tolist())
        for spot in spots if box.holds(spot.longitude_deg, spot.latitude_deg)
    ]
    taken = [(x - 8, y - 8, x + 8, y + 8) for _, x, y in at]
    placed: list[_Label] = []
    for spot, x, y in at:
        tried = (
            _Label(language.name(spot.name), "name", anchor, x + right, y + down)
            for anchor, right, down in (
                ("start", 12, 8), ("end", -12, 8), ("middle", 0, -16), ("middle", 0, 32), ("end", 10, -16),
                ("start", -10, -16), ("end", 10, 32), ("start", -10, 32), ("middle", 0, -40), ("middle", 0, 58),
            )
        )
        label = next(
            (one for one in tried if one.within(box) and not any(_overlap(one.box, other) for other in taken)), None
        )
        if label is not None and spot.name:
            taken.append(label.box)
            placed.append(label)
    free = [tick for tick in ticks if not any(_overlap(tick.box, other) for other in taken)]
    return [*map(str, free), *(_spot(x, y, spot.met) for spot, x, y in at), *map(str, placed)]


def _overlap(a: tuple[float, ...], b: tuple[float, ...]) -> bool:
    return a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]
