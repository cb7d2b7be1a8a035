"""The circumstances of evenings: the astronomy of crescents, as arrays [lunation, evening, place]."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from moonwrit.sky.ephemeris import Array, Ephemeris, Windows
from moonwrit.sky.horizon import (
    EARTH_RADIUS_KM,
    MOON_RADIUS_KM,
    STANDARD,
    Crossing,
    Direction,
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
    the place, ``_geo`` from the Earth's centre against the place's zenith. ``arcl`` elongation (arc of
    light), ``arcv`` arc of vision (Moon's altitude minus the Sun's), ``daz`` relative azimuth (Sun's minus
    the Moon's, -180 to 180). ``width`` in arcmin: semi-diameter x (1 - cos ARCL).
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


@dataclass(frozen=True)
class Circumstances:
    """The evenings of civil dates at places; all arrays [lunation, evening, place] unless said.

    ``day`` [lunation, evening] proleptic Gregorian ordinal of the evening's civil date: each row's dates
    must lie inside its window (``windows`` and ``conjunction_tt`` [lunation]). What is asked for is
    computed once, when first asked for.
    """

    sky: Ephemeris
    windows: Windows
    conjunction_tt: Array
    day: Integers
    places: Places
    horizon: Horizon = STANDARD

    @cached_property
    def noon_tt(self) -> Array:
        """The Sun's upper culmination of the civil date."""
        return noon_tt(self.sky, self.windows, self.day, self.places)

    @cached_property
    def _sunset(self) -> tuple[Array, States]:
        return crossing(self.windows, "sun", "set", self.noon_tt, self.places, self.horizon)

    @cached_property
    def _moonset(self) -> tuple[Array, States]:
        moon_noon = culmination(self.windows, "moon", self.noon_tt, self.places)
        return crossing(self.windows, "moon", "set", moon_noon, self.places, self.horizon)

    @property
    def sunset_tt(self) -> Array:
        """The evening's sunset; NaN where ``sunset_state`` is not CROSSES."""
        return self._sunset[0]

    @property
    def sunset_state(self) -> States:
        return self._sunset[1]

    @property
    def moonset_tt(self) -> Array:
        """The setting after the Moon's culmination nearest to the Sun's; it may come before sunset."""
        return self._moonset[0]

    @property
    def moonset_state(self) -> States:
        return self._moonset[1]

    @cached_property
    def lag_min(self) -> Array:
        """Moonset minus sunset in minutes: negative where the Moon sets first; plus or minus infinity where
        it stays above or below the horizon; NaN without a sunset."""
        lag = (self.moonset_tt - self.sunset_tt) * 1440
        lag = np.where(self.moonset_state == Crossing.STAYS_ABOVE, np.inf, lag)
        lag = np.where(self.moonset_state == Crossing.STAYS_BELOW, -np.inf, lag)
        return np.where(np.isnan(self.sunset_tt), np.nan, lag)

    @cached_property
    def age_h(self) -> Array:
        """Hours from the geocentric conjunction to sunset, negative before it."""
        return (self.sunset_tt - self.conjunction_tt[:, None, None]) * 24

    @cached_property
    def best_tt(self) -> Array:
        """Best time: sunset + 4/9 lag (Bruin 1977, as in Yallop 1997); sunset itself where the Moon sets
        first or does not set."""
        lag = np.where(np.isfinite(self.lag_min), self.lag_min, 0)
        return self.sunset_tt + 4 / 9 * np.maximum(lag, 0) / 1440

    @cached_property
    def sunset(self) -> Instant:
        return at_instant(self.windows, self.sunset_tt, self.places)

    @cached_property
    def best(self) -> Instant:
        return at_instant(self.windows, self.best_tt, self.places)

    def at_sun_depression(self, depression_deg: float) -> Instant:
        """When the Sun's centre is that far below the horizon after sunset (airless)."""
        tt, _ = crossing(
            self.windows, "sun", "set", self.noon_tt, self.places, altitude_deg=-depression_deg
        )
        return at_instant(self.windows, tt, self.places)

    def dawn_tt(self, depression_deg: float = 18.0) -> Array:
        """Dawn that ends the evening's night: the Sun's centre at that depression, before the noon of the
        next civil date."""
        next_noon = noon_tt(self.sky, self.windows, self.day + 1, self.places)
        return crossing(
            self.windows, "sun", "rise", next_noon, self.places, altitude_deg=-depression_deg
        )[0]


@dataclass(frozen=True, slots=True)
class Evenings:
    """Evenings of civil dates before any place is chosen; shapes as in Circumstances."""

    sky: Ephemeris
    windows: Windows
    conjunction_tt: Array
    day: Integers

    def at(self, places: Places) -> Circumstances:
        return Circumstances(self.sky, self.windows, self.conjunction_tt, self.day, places)


def at_instant(windows: Windows, tt: Array, places: Places) -> Instant:
    """Sun and Moon at ``tt`` [window, ..., place]; NaN where ``tt`` is."""
    sun, moon = direction(windows, "sun", tt, places), direction(windows, "moon", tt, places)
    sun_geo = direction(windows, "sun", tt, places, geocentric=True)
    moon_geo = direction(windows, "moon", tt, places, geocentric=True)
    arcv_topo, daz_topo, arcl_topo = _arcs(sun, moon)
    arcv_geo, daz_geo, arcl_geo = _arcs(sun_geo, moon_geo)
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


def _arcs(sun: Direction, moon: Direction) -> tuple[Array, Array, Array]:
    """ARCV, DAZ and ARCL in radians."""
    arcv = moon.altitude_rad - sun.altitude_rad
    daz = np.remainder(sun.azimuth_rad - moon.azimuth_rad + np.pi, 2 * np.pi) - np.pi
    # Haversines keep their precision where the arcs are small.
    across = np.cos(sun.altitude_rad) * np.cos(moon.altitude_rad) * np.sin(daz / 2) ** 2
    haversine = np.sin(arcv / 2) ** 2 + across
    return arcv, daz, 2 * np.arcsin(np.sqrt(np.clip(haversine, 0, 1)))


def refraction_deg(airless_deg: Array) -> Array:
    """Refraction at an airless altitude, 1010 hPa and 10 C, zero below -1 degree.

    Saemundsson's formula (Sky & Telescope 72, 70, 1986; Meeus ch. 16, eq. 16.4).
    """
    h = np.maximum(airless_deg, -1.0)
    value = 1.02 / 60 / np.tan(np.radians(h + 10.3 / (h + 5.11)))
    return np.where(airless_deg < -1, 0.0, np.where(np.isnan(airless_deg), np.nan, value))
