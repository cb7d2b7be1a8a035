"""The sky the slow way: skyfield alone, straight from the definitions, with none of its own event finders.

Full apparent places (light deflection, IAU 2000A nutation, diurnal aberration); rises and sets by looking at
the altitude every five minutes and then every ten seconds around the change of sign.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache, cached_property
from pathlib import Path
from typing import Any, Literal

import numpy as np
import numpy.typing as npt
import skyfield_data
from skyfield.api import load, load_file, wgs84

Array = npt.NDArray[np.float64]
Body = Literal["sun", "moon"]

# 34' of refraction; 16' for the Sun; the Moon's own semi-diameter with k = 0.2725076.
REFRACTION_DEG = 34 / 60
SUN_DEG = 16 / 60
MOON_KM = 0.2725076 * 6378.137


@cache
def kernel() -> Any:
    return load_file(str(Path(skyfield_data.__file__).parent / "data" / "de421.bsp"))


@cache
def timescale() -> Any:
    return load.timescale(builtin=True)


@dataclass(frozen=True)
class Site:
    latitude: float
    longitude: float
    elevation_m: float = 0.0

    @cached_property
    def position(self) -> Any:
        return wgs84.latlon(self.latitude, self.longitude, elevation_m=self.elevation_m)

    @cached_property
    def observer(self) -> Any:
        return kernel()["earth"] + self.position

    def apparent(self, body: Body, tt: Array) -> Any:
        return self.observer.at(timescale().tt_jd(tt)).observe(kernel()[body]).apparent()

    def excess_deg(self, body: Body, tt: Array, altitude_deg: float | None = None) -> Array:
        """Airless altitude of the body's centre, less that at which its upper limb is on the horizon (or less
        ``altitude_deg``)."""
        altitude, _, distance = self.apparent(body, tt).altaz()
        if altitude_deg is None:
            disc = SUN_DEG if body == "sun" else np.degrees(np.arcsin(MOON_KM / distance.km))
            altitude_deg = -REFRACTION_DEG - disc
        excess: Array = altitude.degrees - altitude_deg
        return excess

    def culmination_tt(self, body: Body, near_tt: float) -> float:
        """The body's passage through the meridian, where it stands highest but for its own motion."""
        for _ in range(5):
            hour_angle, _, _ = self.apparent(body, np.array([near_tt])).hadec()
            near_tt -= float(hour_angle.radians[0]) / (2 * np.pi)
        return near_tt

    def first_crossing_tt(
        self, body: Body, from_tt: float, days: float, altitude_deg: float | None = None
    ) -> tuple[float | None, bool]:
        """The first descent through the horizon after ``from_tt``, or with negative ``days`` the last ascent
        before it, and whether the body is above the horizon at ``from_tt``."""
        minutes = np.arange(0, abs(days) * 1440 + 5, 5) * np.sign(days)
        tt = from_tt + minutes / 1440
        above = self.excess_deg(body, tt, altitude_deg) > 0
        falls = np.flatnonzero(above[:-1] & ~above[1:])
        if not len(falls):
            return None, bool(above[0])
        fine_tt = np.linspace(tt[falls[0]], tt[falls[0] + 1], 31)
        excess = self.excess_deg(body, fine_tt, altitude_deg)
        at = int(np.flatnonzero((excess[:-1] > 0) & (excess[1:] <= 0))[0])
        share = excess[at] / (excess[at] - excess[at + 1])
        return float(fine_tt[at] + share * (fine_tt[at + 1] - fine_tt[at])), bool(above[0])
