"""One evening over a whole grid of places, for maps: the circumstances of the other modules, many at a time.

Settings are smooth over the Earth. They are solved on a coarse grid in full and carried to the fine one by cubic
interpolation, good to some seconds, from where two steps of the solver are enough.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from moonwrit.sky.circumstances import Circumstances, Evenings, States
from moonwrit.sky.ephemeris import Array
from moonwrit.sky.horizon import Places, crossing

_COARSE_DEG = 4.0
_SOLVED_DEG = 60.5
"""Beyond this latitude the settings themselves may fail, and every point is solved in full."""
_BAND = 8192
"""Points computed at once: as many as the processor's memory at hand holds."""

_NOON_UT = 1721424.5 + 0.5
_FIRST_DAYS, _LAST_DAYS, _NODES = -0.65, 1.7, 8
"""From noon at 220 E to noon of the next date at 220 W, counted from noon UT of the civil date; 8 Chebyshev nodes over
that time stay within 0.2 m of the Moon."""


@dataclass(frozen=True, slots=True)
class Grid:
    """Parallels [row] from the south and meridians [column] from the west, in degrees, ``elevation_m`` 0.

    The evening is that of the civil date of local mean time: longitudes run west with the evening, from its first
    sunset at 180 to its last at -180. Beyond them, to 40 degrees, lie places that keep the date of the other side:
    189 is 171 W with the date of the east.
    """

    latitude_deg: Array
    longitude_deg: Array

    @staticmethod
    def over(west: float, south: float, east: float, north: float, step_deg: float) -> Grid:
        """Both ends included; the step is as near to ``step_deg`` as divides the span evenly."""
        def ticks(low: float, high: float) -> Array:
            return np.linspace(low, high, max(2, round((high - low) / step_deg) + 1))

        return Grid(ticks(south, north), ticks(west, east))

    @property
    def shape(self) -> tuple[int, int]:
        return len(self.latitude_deg), len(self.longitude_deg)

    def places(self) -> Places:
        latitude, longitude = np.meshgrid(self.latitude_deg, self.longitude_deg, indexing="ij")
        return Places(latitude.ravel(), longitude.ravel(), np.zeros(latitude.size))

    def rows(self, first: int, end: int) -> Grid:
        return Grid(self.latitude_deg[first:end], self.longitude_deg)


def spanned(evenings: Evenings) -> Evenings:
    """The same evenings, one a row, with windows that span each of them everywhere on Earth and little more: shorter
    series, and so faster maps. All the same right for single places."""
    half = (_LAST_DAYS - _FIRST_DAYS) / 2
    middle = evenings.day[:, 0].astype(np.float64) + _NOON_UT + _FIRST_DAYS + half
    windows = evenings.sky.windows(evenings.sky.tt(middle), half, _NODES)
    return Evenings(evenings.sky, windows, evenings.conjunction_tt, evenings.day)


def over(grid: Grid, evenings: Evenings, *asked: Callable[[Circumstances], Array]) -> list[Array]:
    """What is asked of the circumstances of one evening (a single row), [row, column] each; NaN where there is no such
    quantity."""
    parts: list[list[Array]] = [[] for _ in asked]
    coarse = _Coarse(evenings, grid)
    for first, end in _bands(grid):
        band = grid.rows(first, end)
        c = coarse.circumstances(band)
        for found, of in zip(parts, asked, strict=True):
            found.append(of(c)[0, 0].reshape(band.shape))
    return [np.concatenate(found) for found in parts]


def _bands(grid: Grid) -> Sequence[tuple[int, int]]:
    """Runs of rows that are either all steep or none, none longer than _BAND points."""
    steep = np.abs(grid.latitude_deg) > _SOLVED_DEG
    longest = max(1, _BAND // len(grid.longitude_deg))
    out, first = [], 0
    for row in range(1, len(steep) + 1):
        if row == len(steep) or steep[row] != steep[first] or row - first == longest:
            out.append((first, row))
            first = row
    return out


@dataclass(frozen=True)
class _Begun(Circumstances):
    """Circumstances whose settings are nearly known."""

    near_tt: tuple[Array, Array] = field(kw_only=True)

    def _solved(self, body: int) -> tuple[Array, States]:
        name, near = ("sun", "moon")[body], self.near_tt[body]
        return crossing(self.windows, name, "set", near, self.places, self.horizon, near_tt=near)  # type: ignore[arg-type]

    @cached_property
    def _sunset(self) -> tuple[Array, States]:
        return self._solved(0)

    @cached_property
    def _moonset(self) -> tuple[Array, States]:
        return self._solved(1)


class _Coarse:
    """The settings of one evening on a coarse grid, solved in full."""

    def __init__(self, one: Evenings, grid: Grid) -> None:
        self.one = one
        gentle = grid.latitude_deg[np.abs(grid.latitude_deg) <= _SOLVED_DEG]
        self.near_tt: tuple[Array, Array] | None = None
        if not len(gentle) or grid.shape[0] * grid.shape[1] < 1000:
            return
        west, east = grid.longitude_deg[[0, -1]]
        self.grid = Grid.over(float(west), float(gentle[0]), float(east), float(gentle[-1]), _COARSE_DEG)
        if min(self.grid.shape) < 4:
            return
        c = one.at(self.grid.places())
        self.near_tt = (
            c.sunset_tt[0, 0].reshape(self.grid.shape), c.moonset_tt[0, 0].reshape(self.grid.shape)
        )
        if not (np.isfinite(self.near_tt[0]).all() and np.isfinite(self.near_tt[1]).all()):
            self.near_tt = None

    def circumstances(self, band: Grid) -> Circumstances:
        if self.near_tt is None or np.abs(band.latitude_deg).max() > _SOLVED_DEG:
            return self.one.at(band.places())
        along = _cubic(self.grid.longitude_deg, band.longitude_deg)
        up = _cubic(self.grid.latitude_deg, band.latitude_deg)
        sun, moon = ((up @ tt @ along.T).reshape(1, 1, -1) for tt in self.near_tt)
        one = self.one
        return _Begun(one.sky, one.windows, one.conjunction_tt, one.day, band.places(), near_tt=(sun, moon))


def _cubic(known: Array, wanted: Array) -> Array:
    """The matrix [wanted, known] that interpolates between evenly spaced values by the cubic through four of them."""
    step = (known[-1] - known[0]) / (len(known) - 1)
    x = (wanted - known[0]) / step
    first = np.clip(np.floor(x).astype(np.int64) - 1, 0, len(known) - 4)
    matrix = np.zeros((len(wanted), len(known)))
    for k in range(4):
        others = [j for j in range(4) if j != k]
        weight = np.prod([(x - first - j) / (k - j) for j in others], axis=0)
        matrix[np.arange(len(wanted)), first + k] = weight
    return matrix
