"""Published crescent criteria by name: formula, limits, frame and source of each.

"From memory" marks constants recalled rather than read in the paper named; each formula's check against
values that were published is in the tests. "Unverified" marks a criterion whose paper could not be
read and whose values could not be confirmed: it is offered with that word wherever it is shown.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from moonwrit.errors import RequestError, did_you_mean
from moonwrit.sky.circumstances import Circumstances
from moonwrit.sky.comparison import (
    All,
    Any,
    Comparison,
    Quantity,
    Rule,
    Sign,
    age,
    altitude,
    elongation,
    lag,
)
from moonwrit.sky.ephemeris import Array


@dataclass(frozen=True, slots=True)
class Grade:
    """A class or zone of a criterion: it holds where the quantity passes ``limit``."""

    label: str
    limit: float
    meaning: str


@dataclass(frozen=True, slots=True)
class Criterion:
    """A published test. Either ``quantity`` with ``grades`` (best first), or a fixed rule; ``formula`` is the test as
    a reader would write it down."""

    name: str
    title: str
    source: str
    frame: str
    quantity: Quantity | None = None
    sign: Sign = ">"
    grades: tuple[Grade, ...] = ()
    accepted: tuple[str, ...] = ()
    fixed: Rule | None = None
    unverified: bool = False
    formula: str = ""

    def rule(self, accept: Sequence[str] | None = None) -> Rule:
        """The rule that accepts the grades named (default: those for the naked eye).

        Raises RequestError for a grade that the criterion does not have, or a gap between grades.
        """
        if self.fixed is not None:
            if accept:
                raise RequestError(f"{self.title} has no classes", "drop accept")
            return self.fixed
        labels = [grade.label for grade in self.grades]
        for label in accept or ():
            if label not in labels:
                raise RequestError(f'{self.title} has no class "{label}"', did_you_mean(label, labels))
        wanted = list(accept or self.accepted)
        lowest = max(labels.index(label) for label in wanted)
        if set(labels[: lowest + 1]) != set(wanted):
            raise RequestError(
                f"{self.title}: classes {', '.join(wanted)} leave a gap",
                f"accept {', '.join(labels[: lowest + 1])}, or fewer from the end",
            )
        assert self.quantity is not None
        return Comparison(self.quantity, self.sign, self.grades[lowest].limit)

    def grade(self, value: float) -> Grade | None:
        """The grade that a value earns; None below the last."""
        for grade in self.grades:
            if value > grade.limit or (self.sign == ">=" and value == grade.limit):
                return grade
        return None


def cubic(width_arcmin: Array, constant: float) -> Array:
    """The arc of vision that Yallop (1997) and Odeh (2004) ask of a crescent of that width; degrees."""
    w = width_arcmin
    limit: Array = constant - 6.3226 * w + 0.7319 * w**2 - 0.1018 * w**3
    return limit


def yallop_width_arcmin(c: Circumstances) -> Array:
    """W': topocentric semi-diameter, geocentric angles. Yallop 1997, section 4."""
    best = c.best
    parallax = np.radians(best.moon_parallax_deg)
    semidiameter = 0.27245 * parallax
    topocentric = semidiameter * (1 + np.sin(np.radians(best.moon_altitude_geo_deg)) * np.sin(parallax))
    width: Array = np.degrees(topocentric * (1 - np.cos(np.radians(best.arcl_geo_deg)))) * 60
    return width


def _yallop_q(c: Circumstances) -> Array:
    q: Array = (c.best.arcv_geo_deg - cubic(yallop_width_arcmin(c), 11.8371)) / 10
    return q


def _odeh_v(c: Circumstances) -> Array:
    return c.best.arcv_topo_deg - cubic(c.best.width_topo_arcmin, 7.1651)


