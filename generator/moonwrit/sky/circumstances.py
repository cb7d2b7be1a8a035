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
    in_meridian,
    noon_tt,
    seen_from,
)
from moonwrit.sky.lunation import Integers

States = npt.NDArray[np.int8]


@dataclass(frozen=True)
class Instant:
    """Sun and Moon at one instant ``tt`` of each evening; all [lunation, evening, place], NaN without it.

    Altitudes and azimuths are of the centres, airless unless named otherwise; ``_topo`` as seen from
    the place, ``_geo`` from the Earth's centre against the place's zenith. ``arcl`` elongation (arc of
    light), ``arcv`` arc of vision (Moon's altitude minus the Sun's), ``daz`` relative azimuth (Sun's minus
    the Moon's, -180 to 180). ``width`` in arcmin: semi-diameter x (1 - cos ARCL). What is asked for is
    computed once, when first asked for.
    """

    windows: Windows
    tt: Array
    places: Places

    @cached_property
    def _sun_km(self) -> tuple[Array, Array, Array]:
        return in_meridian(self.windows, "sun", self.tt, self.places)

    @cached_property
    def _moon_km(self) -> tuple[Array, Array, Array]:
        return in_meridian(self.windows, "moon", self.tt, self.places)

    @cached_property
    def _sun(self) -> Direction:
        return seen_from(self.places, *self._sun_km)

    @cached_property
    def _moon(self) -> Direction:
        return seen_from(self.places, *self._moon_km)

    @cached_property
    def _sun_geo(self) -> Direction:
        return seen_from(self.places, *self._sun_km, geocentric=True)

    @cached_property
    def _moon_geo(self) -> Direction:
        return seen_from(self.places, *self._moon_km, geocentric=True)

    @property
    def sun_altitude_deg(self) -> Array:
        return np.degrees(self._sun.altitude_rad)

    @property
    def sun_azimuth_deg(self) -> Array:
        return np.degrees(self._sun.azimuth_rad)

    @property
    def moon_altitude_topo_deg(self) -> Array:
        return np.degrees(self._moon.altitude_rad)

    @property
    def moon_altitude_geo_deg(self) -> Array:
        return np.degrees(self._moon_geo.altitude_rad)

    @property
    def moon_azimuth_deg(self) -> Array:
        return np.degrees(self._moon.azimuth_rad)

    @property
    def moon_semidiameter_deg(self) -> Array:
        """Topocentric."""
        return np.degrees(self._moon.moon_semidiameter_rad)

    @property
    def moon_parallax_deg(self) -> Array:
        """Equatorial horizontal parallax."""
        parallax: Array = np.degrees(np.arcsin(EARTH_RADIUS_KM / self._moon_distance_km))
        return parallax

    @property
    def _moon_distance_km(self) -> Array:
        return _length(self._moon_km)

    @cached_property
    def arcl_topo_deg(self) -> Array:
        axis_km, height_km = self.places.observer_km()
        (sun_out, sun_east, sun_north), (out, east, north) = self._sun_km, self._moon_km
        return np.degrees(_angle_rad(
            (sun_out - axis_km, sun_east, sun_north - height_km), (out - axis_km, east, north - height_km)
        ))

    @cached_property
    def arcl_geo_deg(self) -> Array:
        return np.degrees(_angle_rad(self._sun_km, self._moon_km))

    @property
    def arcv_topo_deg(self) -> Array:
        return np.degrees(self._moon.altitude_rad - self._sun.altitude_rad)

    @property
    def arcv_geo_deg(self) -> Array:
        return np.degrees(self._moon_geo.altitude_rad - self._sun_geo.altitude_rad)

    @property
    def daz_topo_deg(self) -> Array:
        return np.degrees(_turned(self._sun.azimuth_rad - self._moon.azimuth_rad))

    @property
    def daz_geo_deg(self) -> Array:
        return np.degrees(_turned(self._sun_geo.azimuth_rad - self._moon_geo.azimuth_rad))

    @property
    def width_topo_arcmin(self) -> Array:
        width: Array = self.moon_semidiameter_deg * 60 * (1 - np.cos(np.radians(self.arcl_topo_deg)))
        return width

    @property
    def width_geo_arcmin(self) -> Array:
        semidiameter = np.degrees(np.arcsin(MOON_RADIUS_KM / self._moon_distance_km))
        width: Array = semidiameter * 60 * (1 - np.cos(np.radians(self.arcl_geo_deg)))
        return width

    @property
    def illuminated_share(self) -> Array:
        """Illuminated part of the disc, 0 to 1, from the phase angle i at the Moon, geocentric:
        tan i = R sin(psi) / (D - R cos(psi)). Meeus ch. 48."""
        psi = np.radians(self.arcl_geo_deg)
        sun_km = _length(self._sun_km)
        phase = np.arctan2(sun_km * np.sin(psi), self._moon_distance_km - sun_km * np.cos(psi))
        share: Array = (1 + np.cos(phase)) / 2
        return share

    @property
    def moon_altitude_refracted_deg(self) -> Array:
        """Apparent altitude of the Moon's centre: airless topocentric altitude plus refraction."""
        return self.limb_altitude_deg(0, refracted=True)

    def limb_altitude_deg(self, limb: int, *, refracted: bool) -> Array:
        """Topocentric altitude of the Moon's limb: +1 upper, 0 centre, -1 lower."""
        airless = self.moon_altitude_topo_deg
        if limb:
            airless = airless + limb * self.moon_semidiameter_deg
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
        return Instant(self.windows, self.sunset_tt, self.places)

    @cached_property
    def best(self) -> Instant:
        return Instant(self.windows, self.best_tt, self.places)

    def at_sun_depression(self, depression_deg: float) -> Instant:
        """When the Sun's centre is that far below the horizon after sunset (airless)."""
        tt, _ = crossing(
            self.windows, "sun", "set", self.noon_tt, self.places, altitude_deg=-depression_deg
        )
        return Instant(self.windows, tt, self.places)

    def night_end_tt(self, depression_deg: float = 18.0) -> Array:
        """The dawn that ends the evening's night; where the Sun does not sink so far, when it is lowest, to which
        dawn draws near as the summer's nights grow light."""
        dawn = self.dawn_tt(depression_deg)
        return np.where(np.isnan(dawn), self.noon_tt + 0.5, dawn)

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

    def chosen(self, mask: npt.NDArray[np.bool_]) -> Evenings:
        """The evenings where ``mask`` [lunation, evening] is true, each as a row of its own."""
        rows, columns = np.nonzero(mask)
        return Evenings(
            self.sky, self.windows[rows], self.conjunction_tt[rows], self.day[rows, columns][:, None]
        )


Vector = tuple[Array, Array, Array]


def _length(a: Vector) -> Array:
    length: Array = np.sqrt(a[0] ** 2 + a[1] ** 2 + a[2] ** 2)
    return length


def _angle_rad(a: Vector, b: Vector) -> Array:
    """The angle between two vectors, precise at any size."""
    cross = (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])
    angle: Array = np.arctan2(_length(cross), a[0] * b[0] + a[1] * b[1] + a[2] * b[2])
    return angle


def _turned(angle_rad: Array) -> Array:
    """An angle from -pi to pi."""
    turned: Array = np.remainder(angle_rad + np.pi, 2 * np.pi) - np.pi
    return turned


def refraction_deg(airless_deg: Array) -> Array:
    """Refraction at an airless altitude, 1010 hPa and 10 C, zero below -1 degree.

    Saemundsson's formula (Sky & Telescope 72, 70, 1986; Meeus ch. 16, eq. 16.4).
    """
    h = np.maximum(airless_deg, -1.0)
    value = 1.02 / 60 / np.tan(np.radians(h + 10.3 / (h + 5.11)))
    return np.where(airless_deg < -1, 0.0, np.where(np.isnan(airless_deg), np.nan, value))
