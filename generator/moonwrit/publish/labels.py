"""Names of the few fixed things that pages, feeds and commands speak of. ``_`` only marks them for translation."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from moonwrit.policy.months import Basis, Closeness, Standing


def _(message: str) -> str:
    return message


EYES = _("Never point optics at or near the Sun before the whole disc has set: eyes can be lost.")

STANDINGS: Mapping[Standing, str] = MappingProxyType({
    "expected": _("expected"),
    "settled": _("settled"),
    "amended": _("amended"),
})

CLOSENESS: Mapping[Closeness, str] = MappingProxyType({
    "fixed": _("fixed"),
    "wide": _("wide margin"),
    "close": _("close call"),
    "edge": _("on the edge"),
})

BASES: Mapping[Basis, str] = MappingProxyType({
    "arithmetic": _("arithmetic"),
    "calculated": _("calculated"),
    "sighted": _("sighted"),
    "completed": _("thirty days completed"),
    "adopted": _("adopted"),
    "tabulated": _("from a table"),
})

QUANTITIES: Mapping[str, str] = MappingProxyType({
    "age": _("age of the Moon"),
    "altitude": _("altitude of the Moon"),
    "altitude above the Ilyas curve": _("altitude above the Ilyas curve"),
    "altitude above the SAAO curve": _("altitude above the SAAO curve"),
    "arc of vision": _("arc of vision"),
    "arc of vision above Bruin's curve": _("arc of vision above Bruin's curve"),
    "arc of vision above Fotheringham's curve": _("arc of vision above Fotheringham's curve"),
    "arc of vision above Maunder's curve": _("arc of vision above Maunder's curve"),
    "arc of vision above Schoch's curve": _("arc of vision above Schoch's curve"),
    "conjunction before dawn": _("time from the conjunction to the dawn"),
    "conjunction before the hour": _("time from the conjunction to the hour set"),
    "elongation": _("elongation of the Moon from the Sun"),
    "illuminated part": _("illuminated part of the disc"),
    "lag": _("lag of moonset after sunset"),
    "Odeh's V": _("Odeh value V"),
    "relative azimuth": _("relative azimuth"),
    "width": _("width of the crescent"),
    "Yallop's q": _("Yallop value q"),
})
"""By the name that the sky gives them. A name that is missing here is shown as it is."""

FRAMES: Mapping[str, str] = MappingProxyType({
    "airless": _("airless"),
    "at best time": _("at best time"),
    "at sunset": _("at sunset"),
    "before 24:00 UT of the date": _("before 24:00 UT of the date"),
    "before 12:00 UT of the date": _("before 12:00 UT of the date"),
    "before 21:00 UT of the day before": _("before 21:00 UT of the day before"),
    "centre": _("centre"),
    "geocentric": _("geocentric"),
    "geocentric arcs": _("geocentric arcs"),
    "lower limb": _("lower limb"),
    "moonset minus sunset": _("moonset minus sunset"),
    "since the geocentric conjunction": _("since the geocentric conjunction"),
    "Sun 18 deg below the horizon": _("Sun 18 degrees below the horizon"),
    "topocentric": _("topocentric"),
    "topocentric arcs": _("topocentric arcs"),
    "upper limb": _("upper limb"),
    "when the Sun is 3 deg down": _("when the Sun is 3 degrees below the horizon"),
    "when the Sun is 4.5 deg down": _("when the Sun is 4.5 degrees below the horizon"),
    "with refraction": _("with refraction"),
})
"""The parts of a frame, by the words that the sky has for them. One that is missing here is shown as it is."""

SIGNS: Mapping[str, str] = MappingProxyType({
    ">=": _("at least %(limit)s"),
    ">": _("more than %(limit)s"),
    "<=": _("at most %(limit)s"),
    "<": _("less than %(limit)s"),
})

UNITS_IN_WORDS: Mapping[str, str] = MappingProxyType({
    "": "%(number)s",
    "%": _("%(number)s per cent"),
    "arcmin": _("%(number)s arc minutes"),
    "deg": _("%(number)s degrees"),
    "h": _("%(number)s hours"),
    "min": _("%(number)s minutes"),
})

UNITS_AS_SIGNS: Mapping[str, str] = MappingProxyType({
    "": "%(number)s",
    "%": _("%(number)s %%"),
    "arcmin": "%(number)s\u2032",
    "deg": "%(number)s°",
    "h": _("%(number)s h"),
    "min": _("%(number)s min"),
})

CIRCUMSTANCES: Mapping[str, tuple[tuple[str, str], ...]] = MappingProxyType({
    _("Times"): (
        ("sunset_utc", _("sunset")),
        ("best_time_utc", _("best time to look")),
        ("moonset_utc", _("moonset")),
        ("lag_min", _("lag of moonset after sunset")),
        ("age_h", _("age of the Moon at sunset")),
    ),
    _("At sunset"): (
        ("moon_altitude_topocentric_deg", _("altitude of the Moon, from the place, airless")),
        ("moon_altitude_refracted_deg", _("the same with refraction")),
        ("moon_altitude_geocentric_deg", _("the same from the Earth's centre, airless")),
        ("moon_azimuth_deg", _("azimuth of the Moon, from north through east")),
        ("sun_azimuth_deg", _("azimuth of the Sun, from north through east")),
        ("elongation_topocentric_deg", _("elongation (ARCL), from the place")),
        ("elongation_geocentric_deg", _("elongation (ARCL), from the Earth's centre")),
        ("illuminated_percent", _("illuminated part of the disc")),
    ),
    _("At best time"): (
        ("best_moon_altitude_topocentric_deg", _("altitude of the Moon, from the place, airless")),
        ("best_moon_azimuth_deg", _("azimuth of the Moon, from north through east")),
        ("best_sun_altitude_deg", _("altitude of the Sun")),
        ("best_sun_azimuth_deg", _("azimuth of the Sun, from north through east")),
        ("best_arc_of_vision_topocentric_deg", _("arc of vision (ARCV), from the place")),
        ("best_arc_of_vision_geocentric_deg", _("arc of vision (ARCV), from the Earth's centre")),
        ("best_elongation_topocentric_deg", _("elongation (ARCL), from the place")),
        ("best_elongation_geocentric_deg", _("elongation (ARCL), from the Earth's centre")),
        ("best_relative_azimuth_deg", _("relative azimuth (DAZ)")),
        ("best_width_topocentric_arcmin", _("width of the crescent (W), from the place")),
        ("best_width_geocentric_arcmin", _("width of the crescent (W), from the Earth's centre")),
    ),
    _("Published scales"): (
        ("yallop_q", _("Yallop's q (1997)")),
        ("odeh_v", _("Odeh's V (2004)")),
    ),
})
"""Heading -> key and label of each circumstance. The unit is the last word of the key."""

OUTCOMES: Mapping[str, str] = MappingProxyType({
    "seen": _("seen"),
    "not-seen": _("not seen"),
    "could-not-look": _("could not look"),
})

AIDS: Mapping[str, str] = MappingProxyType({
    "naked-eye": _("naked eye"),
    "binoculars": _("binoculars"),
    "telescope": _("telescope"),
    "camera": _("camera"),
})

DECIMALS: Mapping[str, int] = MappingProxyType({"": 3, "%": 2, "arcmin": 2, "deg": 2, "h": 1, "min": 1})
"""Of a circumstance in a table: as many as conventions and the state of the air leave sure, and one more."""

UNIT_OF_KEY: Mapping[str, str] = MappingProxyType({
    "deg": "deg", "arcmin": "arcmin", "min": "min", "h": "h", "percent": "%",
})
