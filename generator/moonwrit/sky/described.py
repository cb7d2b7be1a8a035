"""One evening at one place as names with units: the same words in evidence, feeds and commands."""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, datetime, timedelta

import numpy as np

from moonwrit.sky.circumstances import Circumstances
from moonwrit.sky.criteria import CRITERIA
from moonwrit.sky.ephemeris import Array, Ephemeris
from moonwrit.sky.horizon import Crossing

_STATES = {Crossing.CROSSES: "sets", Crossing.STAYS_ABOVE: "stays above", Crossing.STAYS_BELOW: "stays below"}


def instant(sky: Ephemeris, tt: float) -> datetime | None:
    """TT -> UTC to the whole second; None for an instant that does not happen."""
    return _utc(float(sky.ut(np.array([tt]))[0]))


def _utc(ut: float) -> datetime | None:
    if not np.isfinite(ut):
        return None
    return datetime(1, 1, 1, tzinfo=UTC) + timedelta(seconds=round((ut - 1721425.5) * 86400))


def iso(moment: datetime | None) -> str | None:
    return None if moment is None else moment.strftime("%Y-%m-%dT%H:%M:%SZ")


def described(c: Circumstances) -> Callable[[tuple[int, int, int]], dict[str, float | str | None]]:
    """The circumstances of any [lunation, evening, place] of ``c``, all of them computed at once; None where
    the event does not happen."""
    shape = c.sunset_tt.shape

    def number(values: Array, places: int) -> tuple[Array, int]:
        return np.broadcast_to(values, shape), places

    sunset, best = c.sunset, c.best
    q, v = CRITERIA["yallop-1997"].quantity, CRITERIA["odeh-2004"].quantity
    assert q is not None
    assert v is not None
    numbers = {
        "lag_min": number(c.lag_min, 2),
        "age_h": number(c.age_h, 3),
        "moon_altitude_topocentric_deg": number(sunset.moon_altitude_topo_deg, 4),
        "moon_altitude_refracted_deg": number(sunset.moon_altitude_refracted_deg, 4),
        "moon_altitude_geocentric_deg": number(sunset.moon_altitude_geo_deg, 4),
        "moon_azimuth_deg": number(sunset.moon_azimuth_deg, 3),
        "sun_azimuth_deg": number(sunset.sun_azimuth_deg, 3),
        "elongation_topocentric_deg": number(sunset.arcl_topo_deg, 4),
        "elongation_geocentric_deg": number(sunset.arcl_geo_deg, 4),
        "illuminated_percent": number(sunset.illuminated_share * 100, 3),
        "best_moon_altitude_topocentric_deg": number(best.moon_altitude_topo_deg, 4),
        "best_moon_azimuth_deg": number(best.moon_azimuth_deg, 3),
        "best_sun_altitude_deg": number(best.sun_altitude_deg, 4),
        "best_sun_azimuth_deg": number(best.sun_azimuth_deg, 3),
        "best_arc_of_vision_topocentric_deg": number(best.arcv_topo_deg, 4),
        "best_arc_of_vision_geocentric_deg": number(best.arcv_geo_deg, 4),
        "best_elongation_topocentric_deg": number(best.arcl_topo_deg, 4),
        "best_elongation_geocentric_deg": number(best.arcl_geo_deg, 4),
        "best_relative_azimuth_deg": number(best.daz_topo_deg, 3),
        "best_width_topocentric_arcmin": number(best.width_topo_arcmin, 4),
        "best_width_geocentric_arcmin": number(best.width_geo_arcmin, 4),
        "yallop_q": number(q.of(c), 4),
        "odeh_v": number(v.of(c), 4),
    }

    sunset_ut, moonset_ut, best_ut = (c.sky.ut(tt) for tt in (c.sunset_tt, c.moonset_tt, c.best_tt))

    def at(index: tuple[int, int, int]) -> dict[str, float | str | None]:
        def moment(ut: Array) -> str | None:
            return iso(_utc(float(ut[index])))

        values = ((name, float(column[index]), places) for name, (column, places) in numbers.items())
        return {
            "sunset_utc": moment(sunset_ut),
            "sun": _STATES[Crossing(int(c.sunset_state[index]))],
            "moonset_utc": moment(moonset_ut),
            "moon": _STATES[Crossing(int(c.moonset_state[index]))],
            "best_time_utc": moment(best_ut),
            **{
                name: round(value, places) + 0.0 if np.isfinite(value) else None for name, value, places in values
            },
        }

    return at