def _bruin(c: Circumstances) -> Array:
    # Bruin's curve ends at a width of 3 arcmin; wider crescents keep its last value.
    w = np.minimum(yallop_width_arcmin(c), 3.0)
    return c.best.arcv_geo_deg - (12.4023 - 9.4878 * w + 3.9512 * w**2 - 0.5632 * w**3)


FOTHERINGHAM_TABLE = ((0.0, 5.0, 10.0, 15.0, 20.0, 23.0), (12.0, 11.9, 11.4, 11.0, 10.0, 7.7))
"""DAZ -> least ARCV, degrees. The formula quoted beside it, 12 - 0.008 DAZ^2, disagrees beyond 10 degrees
(10.2 at 15, 8.8 at 20); the table is the primary statement and is what is used."""
SAAO_TABLE = ((0.0, 5.0, 10.0, 15.0, 20.0), (8.2, 7.8, 6.8, 5.7, 4.5), (6.3, 5.9, 4.9, 3.8, 2.6))
ILYAS_CURVE = ((0.0, 40.0), (10.5, 4.0))


def _fotheringham(c: Circumstances) -> Array:
    return c.sunset.arcv_geo_deg - np.interp(np.abs(c.sunset.daz_geo_deg), *FOTHERINGHAM_TABLE)


def maunder_limit_deg(daz_deg: Array) -> Array:
    """Least ARCV at a DAZ. Maunder 1911; his table ends at 20 degrees, whose value is kept beyond."""
    daz = np.minimum(np.abs(daz_deg), 20.0)
    return 11 - daz / 20 - (daz / 10) ** 2


def schoch_limit_deg(daz_deg: Array) -> Array:
    """Least ARCV at a DAZ. Schoch 1930 in the Indian almanac's quadratic form; kept beyond 20 degrees."""
    daz = np.minimum(np.abs(daz_deg), 20.0)
    return 10.3743 - 0.0137 * daz - 0.0097 * daz**2


def _saao(row: int) -> Quantity:
    def of(c: Circumstances) -> Array:
        limb = c.sunset.limb_altitude_deg(-1, refracted=True)
        return limb - np.interp(np.abs(c.sunset.daz_topo_deg), SAAO_TABLE[0], SAAO_TABLE[row])

    return Quantity("altitude above the SAAO curve", "topocentric, lower limb, with refraction, at sunset",
                    "deg", 10.0, of)


def _ilyas(c: Circumstances) -> Array:
    return c.sunset.moon_altitude_geo_deg - np.interp(np.abs(c.sunset.daz_geo_deg), *ILYAS_CURVE)


def _shaukat() -> Rule:
    def at(c: Circumstances) -> Array:
        return c.at_sun_depression(4.5).moon_altitude_geo_deg

    def arc(c: Circumstances) -> Array:
        return c.at_sun_depression(4.5).arcl_geo_deg

    frame = "geocentric, airless, when the Sun is 4.5 deg down"
    return All((
        Comparison(Quantity("elongation", frame, "deg", 11.0, arc), ">=", 10.6),
        Comparison(Quantity("elongation", frame, "deg", 11.0, arc), "<=", 90.0),
        Comparison(Quantity("altitude", frame, "deg", 10.0, at), ">", 4.1),
    ))


def _sheet_six() -> Rule:
    frame = "topocentric, airless, when the Sun is 3 deg down"
    return All((
        Comparison(elongation("topocentric"), ">", 10.0),
        Comparison(
            Quantity("altitude", frame, "deg", 10.0, lambda c: c.at_sun_depression(3.0).moon_altitude_topo_deg),
            ">", 5.0,
        ),
    ))


_NAKED_EYE = "at best time, naked eye"
_AS_TN69 = "as quoted in Yallop 1997 (NAO Technical Note 69), from memory"

