"""March equinoxes: when the Sun's apparent geocentric longitude is zero."""

from __future__ import annotations

from datetime import datetime
from functools import cache

import numpy as np

from moonwrit.sky.described import instant
from moonwrit.sky.ephemeris import ephemeris, series, vector

_TROPICAL_YEAR = 365.2422
_MEAN_MOTION = 2 * np.pi / _TROPICAL_YEAR


@cache
def march_equinox(year: int) -> datetime:
    """The March equinox of a Gregorian year, UTC to the second. Raises RequestError outside the ephemeris."""
    sky = ephemeris()
    # 2000 March 20, 7.6 h TT; the calendar year's equinox strays from this by less than a day and a half.
    near = np.array([2451623.816 + _TROPICAL_YEAR * (year - 2000)])
    window = sky.windows(near, 2.0)
    tt = near
    for _ in range(6):
        x = window.scaled(tt)
        first, second, north = vector(window.sun_km, x)
        slope = series(window.obliquity_rad, x)
        longitude = np.arctan2(second * np.cos(slope) + north * np.sin(slope), first)
        tt = tt - longitude / _MEAN_MOTION
    found = instant(sky, float(tt[0]))
    assert found is not None
    return found
