"""Named quantities of an evening, comparisons on them, and how close a comparison was.

A rule is a comparison, or several of which all or any must hold. Its answer is a *share*: value minus
threshold as a share of what the quantity usually changes from one evening to the next, positive where the
test is met. Shares of different quantities can be held against each other, so that a rule of several parts
has one deciding part: the smallest share where all must hold, the largest where any may.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Literal

import numpy as np

from moonwrit.sky.circumstances import Circumstances, Instant
from moonwrit.sky.ephemeris import Array

Sign = Literal[">=", ">", "<=", "<"]
Frame = Literal["geocentric", "topocentric"]
When = Literal["sunset", "best-time"]


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number of an evening at a place. ``of`` gives it as an array [lunation, evening, place].

    ``per_day``: its usual change from one evening to the next, in ``unit``; medians over 1,240 lunations at
    0 to 50 degrees of latitude, two evenings after the conjunction, rounded.
    """

    name: str
    frame: str
    unit: str
    per_day: float
    of: Callable[[Circumstances], Array]


@dataclass(frozen=True, slots=True)
class Comparison:
    """One quantity held against a threshold."""

    quantity: Quantity
    sign: Sign
    threshold: float

    def share(self, c: Circumstances) -> Array:
        """Signed share [lunation, evening, place]; NaN where the evening has no such quantity."""
        return self.share_of(self.quantity.of(c))

    def share_of(self, value: Array) -> Array:
        gap = value - self.threshold if self.sign in (">=", ">") else self.threshold - value
        if self.sign in (">", "<"):
            gap = np.where(gap == 0, -np.finfo(np.float64).tiny, gap)
        share: Array = gap / self.quantity.per_day
        return share

    def leaves(self) -> Iterator[Comparison]:
        yield self

    def __str__(self) -> str:
        unit = f" {self.quantity.unit}" if self.quantity.unit else ""
        return f"{self.quantity.name} ({self.quantity.frame}) {self.sign} {self.threshold:g}{unit}"


@dataclass(frozen=True, slots=True)
class All:
    """Every part must hold."""

    parts: tuple[Rule, ...]

    def share(self, c: Circumstances) -> Array:
        least: Array = np.minimum.reduce([part.share(c) for part in self.parts])
        return least

    def leaves(self) -> Iterator[Comparison]:
        for part in self.parts:
            yield from part.leaves()

    def __str__(self) -> str:
        return " and ".join(f"({p})" if isinstance(p, Any) else str(p) for p in self.parts)


@dataclass(frozen=True, slots=True)
class Any:
    """One part is enough."""

    parts: tuple[Rule, ...]

    def share(self, c: Circumstances) -> Array:
        most: Array = np.maximum.reduce([part.share(c) for part in self.parts])
        return most

    def leaves(self) -> Iterator[Comparison]:
        for part in self.parts:
            yield from part.leaves()

    def __str__(self) -> str:
        return " or ".join(f"({p})" if isinstance(p, All) else str(p) for p in self.parts)


Rule = Comparison | All | Any


def met(share: Array) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
    """Is the test met? A share that is not a number (no sunset) is no."""
    return np.nan_to_num(share, nan=-1.0, posinf=1.0, neginf=-1.0) >= 0


# --- the quantities -----------------------------------------------------------------------------


def _at(when: When) -> Callable[[Circumstances], Instant]:
    return (lambda c: c.sunset) if when == "sunset" else (lambda c: c.best)


def _frame(*words: str, when: When) -> str:
    return ", ".join([*words, "at sunset" if when == "sunset" else "at best time"])


def lag() -> Quantity:
    return Quantity("lag", "moonset minus sunset", "min", 52.0, lambda c: c.lag_min)


def age() -> Quantity:
    return Quantity("age", "since the geocentric conjunction, at sunset", "h", 24.0, lambda c: c.age_h)