CRITERIA: dict[str, Criterion] = {c.name: c for c in (
    Criterion(
        "yallop-1997", "Yallop 1997",
        "B. D. Yallop, A Method for Predicting the First Sighting of the New Crescent Moon, NAO Technical "
        "Note 69 (1997, revised 1998), sections 2-4 and Table 5; constants from memory",
        "ARCV and ARCL geocentric, width with the topocentric semi-diameter, at best time",
        Quantity("Yallop's q", "geocentric arcs, at best time", "", 1.4, _yallop_q), ">",
        (
            Grade("A", 0.216, "easily visible to the naked eye"),
            Grade("B", -0.014, "visible to the naked eye under perfect conditions"),
            Grade("C", -0.160, "may need optical aid to find the crescent"),
            Grade("D", -0.232, "needs optical aid"),
            Grade("E", -0.293, "not visible even with a telescope"),
        ),
        ("A", "B"),
        formula="q = (ARCV − (11.8371 − 6.3226 W′ + 0.7319 W′² − 0.1018 W′³)) / 10, W′ = SD′ (1 − cos "
        "ARCL) in arc minutes, SD′ = 0.27245 π (1 + sin h sin π)",
    ),
    Criterion(
        "odeh-2004", "Odeh 2004",
        "M. Sh. Odeh, New Criterion for Lunar Crescent Visibility, Experimental Astronomy 18, 39-64 (2004); "
        "topocentric frame found in the abstract, constants from memory",
        "topocentric ARCV (airless) and topocentric width, at best time",
        Quantity("Odeh's V", "topocentric arcs, at best time", "", 14.0, _odeh_v), ">=",
        (
            Grade("A", 5.65, "visible to the naked eye"),
            Grade("B", 2.00, "visible with optical aid, perhaps to the naked eye"),
            Grade("C", -0.96, "visible with optical aid only"),
        ),
        ("A", "B"),
        formula="V = ARCV − (7.1651 − 6.3226 W + 0.7319 W² − 0.1018 W³), W in arc minutes",
    ),
    Criterion(
        "fotheringham-1910", "Fotheringham 1910",
        "J. K. Fotheringham, On the Smallest Visible Phase of the Moon, MNRAS 70, 527 (1910); table from memory",
        "geocentric ARCV against DAZ at sunset",
        fixed=Comparison(
            Quantity("arc of vision above Fotheringham's curve", "geocentric, airless, at sunset", "deg", 10.0,
                     _fotheringham), ">=", 0.0),
        formula="ARCV at least 12.0, 11.9, 11.4, 11.0, 10.0, 7.7 degrees at DAZ 0, 5, 10, 15, 20, 23",
    ),
    Criterion(
        "maunder-1911", "Maunder 1911",
        "E. W. Maunder, On the Smallest Visible Phase of the Moon, JBAA 21, 355 (1911); from memory",
        "geocentric ARCV against DAZ at sunset",
        fixed=Comparison(
            Quantity("arc of vision above Maunder's curve", "geocentric, airless, at sunset", "deg", 10.0,
                     lambda c: c.sunset.arcv_geo_deg - maunder_limit_deg(c.sunset.daz_geo_deg)), ">=", 0.0),
        formula="ARCV at least 11 − |DAZ|/20 − (DAZ/10)²",
    ),
    Criterion(
        "schoch-1930", "Schoch 1930 (Indian)",
        f"C. Schoch, 1930, in the form of the Indian Astronomical Ephemeris, {_AS_TN69}",
        "geocentric ARCV against DAZ at sunset",
        fixed=Comparison(
            Quantity("arc of vision above Schoch's curve", "geocentric, airless, at sunset", "deg", 10.0,
                     lambda c: c.sunset.arcv_geo_deg - schoch_limit_deg(c.sunset.daz_geo_deg)), ">=", 0.0),
        formula="ARCV at least 10.3743 − 0.0137 |DAZ| − 0.0097 DAZ²",
    ),
    Criterion(
        "bruin-1977", "Bruin 1977",
        f"F. Bruin, The First Visibility of the Lunar Crescent, Vistas in Astronomy 21, 331 (1977), {_AS_TN69}",
        "geocentric ARCV against the width, at best time",
        fixed=Comparison(
            Quantity("arc of vision above Bruin's curve", "geocentric, airless, at best time", "deg", 10.0,
                     _bruin), ">=", 0.0),
        formula="ARCV at least 12.4023 − 9.4878 W + 3.9512 W² − 0.5632 W³, W in arc minutes",
    ),
    Criterion(
        "saao-2001-probable", "SAAO, probable (Caldwell & Laney 2001)",
        "J. A. R. Caldwell and C. D. Laney, African Skies 5, 15 (2001); table from memory, not confirmed",
        "apparent altitude of the Moon's lower limb against DAZ, topocentric, at sunset",
        fixed=Comparison(_saao(1), ">", 0.0), unverified=True,
        formula="lower limb above 8.2, 7.8, 6.8, 5.7, 4.5 degrees at DAZ 0, 5, 10, 15, 20",
    ),
    Criterion(
        "saao-2001-possible", "SAAO, not impossible (Caldwell & Laney 2001)",
        "J. A. R. Caldwell and C. D. Laney, African Skies 5, 15 (2001); table from memory, not confirmed",
        "apparent altitude of the Moon's lower limb against DAZ, topocentric, at sunset",
        fixed=Comparison(_saao(2), ">=", 0.0), unverified=True,
        formula="lower limb at least 6.3, 5.9, 4.9, 3.8, 2.6 degrees at DAZ 0, 5, 10, 15, 20",
    ),
    Criterion(
        "ilyas-1988", "Ilyas (altitude and azimuth)",
        "M. Ilyas, 1984-1994; only the curve's ends are recalled, a straight line between them, not confirmed",
        "geocentric altitude against DAZ at sunset",
        fixed=Comparison(
            Quantity("altitude above the Ilyas curve", "geocentric, airless, at sunset", "deg", 10.0, _ilyas),
            ">=", 0.0),
        unverified=True,
        formula="altitude at least 10.5 degrees at DAZ 0, falling in a straight line to 4 at DAZ 40",
    ),
    Criterion(
        "rgo-sheet-6", "RGO sheet 6",
        "Royal Greenwich Observatory, Astronomical Information Sheet 6; from memory",
        "elongation above 10 deg, and altitude above 5 deg when the Sun is 3 deg down; frame taken as topocentric",
        fixed=_sheet_six(),
        formula="ARCL > 10 degrees and altitude > 5 degrees",
    ),
    Criterion(
        "babylonian", "Babylonian rule",
        "age above 24 h and lag above 48 min at sunset, as quoted in Odeh 2004, section 2.1",
        "geocentric age, lag on the standard horizon",
        fixed=All((Comparison(age(), ">", 24.0), Comparison(lag(), ">", 48.0))),
        formula="age > 24 h and lag > 48 min",
    ),
    Criterion(
        "lag-48", "Lag of 48 minutes",
        "the lag alone (twelve degrees of the equator), as other authors state the Babylonian rule; from memory",
        "lag on the standard horizon",
        fixed=Comparison(lag(), ">", 48.0),
        formula="lag > 48 min",
    ),
    Criterion(
        "shaukat", "Shaukat (Reingold & Dershowitz)",
        "E. M. Reingold and N. Dershowitz, Calendrical Calculations, 3rd edition (2008), visible crescent, there "
        "attributed to S. K. Shaukat",
        "geocentric elongation and altitude when the Sun is 4.5 deg down",
        fixed=_shaukat(),
        formula="10.6 ≤ ARCL ≤ 90 degrees and altitude > 4.1 degrees",
    ),
    Criterion(
        "danjon-7", "Danjon limit of 7 degrees",
        "A. Danjon, 1932-1936, as listed by A. H. Sultan, The Observatory 127, 53 (2007); others "
        "find 5 to 7.5 degrees",
        "topocentric elongation at best time: a floor below which no crescent is seen, not a criterion of its own",
        # An elongation is as large before the conjunction: without its age the old Moon would do as well.
        fixed=All((Comparison(elongation("topocentric", "best-time"), ">=", 7.0), Comparison(age(), ">", 0.0))),
        formula="ARCL at least 7 degrees, after the conjunction",
    ),
    Criterion(
        "mabims-1995", "MABIMS 1995 (2-3-8)",
        "altitude of 2 deg, and elongation of 3 deg or age of 8 h: a BMKG expert quoted by aktual.com, 2015; some "
        "authors ask all three",
        "altitude topocentric with refraction, elongation geocentric, at sunset",
        fixed=All((
            Comparison(altitude("topocentric", refracted=True), ">=", 2.0),
            Any((Comparison(elongation("geocentric"), ">=", 3.0), Comparison(age(), ">=", 8.0))),
        )),
        formula="altitude at least 2 degrees and (ARCL at least 3 degrees or age at least 8 h)",
    ),
    Criterion(
        "mabims-2021", "MABIMS 2021",
        "altitude of 3 deg and elongation of 6.4 deg; the frames are those in which the published angles of the "
        "Indonesian ministry (2024, 2025) reproduce. Some bulletins use topocentric elongation",
        "altitude topocentric with refraction, elongation geocentric, at sunset",
        fixed=All((
            Comparison(altitude("topocentric", refracted=True), ">=", 3.0),
            Comparison(elongation("geocentric"), ">=", 6.4),
        )),
        formula="altitude at least 3 degrees and ARCL at least 6.4 degrees",
    ),
    Criterion(
        "istanbul-5-8", "Altitude 5 and elongation 8 (Istanbul)",
        "Ru'yet-i Hilal conference, Istanbul, November 1978 (from memory); kept by the congress of 2016",
        "altitude topocentric airless, elongation geocentric, at sunset",
        fixed=All((
            Comparison(altitude("topocentric"), ">=", 5.0),
            Comparison(elongation("geocentric"), ">=", 8.0),
        )),
        formula="altitude at least 5 degrees and ARCL at least 8 degrees",
    ),
    Criterion(
        "moon-up-after-conjunction", "Conjunction before sunset, Moon still up",
        "common practice; the upper limb on the standard horizon at sunset is our choice, the convention of the "
        "authorities that use the rule was not found",
        "geocentric conjunction; moonset after sunset on the standard horizon",
        fixed=All((Comparison(age(), ">", 0.0), Comparison(lag(), ">", 0.0))),
        formula="conjunction before sunset and moonset after sunset",
    ),
    Criterion(
        "conjunction-before-sunset", "Conjunction before sunset",
        "common practice, no source",
        "geocentric conjunction in apparent longitude",
        fixed=Comparison(age(), ">", 0.0),
        formula="conjunction before sunset",
    ),
    Criterion(
        "moonset-after-sunset", "Moonset after sunset",
        "the Umm al-Qura rule of 1420-1422 AH: R. H. van Gent, The Islamic calendar, Utrecht University (web)",
        "lag on the standard horizon",
        fixed=Comparison(lag(), ">", 0.0),
        formula="moonset after sunset",
    ),
    Criterion(
        "moonset-5-minutes", "Moonset five minutes after sunset",
        "common statement of the Egyptian practice, after conjunction; from memory, later values differ",
        "geocentric conjunction; lag on the standard horizon",
        fixed=All((Comparison(age(), ">", 0.0), Comparison(lag(), ">=", 5.0))),
        formula="conjunction before sunset and moonset at least 5 min after it",
    ),
)}


def criterion(name: str) -> Criterion:
    """A published criterion by name. Raises RequestError, with the nearest name, where there is none."""
    try:
        return CRITERIA[name]
    except KeyError:
        raise RequestError(f'criterion "{name}" is not known', did_you_mean(name, CRITERIA)) from None
