"""The circumstances of evenings: the astronomy of crescents at places, as arrays [lunation, evening, place]."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from moonwrit.sky.ephemeris import Array, Ephemeris, Windows
from moonwrit.sky.horizon import (
    EARTH_RADIUS_KM,
    MOON_RADIUS_KM,
    STANDARD,
    Crossing,
    Horizon,
    Places,
    crossing,
    culmination,
    direction,
    noon_tt,
)
from moonwrit.sky.lunation import Integers

States = npt.NDArray[np.int8]


@dataclass(frozen=True, slots=True)
class Instant:
    """Sun and Moon at one instant of each evening; all [lunation, evening, place], NaN without the instant.

    Altitudes and azimuths are of the centres, airless unless named otherwise; ``_topo`` as seen from
    the place, ``_geo`` from the Earth's centre against the place's zenith. ``arcl`` elongation (arc of light),
    ``arcv`` arc of vision (Moon's altitude minus the Sun's), ``daz`` relative azimuth (Sun's minus the
    Moon's, -180 to 180). ``width`` in arcmin: semi-diameter x (1 - cos ARCL).
    """

    tt: Array
    sun_altitude_deg: Array
    sun_azimuth_deg: Array
    moon_altitude_topo_deg: Array
    moon_altitude_geo_deg: Array
    moon_azimuth_deg: Array
    moon_semidiameter_deg: Array
    moon_parallax_deg: Array
    arcl_topo_deg: Array
    arcl_geo_deg: Array
    arcv_topo_deg: Array
    arcv_geo_deg: Array
    daz_topo_deg: Array
    daz_geo_deg: Array
    width_topo_arcmin: Array
    width_geo_arcmin: Array
    illuminated_share: Array

    @property
    def moon_altitude_refracted_deg(self) -> Array:
        """Apparent altitude of the Moon's centre: airless topocentric altitude plus refraction."""
        return self.moon_altitude_topo_deg + refraction_deg(self.moon_altitude_topo_deg)

    def limb_altitude_deg(self, limb: int, *, refracted: bool) -> Array:
        """Topocentric altitude of the Moon's limb: +1 upper, 0 centre, -1 lower."""
        airless = self.moon_altitude_topo_deg + limb * self.moon_semidiameter_deg
        return airless + refraction_deg(airless) if refracted else airless


@dataclass(frozen=True, slots=True)
class Circumstances:
    """The evenings of civil dates at places; all [lunation, evening, place] unless said.

    ``day`` [lunation, evening] proleptic Gregorian ordinal of the evening's civil date. ``noon_tt`` the
    Sun's upper culmination of that date. ``sunset_tt`` is NaN where ``sunset_state`` is not CROSSES;
    ``moonset_tt`` is the setting after the Moon's culmination nearest to the Sun's, so that it may come
    before sunset, and ``lag_min`` (moonset minus sunset) is then negative. ``age_h`` counts from the
    geocentric conjunction to sunset. ``best`` is the best time, sunset + 4/9 lag (Bruin 1977;
    Yallop 1997), or sunset itself where the Moon sets first or not at all.
    """

    day: Integers
    conjunction_tt: Array
    noon_tt: Array
    sunset_tt: Array
    sunset_state: States
    moonset_tt: Array
    moonset_state: States
    sunset: Instant
    best: Instant

    @property
    def lag_min(self) -> Array:
        return (self.moonset_tt - self.sunset_tt) * 1440

    @property
    def age_h(self) -> Array:
        return (self.sunset_tt - self.conjunction_tt[:, None, None]) * 24

    @property
    def age_at_best_h(self) -> Array:
        return (self.best.tt - self.conjunction_tt[:, None, None]) * 24


def circumstances(
    sky: Ephemeris,
    windows: Windows,
    conjunction_tt: Array,
    day: Integers,
    places: Places,
    horizon: Horizon = STANDARD,
) -> Circumstances:
    """The evenings of civil dates ``day`` [lunation, evening] at ``places``.

    Each row's dates must lie inside its window (``windows`` and ``conjunction_tt`` [lunation]).
    """
    noon = noon_tt(sky, windows, day, places)
    sunset, sunset_state = crossing(windows, "sun", "set", noon, places, horizon)
    moonset, moonset_state = crossing(
        windows, "moon", "set", culmination(windows, "moon", noon, places), places, horizon
    )
    moonset = np.where(sunset_state == Crossing.CROSSES, moonset, np.nan)
    lag = np.nan_to_num(moonset - sunset)
    best = sunset + 4 / 9 * np.maximum(lag, 0)
    return Circumstances(
        day, conjunction_tt, noon, sunset, sunset_state, moonset, moonset_state,
        at_instant(windows, sunset, places), at_instant(windows, best, places),
    )


def at_instant(windows: Windows, tt: Array, places: Places) -> Instant:
    """Sun and Moon at ``tt`` [window, ..., place]; NaN where ``tt`` is."""
    sun, moon = direction(windows, "sun", tt, places), direction(windows, "moon", tt, places)
    sun_geo = direction(windows, "sun", tt, places, geocentric=True)
    moon_geo = direction(windows, "moon", tt, places, geocentric=True)
    arcv_topo, daz_topo, arcl_topo = _arcs(sun.altitude_rad, sun.azimuth_rad, moon.altitude_rad, moon.azimuth_rad)
    arcv_geo, daz_geo, arcl_geo = _arcs(
        sun_geo.altitude_rad, sun_geo.azimuth_rad, moon_geo.altitude_rad, moon_geo.azimuth_rad
    )
    semidiameter = moon.moon_semidiameter_rad
    # Phase angle i at the Moon: tan i = R sin(psi) / (D - R cos(psi)). Meeus ch. 48.
    phase = np.arctan2(
        sun_geo.distance_km * np.sin(arcl_geo),
        moon_geo.distance_km - sun_geo.distance_km * np.cos(arcl_geo),
    )
    return Instant(
        tt,
        np.degrees(sun.altitude_rad),
        np.degrees(sun.azimuth_rad),
        np.degrees(moon.altitude_rad),
        np.degrees(moon_geo.altitude_rad),
        np.degrees(moon.azimuth_rad),
        np.degrees(semidiameter),
        np.degrees(np.arcsin(EARTH_RADIUS_KM / moon_geo.distance_km)),
        np.degrees(arcl_topo),
        np.degrees(arcl_geo),
        np.degrees(arcv_topo),
        np.degrees(arcv_geo),
        np.degrees(daz_topo),
        np.degrees(daz_geo),
        np.degrees(semidiameter * (1 - np.cos(arcl_topo))) * 60,
        np.degrees(np.arcsin(MOON_RADIUS_KM / moon_geo.distance_km) * (1 - np.cos(arcl_geo))) * 60,
        (1 + np.cos(phase)) / 2,
    )


def _arcs(sun_alt: Array, sun_az: Array, moon_alt: Array, moon_az: Array) -> tuple[Array, Array, Array]:
    """ARCV, DAZ and ARCL in radians, from altitudes and azimuths."""
    arcv = moon_alt - sun_alt
    daz = np.remainder(sun_az - moon_az + np.pi, 2 * np.pi) - np.pi
    # Haversines keep their precision where the arcs are small.
    haversine = np.sin(arcv / 2) ** 2 + np.cos(sun_alt) * np.cos(moon_alt) * np.sin(daz / 2) ** 2
    return arcv, daz, 2 * np.arcsin(np.sqrt(np.clip(haversine, 0, 1)))


def refraction_deg(airless_deg: Array) -> Array:
    """Refraction at an airless altitude, 1010 hPa and 10 C, zero below -1 degree.

    Saemundsson's formula (Sky & Telescope 72, 70, 1986; Meeus ch. 16, eq. 16.4).
    """
    h = np.maximum(airless_deg, -1.0)
    value = 1.02 / 60 / np.tan(np.radians(h + 10.3 / (h + 5.11)))
    return np.where(airless_deg < -1, 0.0, np.where(np.isnan(airless_deg), np.nan, value))
