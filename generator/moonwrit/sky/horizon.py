"""Rising, setting, twilight and culmination, for whole arrays of windows, evenings and places.

The standard horizon: 34 arcmin of refraction; the upper limb, with 16 arcmin of semi-diameter for the
Sun and the Moon's own (and its parallax, through the topocentric vector); no dip unless asked for.
Answers carry a state: an event that does not happen is NaN in time and says why.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from enum import IntEnum
from functools import cache
from typing import Literal
from zoneinfo import ZoneInfo

import numpy as np
import numpy.typing as npt

from moonwrit.sky.ephemeris import Array, Ephemeris, Windows, series, vector
from moonwrit.sky.lunation import Integers

EARTH_RADIUS_KM = 6378.137
_FLATTENING = 1 / 298.257223563
"""WGS 84."""
MOON_RADIUS_KM = 0.2725076 * EARTH_RADIUS_KM
"""k = 0.2725076, the IAU value in the eclipse tables of F. Espenak (NASA)."""

Body = Literal["sun", "moon"]
Turn = Literal["rise", "set"]

_DAYS_PER_TURN = {"sun": 1.0, "moon": 1.0350501}
"""Mean interval between upper culminations."""
_STEEP_DEG = 60.5
"""Beyond this latitude (90 less the Moon's greatest declination) it can graze the horizon, and Newton's
method can miss that."""


class Crossing(IntEnum):
    """Does the body cross the horizon in that half of its turn?"""

    CROSSES = 0
    STAYS_ABOVE = 1
    STAYS_BELOW = 2


@dataclass(frozen=True, slots=True)
class Horizon:
    """What counts as the horizon. Angles in degrees; ``dip`` lowers it by the place's elevation."""

    refraction_deg: float = 34 / 60
    sun_semidiameter_deg: float = 16 / 60
    dip: bool = False

    def dip_deg(self, elevation_m: Array) -> Array:
        """Dip of the sea horizon, refraction included: 0.0293 deg sqrt(metres).

        Source: Explanatory Supplement to the Astronomical Almanac (1.758 arcmin; from memory).
        """
        return 0.0293 * np.sqrt(np.maximum(elevation_m, 0)) if self.dip else np.zeros_like(elevation_m)


STANDARD = Horizon()


@dataclass(frozen=True, slots=True)
class Places:
    """Places as arrays [place]: geodetic degrees (north, east positive), metres; ``zones`` say which civil
    date a noon belongs to (None, or no zones at all: the date of local mean time).

    A search that moves its points from evening to evening gives [lunation, evening, place] arrays, no zones,
    and latitudes within 60 degrees.
    """

    latitude_deg: Array
    longitude_deg: Array
    elevation_m: Array
    zones: tuple[ZoneInfo | None, ...] = ()

    @staticmethod
    def of(rows: Sequence[tuple[float, float, float, ZoneInfo | None]]) -> Places:
        """From rows of latitude, longitude, elevation and time zone."""
        columns = np.array([row[:3] for row in rows], dtype=np.float64).reshape(-1, 3).T
        return Places(columns[0], columns[1], columns[2], tuple(row[3] for row in rows))

    def __len__(self) -> int:
        return len(self.latitude_deg)

    def pick(self, which: npt.NDArray[np.bool_] | npt.NDArray[np.intp]) -> Places:
        """Some of the places [place], as a mask or as indices."""
        zones = np.array(self.zones or [None] * len(self), dtype=object)[which]
        return Places(
            self.latitude_deg[which], self.longitude_deg[which], self.elevation_m[which], tuple(zones)
        )

    def joined(self, other: Places) -> Places:
        """These places [place] and then the others."""
        mine, theirs = self.zones or (None,) * len(self), other.zones or (None,) * len(other)
        return Places(
            np.concatenate([self.latitude_deg, other.latitude_deg]),
            np.concatenate([self.longitude_deg, other.longitude_deg]),
            np.concatenate([self.elevation_m, other.elevation_m]),
            mine + theirs,
        )

    def observer_km(self) -> tuple[Array, Array]:
        """Distance from the axis and height above the equator's plane, of each place."""
        phi = np.radians(self.latitude_deg)
        e2 = _FLATTENING * (2 - _FLATTENING)
        normal = EARTH_RADIUS_KM / np.sqrt(1 - e2 * np.sin(phi) ** 2)
        height = self.elevation_m / 1000
        return (normal + height) * np.cos(phi), (normal * (1 - e2) + height) * np.sin(phi)


@dataclass(frozen=True, slots=True)
class Direction:
    """Where a body stands, in radians and km, shape of the instants: airless altitude of its centre,
    azimuth from north through east, declination, hour angle (west positive), distance."""

    altitude_rad: Array
    azimuth_rad: Array
    declination_rad: Array
    hour_angle_rad: Array
    distance_km: Array

    @property
    def moon_semidiameter_rad(self) -> Array:
        semidiameter: Array = np.arcsin(MOON_RADIUS_KM / self.distance_km)
        return semidiameter


def in_meridian(windows: Windows, body: Body, tt: Array, places: Places) -> tuple[Array, Array, Array]:
    """The body's geocentric vector in km, turned into each place's meridian: outward from the axis along it,
    east, and north along the axis. ``tt`` [window, ..., place]."""
    x = windows.scaled(tt)
    theta = series(windows.gast_rad, x) + np.radians(places.longitude_deg)
    cosine, sine = np.cos(theta), np.sin(theta)
    first, second, north = vector(windows.sun_km if body == "sun" else windows.moon_km, x)
    return first * cosine + second * sine, second * cosine - first * sine, north


def seen_from(places: Places, out: Array, east: Array, north: Array, *, geocentric: bool = False) -> Direction:
    """The direction of a vector ``in_meridian``, from the places or, ``geocentric``, from the Earth's centre
    against the places' own zeniths."""
    if not geocentric:
        axis_km, height_km = places.observer_km()
        out, north = out - axis_km, north - height_km
    phi = np.radians(places.latitude_deg)
    sin_phi, cos_phi = np.sin(phi), np.cos(phi)
    distance = np.sqrt(out**2 + east**2 + north**2)
    return Direction(
        np.arcsin((out * cos_phi + north * sin_phi) / distance),
        np.remainder(np.arctan2(east, north * cos_phi - out * sin_phi), 2 * np.pi),
        np.arcsin(north / distance),
        np.arctan2(-east, out),
        distance,
    )


def direction(windows: Windows, body: Body, tt: Array, places: Places) -> Direction:
    """The body as seen from ``places`` at ``tt`` [window, ..., place]."""
    return seen_from(places, *in_meridian(windows, body, tt, places))


def _horizon_rad(body: Body, seen: Direction, places: Places, horizon: Horizon) -> Array:
    """Airless altitude of the body's centre when its upper limb is on the horizon."""
    fixed = np.radians(horizon.refraction_deg + horizon.dip_deg(places.elevation_m))
    disc: Array = np.radians(horizon.sun_semidiameter_deg) if body == "sun" else seen.moon_semidiameter_rad
    return -fixed - disc


def culmination(windows: Windows, body: Body, near_tt: Array, places: Places) -> Array:
    """TT of the body's upper culmination (geocentric hour angle zero) nearest to ``near_tt``."""
    rate = 2 * np.pi / _DAYS_PER_TURN[body]
    tt = near_tt
    for _ in range(4):
        tt = tt - _hour_angle(windows, body, tt, places) / rate
    return tt


def _hour_angle(windows: Windows, body: Body, tt: Array, places: Places) -> Array:
    x = windows.scaled(tt)
    theta = series(windows.gast_rad, x) + np.radians(places.longitude_deg)
    coefficients = windows.sun_km if body == "sun" else windows.moon_km
    right_ascension = np.arctan2(series(coefficients[:, 1], x), series(coefficients[:, 0], x))
    angle: Array = np.remainder(theta - right_ascension + np.pi, 2 * np.pi) - np.pi
    return angle


def crossing(
    windows: Windows,
    body: Body,
    turn: Turn,
    culmination_tt: Array,
    places: Places,
    horizon: Horizon = STANDARD,
    altitude_deg: float | None = None,
    near_tt: Array | None = None,
) -> tuple[Array, npt.NDArray[np.int8]]:
    """When the body sets after (``set``) or rises before (``rise``) an upper culmination.

    ``culmination_tt`` [window, evening, place]. ``altitude_deg`` replaces the horizon by a fixed
    airless altitude of the centre (twilight). Returns TT (NaN where it does not happen) and the
    Crossing of each. Up to 60.5 degrees of latitude by Newton's method in hour angle; beyond, the
    altitude is sampled through the turn and the first crossing bracketed (a peep above the horizon or a
    dip below it shorter than about four minutes counts as none). ``near_tt``, of the same shape, spares Newton's
    method its first steps: answers that are known to within a minute.
    """
    steep = np.abs(places.latitude_deg) > _STEEP_DEG
    if not steep.any():
        return _newton(windows, body, turn, culmination_tt, places, horizon, altitude_deg, near_tt)
    tt = np.full(culmination_tt.shape, np.nan)
    state = np.zeros(culmination_tt.shape, dtype=np.int8)
    for solve, pick in ((_newton, ~steep), (_bracket, steep)):
        tt[..., pick], state[..., pick] = solve(
            windows, body, turn, culmination_tt[..., pick], places.pick(pick), horizon, altitude_deg
        )
    return tt, state


def _target(
    body: Body, seen: Direction, places: Places, horizon: Horizon, altitude_deg: float | None
) -> Array:
    if altitude_deg is None:
        return _horizon_rad(body, seen, places, horizon)
    return np.full_like(seen.altitude_rad, np.radians(altitude_deg))


def _newton(
    windows: Windows, body: Body, turn: Turn, culmination_tt: Array, places: Places,
    horizon: Horizon, altitude_deg: float | None, near_tt: Array | None = None,
) -> tuple[Array, npt.NDArray[np.int8]]:
    phi = np.radians(places.latitude_deg)
    sin_phi, cos_phi = np.sin(phi), np.cos(phi)
    rate = 2 * np.pi / _DAYS_PER_TURN[body]
    side = 1 if turn == "set" else -1
    tt = culmination_tt if near_tt is None else near_tt
    cosine = np.zeros_like(tt)
    for step in range(2 if near_tt is not None else 4 if body == "sun" else 6):
        seen = direction(windows, body, tt, places)
        target = _target(body, seen, places, horizon, altitude_deg)
        cosine = (np.sin(target) - sin_phi * np.sin(seen.declination_rad)) / (
            cos_phi * np.cos(seen.declination_rad)
        )
        wanted = side * np.arccos(np.clip(cosine, -1, 1))
        gap = wanted - seen.hour_angle_rad
        if step or near_tt is not None:
            # Near the answer the gap is small; the first step may be most of half a turn.
            gap = np.remainder(gap + np.pi, 2 * np.pi) - np.pi
        tt = tt + gap / rate
    state = np.where(cosine > 1, Crossing.STAYS_BELOW, np.where(cosine < -1, Crossing.STAYS_ABOVE, 0))
    return np.where(state == 0, tt, np.nan), state.astype(np.int8)


def _bracket(
    windows: Windows, body: Body, turn: Turn, culmination_tt: Array, places: Places,
    horizon: Horizon, altitude_deg: float | None,
) -> tuple[Array, npt.NDArray[np.int8]]:
    def above(tt: Array) -> Array:
        seen = direction(windows, body, tt, places)
        return seen.altitude_rad - _target(body, seen, places, horizon, altitude_deg)

    side = 1 if turn == "set" else -1
    length = _DAYS_PER_TURN[body]
    minutes = np.array([2, 5, 10, 15]) / 1440
    steps = np.unique(np.concatenate([
        np.arange(0, 1 + 1e-9, 1 / 72) * length, minutes, length / 2 + minutes, length / 2 - minutes,
        length - minutes,
    ]))
    low = np.full(culmination_tt.shape, np.nan)
    high = np.full(culmination_tt.shape, np.nan)
    before_tt = culmination_tt
    before = above(before_tt)
    # What counts where it never sets (or rose): a body that first shows hours away from this culmination, on
    # its way to the next one, was below all the same.
    starts_above = before > 0
    for step in steps[1:]:
        now_tt = culmination_tt + side * step
        now = above(now_tt)
        found = (before > 0) & (now <= 0) & np.isnan(low)
        low = np.where(found, before_tt, low)
        high = np.where(found, now_tt, high)
        before_tt, before = now_tt, now
    crosses = np.isfinite(low)
    a, b = np.where(crosses, low, culmination_tt), np.where(crosses, high, culmination_tt)
    for _ in range(26):
        # Bisection of 20 minutes to 2e-5 s: slow and sure, for the few that need it.
        middle = (a + b) / 2
        up = above(middle) > 0
        a, b = np.where(up, middle, a), np.where(up, b, middle)
    state = np.where(crosses, 0, np.where(starts_above, Crossing.STAYS_ABOVE, Crossing.STAYS_BELOW))
    return np.where(crosses, (a + b) / 2, np.nan), state.astype(np.int8)


def noon_tt(sky: Ephemeris, windows: Windows, day: Integers, places: Places) -> Array:
    """TT of the Sun's upper culmination that belongs to each civil date.

    ``day`` [window, evening] proleptic Gregorian ordinals -> [window, evening, place]. The culmination of
    date D is the one that the place's clocks put on D, whatever side of the date line it keeps.
    """
    near_ut = day[..., None] + 1721424.5 + 0.5 - places.longitude_deg / 360
    if any(places.zones):
        near_ut = near_ut + np.stack(
            [_day_shift(zone, float(longitude), day)
             for zone, longitude in zip(places.zones, places.longitude_deg, strict=True)],
            axis=-1,
        )
    return culmination(windows, "sun", sky.tt(near_ut), places)


def reckoned_longitude_deg(zone: ZoneInfo | None, longitude_deg: float, day: int) -> float:
    """The longitude at which a place stands in the order of the date's evenings: beyond 180 or -180 where its clocks
    keep the date of the other side of the date line."""
    return longitude_deg - 360 * float(_day_shift(zone, longitude_deg, np.array(day)))


def _day_shift(zone: ZoneInfo | None, longitude_deg: float, day: Integers) -> Integers:
    """Days to add to the noon of local mean time so that the zone's clocks show the date ``day``."""
    if zone is None:
        return np.zeros_like(day)
    changes = _shift_changes(zone, longitude_deg)
    first_days = np.array([first for first, _ in changes])
    return np.array([shift for _, shift in changes])[np.searchsorted(first_days, day, side="right") - 1]


@cache
def _shift_changes(zone: ZoneInfo, longitude_deg: float) -> tuple[tuple[int, int], ...]:
    """(first day, shift) in order. A place changes it only by moving to the other side of the date line."""

    def shift(day: int) -> int:
        noon = datetime(1, 1, 1, 12, tzinfo=UTC) + timedelta(days=day - 1 - longitude_deg / 360)
        offset = noon.astimezone(zone).utcoffset() or timedelta(0)
        return -round((offset / timedelta(days=1)) - longitude_deg / 360)

    # No zone is known to change sides after 2040.
    first, last = datetime(1880, 1, 1).toordinal(), datetime(2040, 1, 1).toordinal()
    changes = [(0, shift(first))]
    for year_start in range(first, last, 365):
        low, high = year_start, year_start + 365
        if shift(high) == shift(low):
            continue
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (middle, high) if shift(middle) == shift(low) else (low, middle)
        changes.append((high, shift(high)))
    return tuple(changes)