def altitude(
    frame: Frame,
    limb: Literal["upper", "centre", "lower"] = "centre",
    refracted: bool = False,
    when: When = "sunset",
) -> Quantity:
    """Altitude of the Moon. A geocentric altitude is of the centre and airless."""
    at, offset = _at(when), {"upper": 1, "centre": 0, "lower": -1}[limb]
    if frame == "geocentric":
        if limb != "centre" or refracted:
            raise ValueError("a geocentric altitude is of the centre and airless")
        return Quantity(
            "altitude", _frame("geocentric", "centre", "airless", when=when), "deg", 10.0,
            lambda c: at(c).moon_altitude_geo_deg,
        )
    return Quantity(
        "altitude",
        _frame("topocentric", limb if limb == "centre" else f"{limb} limb",
               "with refraction" if refracted else "airless", when=when),
        "deg", 10.0,
        lambda c: at(c).limb_altitude_deg(offset, refracted=refracted),
    )


def elongation(frame: Frame, when: When = "sunset") -> Quantity:
    """ARCL, the arc of light between the centres of Sun and Moon."""
    at = _at(when)
    if frame == "geocentric":
        return Quantity("elongation", _frame(frame, when=when), "deg", 11.0, lambda c: at(c).arcl_geo_deg)
    return Quantity("elongation", _frame(frame, when=when), "deg", 11.0, lambda c: at(c).arcl_topo_deg)


def arc_of_vision(frame: Frame, when: When = "best-time") -> Quantity:
    """ARCV, the Moon's altitude minus the Sun's, airless."""
    at = _at(when)
    words = _frame(frame, "airless", when=when)
    if frame == "geocentric":
        return Quantity("arc of vision", words, "deg", 10.0, lambda c: at(c).arcv_geo_deg)
    return Quantity("arc of vision", words, "deg", 10.0, lambda c: at(c).arcv_topo_deg)


def relative_azimuth(frame: Frame, when: When = "best-time") -> Quantity:
    """DAZ without its sign."""
    at = _at(when)
    if frame == "geocentric":
        return Quantity(
            "relative azimuth", _frame(frame, when=when), "deg", 5.0, lambda c: np.abs(at(c).daz_geo_deg)
        )
    return Quantity(
        "relative azimuth", _frame(frame, when=when), "deg", 5.0, lambda c: np.abs(at(c).daz_topo_deg)
    )


def width(frame: Frame, when: When = "best-time") -> Quantity:
    """W, the width of the crescent."""
    at = _at(when)
    if frame == "geocentric":
        return Quantity(
            "width", _frame(frame, when=when), "arcmin", 0.5, lambda c: at(c).width_geo_arcmin
        )
    return Quantity("width", _frame(frame, when=when), "arcmin", 0.5, lambda c: at(c).width_topo_arcmin)


def illumination(when: When = "sunset") -> Quantity:
    """Illuminated part of the disc, in per cent, geocentric."""
    at = _at(when)
    return Quantity(
        "illuminated part", _frame("geocentric", when=when), "%", 1.6, lambda c: at(c).illuminated_share * 100
    )


def conjunction_before_hour(hour: float) -> Quantity:
    """Hours by which the conjunction comes before a UT hour of the evening's civil date (24 = its end)."""

    def of(c: Circumstances) -> Array:
        deadline_ut = c.day[..., None] + 1721424.5 + hour / 24
        gap: Array = (deadline_ut - c.sky.ut(c.conjunction_tt)[:, None, None]) * 24
        return np.broadcast_to(gap, c.sunset_tt.shape)

    of_day = "of the day before" if hour < 0 else "of the date"
    return Quantity("conjunction before the hour", f"before {clock(hour % 24 or 24)} UT {of_day}", "h", 24.0, of)


def clock(hour: float) -> str:
    """12.5 -> 12:30"""
    minutes = round(hour * 60)
    return f"{minutes // 60}:{minutes % 60:02d}"


def conjunction_before_dawn(depression_deg: float = 18.0) -> Quantity:
    """Hours by which the conjunction comes before the dawn that ends the evening's night, there (in light nights,
    before the Sun is lowest)."""
    return Quantity(
        "conjunction before dawn", f"Sun {depression_deg:g} deg below the horizon", "h", 24.0,
        lambda c: (c.night_end_tt(depression_deg) - c.conjunction_tt[:, None, None]) * 24,
    )
