"""Lunations: geocentric conjunctions of Moon and Sun in apparent ecliptic longitude, and their numbers."""

from __future__ import annotations

import sys
from dataclasses import dataclass
from functools import cache
from hashlib import sha256
from pathlib import Path

import jplephem
import numpy as np
import numpy.typing as npt
import skyfield

from moonwrit.cache import kept
from moonwrit.errors import RequestError
from moonwrit.sky.ephemeris import NODES, Array, Ephemeris, Windows, ephemeris, series, vector

Integers = npt.NDArray[np.int64]

SYNODIC_DAYS = 29.530588861
"""Mean synodic month at J2000 (Chapront ELP-2000, as in Meeus, Astronomical Algorithms ch. 49)."""

BEFORE_DAYS = 2.2
AFTER_DAYS = 4.4
"""A lunation's window reaches this far to either side of its conjunction: far enough for the evenings
of four civil dates (the day before the conjunction's UTC date to two days after) anywhere on Earth."""
_HALF_DAYS = (AFTER_DAYS + BEFORE_DAYS) / 2

_FIRST_OF_2000 = 17037
"""Month ordinal (months since Muharram of the year 1) of Meeus's lunation k = 0, the new moon of
2000 January 6, which brought Shawwal 1420."""


def near_conjunction_tt(k: Integers) -> Array:
    """TT of new moon number ``k`` (k = 0: 2000 January 6), within half an hour.

    Mean phase and the five largest periodic terms of Meeus, Astronomical Algorithms ch. 49.
    """
    t = k / 1236.85
    mean = 2451550.09766 + SYNODIC_DAYS * k + 0.00015437 * t**2
    sun = np.radians(2.5534 + 29.10535670 * k)
    moon = np.radians(201.5643 + 385.81693528 * k)
    node = np.radians(160.7108 + 390.67050284 * k)
    return np.asarray(
        mean - 0.40720 * np.sin(moon) + 0.17241 * np.sin(sun) + 0.01608 * np.sin(2 * moon)
        + 0.01039 * np.sin(2 * node) + 0.00739 * np.sin(moon - sun),
        dtype=np.float64,
    )


def longitude_difference_rad(windows: Windows, tt: Array) -> Array:
    """Apparent ecliptic longitude of the Moon minus the Sun's, -pi to pi; ``tt`` [window, ...]."""
    x = windows.scaled(tt)
    slope = series(windows.obliquity_rad, x)
    sine, cosine = np.sin(slope), np.cos(slope)

    def longitude(body: Array) -> Array:
        east, north, up = vector(body, x)
        return np.arctan2(north * cosine + up * sine, east)

    return np.remainder(longitude(windows.moon_km) - longitude(windows.sun_km) + np.pi, 2 * np.pi) - np.pi


def conjunction_in(windows: Windows) -> Array:
    """TT of the conjunction inside each window [window], by Newton's method at the mean rate."""
    rate = 2 * np.pi / SYNODIC_DAYS
    tt = windows.centre_tt.copy()
    for _ in range(12):
        # The mean rate is within 18 % of the true one: from a day away, twelve steps leave 0.1 ms at most.
        tt = tt - longitude_difference_rad(windows, tt) / rate
    return tt


@dataclass(frozen=True, slots=True)
class Lunations:
    """Consecutive lunations: ``ordinal`` of the month each brings, its conjunction, and the sky around it.

    ``ordinal`` [lunation] counts months from Muharram of the year 1 (= 0); ``conjunction_tt``
    [lunation]; ``day`` [lunation] is the proleptic Gregorian ordinal of the conjunction's UTC date.
    """

    ephemeris: Ephemeris
    ordinal: Integers
    conjunction_tt: Array
    conjunction_ut: Array
    day: Integers
    windows: Windows

    def __len__(self) -> int:
        return len(self.ordinal)


def span() -> tuple[int, int]:
    """First and last month ordinal whose lunation lies wholly inside the kernel."""
    sky = ephemeris()
    k_first = int(np.ceil((sky.first_tt + BEFORE_DAYS + 1.0 - 2451550.1) / SYNODIC_DAYS))
    k_last = int(np.floor((sky.last_tt - AFTER_DAYS - 1.0 - 2451550.1) / SYNODIC_DAYS))
    return k_first + _FIRST_OF_2000, k_last + _FIRST_OF_2000


def lunations(first: int, last: int) -> Lunations:
    """The lunations that bring the months of ordinal ``first`` to ``last``, both included.

    Raises RequestError where one lies outside the kernel.
    """
    earliest, latest = span()
    if first < earliest or last > latest:
        raise RequestError(
            f"the ephemeris reaches from {_name(earliest)} to {_name(latest)} AH (year-month) "
            f"and {_name(first)} to {_name(last)} was asked for",
            "choose years inside it",
        )
    return _lunations(ephemeris(), first, last)


@cache
def _lunations(sky: Ephemeris, first: int, last: int) -> Lunations:
    ordinal = np.arange(first, last + 1, dtype=np.int64)

    def computed() -> bytes:
        near = near_conjunction_tt(ordinal - _FIRST_OF_2000)
        windows = sky.windows(near + (AFTER_DAYS - BEFORE_DAYS) / 2, _HALF_DAYS)
        tt = conjunction_in(windows)
        parts = [windows.centre_tt, tt, sky.ut(tt), windows.sun_km, windows.moon_km, windows.gast_rad,
                 windows.obliquity_rad]
        return np.concatenate([part.reshape(-1, len(ordinal)) for part in parts]).tobytes()

    # Kept on disk: the nutation series of a century costs more than all that is done with it afterwards.
    file = sky.file.stat()
    key = (sky.file.name, file.st_size, file.st_mtime_ns, _code(), first, last)
    rows = np.frombuffer(kept("lunations", key, computed)).reshape(-1, len(ordinal))
    centre, tt, ut, *_ = rows
    sun, moon, gast, obliquity = np.split(rows[3:], np.cumsum([3 * NODES, 3 * NODES, NODES]))
    in_space = (NODES, 3, len(ordinal))
    windows = Windows(centre, _HALF_DAYS, sun.reshape(in_space), moon.reshape(in_space), gast, obliquity)
    return Lunations(sky, ordinal, tt, ut, ut_day(ut), windows)


@cache
def _code() -> str:
    """What the numbers depend on beside the ephemeris: this package, and what it computes with."""
    digest = sha256(f"{np.__version__} {skyfield.__version__} {jplephem.__version__} {sys.byteorder}".encode())
    for file in sorted(Path(__file__).parent.glob("*.py")):
        digest.update(file.read_bytes())
    return digest.hexdigest()


def ut_day(ut: Array) -> Integers:
    """Julian date UT -> proleptic Gregorian ordinal (``datetime.date.toordinal``) of its UTC date."""
    return np.floor(ut - 1721424.5).astype(np.int64)


def _name(ordinal: int) -> str:
    return f"{ordinal // 12 + 1}-{ordinal % 12 + 1:02d}"
