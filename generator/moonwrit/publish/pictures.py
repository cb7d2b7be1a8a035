"""Pictures as SVG, drawn from the data: each with a title and a description in words.

Colours, line patterns and the size of letters are classes of the style sheet; what differs in colour differs in shape
too. Lengths are units of the view box.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import date, datetime
from html import escape
from math import acos, asin, atan2, ceil, copysign, cos, degrees, floor, log10, pi, radians, sin
from typing import NamedTuple
from zoneinfo import ZoneInfo

from moonwrit.policy import Margin, Month, Standing
from moonwrit.policy.conditions import EDGE_SHARE
from moonwrit.policy.differ import LongRun
from moonwrit.policy.evening import Row
from moonwrit.publish import words
from moonwrit.publish.labels import STANDINGS
from moonwrit.publish.language import Language

LETTER = 14.0
"""The size of letters (``.picture text`` in the style sheet)."""

_LETTER_WIDTH = 0.6 * LETTER
"""A generous mean over the sans-serif faces of the style sheet."""


def text_width(text: str) -> float:
    """An estimate from above, for keeping labels inside a picture."""
    return len(text) * _LETTER_WIDTH


# --- how far each month stood from the limit ----------------------------------------------------------


def reach(margin: Margin) -> float:
    """-1 to 1: where a margin is drawn. Equal steps are tenfold: the edge is at the middle, a whole day at the end."""
    if margin.day_share is None:
        return 0.0
    return _reach(margin.day_share)


def _reach(day_share: float) -> float:
    return copysign(min(1.0, max(0.0, 1 + log10(max(abs(day_share), 1e-3)) / 3)), day_share)


def margins_strip(months: Sequence[Month], language: Language) -> str:
    """The months of a year one below the other: how far each stood from the limit, and on which side of it."""
    _ = language.gettext
    names = [language.month(month.month) for month in months]
    beside = ceil(max(text_width(name) for name in [*names, _("days")]))
    step, half, top = 22, 96, 24
    middle = beside + 16 + half
    width = middle + half + 20
    bottom = top + step * len(months)

    def x_of(share: float) -> float:
        return middle + half * _reach(share)

    parts = [
        f'<rect class="near" x="{x_of(-EDGE_SHARE):.1f}" y="{top}" width="{2 * half * _reach(EDGE_SHARE):.1f}" '
        f'height="{bottom - top}"/>',
        _text(x_of(-1) - 8, 15, _("not met"), "tick"), _text(middle, 15, _("limit"), "tick", "middle"),
        _text(x_of(1) + 8, 15, _("met"), "tick", "end"),
    ]
    parts.append(_text(beside, bottom + 16, _("days"), "tick", "end"))
    for share in (-1.0, -0.1, -0.01, 0.01, 0.1, 1.0):
        x = x_of(share)
        parts += [
            _line("grid", x, top, x, bottom),
            _text(x, bottom + 16, language.number(abs(share), 2), "tick share", "middle"),
        ]
    parts.append(_line("axis", middle, top - 4, middle, bottom + 4))
    for index, (month, name) in enumerate(zip(months, names, strict=True)):
        y = top + step * (index + 0.5)
        kind = month.margin.closeness
        parts.append(_text(beside, y + 5, name, "name", "end"))
        if kind == "fixed":
            parts.append(f'<rect class="bar fixed" x="{middle - 9}" y="{y - 4:.1f}" width="18" height="8"/>')
        else:
            x = middle + half * reach(month.margin)
            parts += [_line(f"stem {kind}", middle, y, x, y), _standing(month.standing, x, y)]
    standings = {month.standing for month in months}
    x = 8.0
    for one in STANDINGS:
        if one not in standings:
            continue
        word = words.standing(one, language)
        parts += [_standing(one, x + 6, bottom + 38), _text(x + 19, bottom + 43, word, "tick")]
        x += 19 + text_width(word) + 12
    told = []
    for month, name in zip(months, names, strict=True):
        said = [words.closeness(month.margin.closeness, language), words.standing(month.standing, language)]
        if month.margin.closeness != "fixed":
            said.insert(1, _("met") if reach(month.margin) > 0 else _("not met"))
        told.append(f"{name}: {language.listing(said)}.")
    return _svg(width, bottom + 52, _("How far each month stood from the limit"), " ".join(told), "strip", parts)


def _standing(standing: Standing, x: float, y: float) -> str:
    match standing:
        case "settled":
            return f'<circle class="mark disc" cx="{x:.1f}" cy="{y:.1f}" r="6"/>'
        case "expected":
            return f'<circle class="mark ring" cx="{x:.1f}" cy="{y:.1f}" r="5.5"/>'
        case _:
            return f'<path class="mark diamond" d="M{x:.1f} {y - 7.5:.1f}l7 7.5-7 7.5-7-7.5z"/>'


# --- where to look ------------------------------------------------------------------------------------

_SET_DEG = -0.83
"""Airless altitude of the centre of Sun or Moon as the upper limb sets: 34' of refraction and a mean 16' of radius."""

_SUN_DEG = 0.8
"""The Sun is drawn with this radius, three times its own: as large as lets it touch the horizon from below."""

_MOON_DEG = 0.26


class _Mark(NamedTuple):
    """A Moon at an azimuth (counted from the Sun's) and an altitude, with its label on one side."""

    azimuth: float
    altitude: float
    label: str
    side: int


def horizon(row: Row, zone: ZoneInfo, place: str, language: Language) -> str:
    """The western sky over one place, to scale: the Sun at sunset, the Moon then, at best time and as it sets.

    ``row`` holds the circumstances of the evening there. Empty where the Sun does not set.
    """
    _ = language.gettext
    sunset = _moment(row, "sunset_utc")
    if sunset is None:
        return ""

    def clock(moment: datetime) -> str:
        return language.clock(moment.astimezone(zone))

    def degree(value: float) -> str:
        return f"{language.number(value, 1)}°"

    sun_azimuth, azimuth, altitude = (
        _number(row, key) for key in ("sun_azimuth_deg", "moon_azimuth_deg", "moon_altitude_topocentric_deg")
    )
    moon = [(azimuth, altitude)]
    names = [_("Moon %(time)s") % {"time": clock(sunset)}]
    suns = [(sun_azimuth, _SET_DEG)]
    told = [
        _("At sunset, %(time)s, the Moon stands at altitude %(altitude)s, azimuth %(azimuth)s; the Sun sets at azimuth "
          "%(sun)s.") % {
            "time": clock(sunset), "altitude": degree(altitude), "azimuth": degree(azimuth), "sun": degree(sun_azimuth),
        }
    ]
    best, moonset = _moment(row, "best_time_utc"), _moment(row, "moonset_utc")
    if moonset is not None and moonset <= sunset:
        told.append(_("The Moon has set before, at %(time)s.") % {"time": clock(moonset)})
    elif moonset is not None and best is not None:
        moon.append((_number(row, "best_moon_azimuth_deg"), _number(row, "best_moon_altitude_topocentric_deg")))
        suns.append((_number(row, "best_sun_azimuth_deg"), _number(row, "best_sun_altitude_deg")))
        onward = (moonset - best) / (best - sunset) if best > sunset else 0.0
        moon.append((_setting_azimuth(moon, onward, _number(row, "latitude_deg")), _SET_DEG))
        names += [
            _("%(time)s best time") % {"time": clock(best)}, _("%(time)s moonset") % {"time": clock(moonset)},
        ]
        told += [
            _("At best time, %(time)s, it stands at altitude %(altitude)s, azimuth %(azimuth)s.") % {
                "time": clock(best), "altitude": degree(moon[1][1]), "azimuth": degree(moon[1][0]),
            },
            _("It sets at %(time)s, at azimuth %(azimuth)s.") % {
                "time": clock(moonset), "azimuth": degree(moon[2][0]),
            },
        ]
    title = _("Where to look from %(place)s, to scale") % {"place": place}
    sky = _Sky(sun_azimuth, moon, names, _("Sun %(time)s") % {"time": clock(sunset)})
    return _svg(_Sky.WIDTH, ceil(sky.height), title, " ".join(told), "horizon", sky.parts(suns, language))


class _Sky:
    """Degrees of azimuth and altitude put on paper, one scale for both, so that marks and labels fit."""

    WIDTH = 320
    _LEFT, _RIGHT, _TOP = 32.0, 314.0, 26.0
    _WIDEST = 12.0  # units for a degree
    _TALLEST = 160.0
    _MOON = 10.0  # radius

    def __init__(
        self, sun_azimuth: float, moon: Sequence[tuple[float, float]], names: Sequence[str], sun_name: str
    ) -> None:
        self.sun_azimuth = sun_azimuth
        places = [(_turn(azimuth - sun_azimuth), altitude) for azimuth, altitude in moon]
        self.sun_name = sun_name
        top = max(6.0, places[0][1] + 1.6)
        limit = min(self._WIDEST, self._TALLEST / top)
        drift = -1 if places[-1][0] < places[0][0] else 1
        self.moon = max((
            [_Mark(*place, name, drift if index == 2 else side)  # the setting Moon's beyond the end of its path
             for index, (place, name) in enumerate(zip(places, names, strict=True))]
            for side in (1, -1)
        ), key=self._scale)
        self.scale = min(limit, self._scale(self.moon))
        low, high = self._ends(self.moon)
        middle = (self._LEFT + self._RIGHT) / 2
        self.sun_x = middle - (max(x * self.scale + more for x, more in high)
                               + min(x * self.scale - more for x, more in low)) / 2
        self.top = max(top, (17 * len(names) + 10) / self.scale)
        self.ground = self._TOP + self.top * self.scale
        sunk = max((_SUN_DEG - _SET_DEG) * self.scale, self._MOON - min(0.0, places[0][1]) * self.scale)
        self.bottom = self.ground + sunk + 20
        self.height = self.bottom + 38

    def _ends(self, moon: Sequence[_Mark]) -> tuple[list[tuple[float, float]], list[tuple[float, float]]]:
        """How far everything reaches to the left and to the right: degrees, and units beyond them."""
        def more(mark: _Mark, side: int) -> float:
            return self._MOON + 4 + (4 + text_width(mark.label) if mark.side == side else 0)

        return (
            [(-_SUN_DEG, 4.0), *((mark.azimuth, more(mark, -1)) for mark in moon)],
            [(_SUN_DEG, 4.0), *((mark.azimuth, more(mark, 1)) for mark in moon)],
        )

    def _scale(self, moon: Sequence[_Mark]) -> float:
        """The largest at which every pair of ends leaves room for what is between them."""
        room = self._RIGHT - self._LEFT
        low, high = self._ends(moon)
        found = [
            (room - more_left - more_right) / (right - left)
            for left, more_left in low for right, more_right in high if right > left
        ]
        return max(2.0, min(found))

    def at(self, azimuth: float, altitude: float) -> tuple[float, float]:
        return self.sun_x + _turn(azimuth - self.sun_azimuth) * self.scale, self.ground - altitude * self.scale

    def parts(self, suns: Sequence[tuple[float, float]], language: Language) -> list[str]:
        return [*self._axes(language), *self._marks(suns), *self._labels()]

    def _axes(self, language: Language) -> list[str]:
        _ = language.gettext
        parts = [
            f'<rect class="ground" x="{self._LEFT:.1f}" y="{self.ground:.1f}" '
            f'width="{self._RIGHT - self._LEFT:.1f}" height="{self.bottom - self.ground:.1f}"/>',
            _text(0, 12, _("altitude"), "tick"),
            _text(self._RIGHT, 12, _("Moon × %(times)s") % {
                "times": language.number(self._MOON / (_MOON_DEG * self.scale), 1)
            }, "tick", "end"),
            _text((self._LEFT + self._RIGHT) / 2, self.bottom + 33, _("azimuth; 270° is due west"), "tick", "middle"),
        ]
        for altitude in range(0, floor(self.top) + 1, 2 if self.top < 9 else 5):
            y = self.ground - altitude * self.scale
            parts += [
                _line("grid", self._LEFT, y, self._RIGHT, y),
                _text(self._LEFT - 4, y + 5, f"{language.number(altitude, 0)}°", "tick altitude", "end"),
            ]
        step = 5 if self.scale > 8 else 10
        first = self.sun_azimuth + (self._LEFT - self.sun_x) / self.scale
        last = self.sun_azimuth + (self._RIGHT - self.sun_x) / self.scale
        for azimuth in range(ceil(first / step) * step, floor(last / step) * step + 1, step):
            x, _y = self.at(azimuth, 0)
            parts += [_line("grid", x, self._TOP, x, self.ground), _line("grid", x, self.bottom, x, self.bottom + 4)]
            if x + 18 < self.WIDTH:
                name = f"{language.number(azimuth % 360, 0)}°"
                parts.append(_text(x, self.bottom + 17, name, "tick azimuth", "middle"))
        parts.append(_line("axis", self._LEFT, self.ground, self._RIGHT, self.ground))
        return parts

    def _marks(self, suns: Sequence[tuple[float, float]]) -> list[str]:
        points = [self._of(mark) for mark in self.moon]
        sun_x, sun_y = self.at(self.sun_azimuth, _SET_DEG)
        way = " ".join(f"{x:.1f},{y:.1f}" for x, y in points)
        parts = [
            f'<circle class="sun" cx="{sun_x:.1f}" cy="{sun_y:.1f}" r="{_SUN_DEG * self.scale:.1f}"/>',
            f'<polyline class="path" points="{way}"/>',
        ]
        for kind, (x, y), sun in zip(("early", "best"), points, suns, strict=False):
            to_x, to_y = self.at(*sun)
            parts.append(_crescent(kind, x, y, self._MOON, degrees(atan2(to_y - y, to_x - x))))
        for x, y in points[2:]:
            parts.append(f'<path class="setting" d="M{x:.1f} {y:.1f}m-5-4h10l-5 8z"/>')
        return parts

    def _labels(self) -> list[str]:
        """Beside their marks, moved up where they would overlap or sink into the ground."""
        half = text_width(self.sun_name) / 2
        x = min(max(self.sun_x, self._LEFT + half), self._RIGHT - half)
        parts = [_text(x, self.bottom - 6, self.sun_name, "name low", "middle")]
        beside = self._MOON + 4
        lowest = self.ground - 9
        for mark in sorted(self.moon, key=lambda one: one.altitude):
            x, y = self._of(mark)
            height = min(y, lowest)
            lowest = height - 17
            if y - height > 10:
                parts.append(_line("leader", x + mark.side * (beside - 2), height, x + mark.side * beside / 2, y))
            anchor = "start" if mark.side > 0 else "end"
            parts.append(_text(x + mark.side * beside, height + 5, mark.label, "name", anchor))
        return parts

    def _of(self, mark: _Mark) -> tuple[float, float]:
        return self.at(mark.azimuth + self.sun_azimuth, mark.altitude)


def _crescent(kind: str, x: float, y: float, r: float, lean: float) -> str:
    """A Moon with its lit limb turned to the Sun (``lean`` degrees, clockwise from the right). The crescent is a
    third of the disc's radius wide, for a true one could not be seen."""
    lit = f"M0 {-r:.2f}A{r:.2f} {r:.2f} 0 0 1 0 {r:.2f}A{r * 0.67:.2f} {r:.2f} 0 0 0 0 {-r:.2f}z"
    return (
        f'<g class="moon {kind}" transform="translate({x:.1f} {y:.1f}) rotate({lean:.1f})">'
        f'<circle class="dark" r="{r:.2f}"/><path class="lit" d="{lit}"/></g>'
    )


def _setting_azimuth(moon: Sequence[tuple[float, float]], onward: float, latitude_deg: float) -> float:
    """Where the Moon sets, from its places at sunset and at best time: its declination goes on changing as between
    the two, for ``onward`` times as long. Good to 0.2 degrees up to latitude 60."""
    phi, low = radians(latitude_deg), radians(_SET_DEG)
    early, best = (
        asin(sin(phi) * sin(h) + cos(phi) * cos(h) * cos(a)) for a, h in ((radians(a), radians(h)) for a, h in moon)
    )
    declination = best + (best - early) * onward
    cosine = (sin(declination) - sin(phi) * sin(low)) / (cos(phi) * cos(low))
    return 360 - degrees(acos(max(-1.0, min(1.0, cosine))))


def _turn(angle_deg: float) -> float:
    """-180 to 180."""
    return (angle_deg + 180) % 360 - 180


def _moment(row: Row, key: str) -> datetime | None:
    value = row[key]
    return datetime.fromisoformat(value) if isinstance(value, str) else None


def _number(row: Row, key: str) -> float:
    value = row[key]
    assert isinstance(value, float | int), key
    return float(value)


# --- the months and the seasons -----------------------------------------------------------------------

_LUNAR_YEAR_DAYS = 354.36707
_SEASONS_DAYS = 365.2422
_ROUND = 33
"""Lunar years in which a month goes once round the seasons, nearly."""


def seasons(known: Sequence[tuple[int, date]], month: int, language: Language) -> str:
    """The drift of one lunar month through the civil year: the years known and its first days in them, and on
    by the mean lunar year through a whole round of the seasons."""
    _ = language.gettext
    size, centre, radius = 360, 180, 128

    def at(turn: float, r: float) -> tuple[float, float]:
        return centre + r * sin(2 * pi * turn), centre - r * cos(2 * pi * turn)

    parts = [f'<circle class="axis" cx="{centre}" cy="{centre}" r="{radius}"/>']
    for civil in range(12):
        parts.append(_line("grid", *at(civil / 12, radius), *at(civil / 12, radius + 8)))
        x, y = at((civil + 0.5) / 12, radius + 22)
        parts.append(_text(x, y + 5, language.short_civil_month(date(2025, civil + 1, 1)), "tick", "middle"))
    start = known[0][1].timetuple().tm_yday - 1
    for later in range(_ROUND):
        days = start + later * _LUNAR_YEAR_DAYS
        if later < len(known):
            days = known[later][1].timetuple().tm_yday - 1
        x, y = at(days / _SEASONS_DAYS, radius - 10 - later * 2.4)
        kind, r = ("disc", 4.5) if later < len(known) else ("ring", 3)
        parts.append(f'<circle class="mark {kind}" cx="{x:.1f}" cy="{y:.1f}" r="{r}"/>')
        if later in {0, len(known) - 1, _ROUND - 1}:
            x, y = at(days / _SEASONS_DAYS, radius - 34 - later * 2.4)
            parts.append(_text(x, y + 5, language.digits(known[0][0] + later), "name", "middle"))
    names = {
        "month": language.month(month), "first": language.digits(known[0][0]),
        "last": language.digits(known[0][0] + _ROUND - 1),
    }
    told = [
        _("The civil year as a ring; from %(first)s to %(last)s the first day of %(month)s moves once round it, each "
          "year about eleven days earlier.") % names,
        *(f"{language.digits(year)}: {language.long_date(starts)}." for year, starts in known),
    ]
    title = _("The first day of %(month)s moves through the seasons") % names
    return _svg(size, size, title, " ".join(told), "seasons", parts)


# --- SVG ----------------------------------------------------------------------------------------------


def agreement(long_run: LongRun, theirs: str, language: Language) -> str:
    """A stroke for every month that another policy begins on another day: upwards later, downwards earlier, as long as
    the days are many; nothing where both agree. A column is a month, and years go on to the right."""
    _ = language.gettext
    left = ceil(max(text_width(_("later")), text_width(_("earlier")))) + 8
    right, unit, middle = 24, 12, 32
    width = left + len(long_run.days) * 1.5 + right
    later = "".join(_stroke(left, index, days, unit, middle) for index, days in enumerate(long_run.days) if days > 0)
    earlier = "".join(_stroke(left, index, days, unit, middle) for index, days in enumerate(long_run.days) if days < 0)
    parts = [_line("axis", left, middle, width - right, middle)]
    for year in range(long_run.first_year, long_run.last_year + 1):
        if year % 10 == 0:
            x = left + (year - long_run.first_year) * 18
            parts.append(_line("grid", x, middle - 28, x, middle + 28))
            parts.append(_text(x, middle + 44, language.digits(year), "tick", "middle"))
    parts += [
        _text(left - 8, middle - 8, _("later"), "tick", "end"),
        _text(left - 8, middle + 20, _("earlier"), "tick", "end"),
        f'<path class="stroke later" d="{later}"/>', f'<path class="stroke earlier" d="{earlier}"/>',
    ]
    numbers = {
        "policy": theirs, "first": language.digits(long_run.first_year), "last": language.digits(long_run.last_year),
        "same": language.digits(long_run.same), "all": language.digits(long_run.months),
        "later": language.digits(sum(days > 0 for days in long_run.days)),
        "earlier": language.digits(sum(days < 0 for days in long_run.days)),
    }
    title = _("Where %(policy)s begins months on another day, %(first)s to %(last)s AH") % numbers
    told = _("Of %(all)s months %(same)s begin on the same day, %(later)s later and %(earlier)s earlier.") % numbers
    return _svg(round(width), middle + 50, title, told, "agreement", parts)


def _stroke(left: float, index: int, days: int, unit: float, middle: float) -> str:
    return f"M{left + index * 1.5 + 0.75:g} {middle}v{-unit * max(-2, min(2, days)):g}"


def _line(kind: str, x1: float, y1: float, x2: float, y2: float) -> str:
    return f'<line class="{kind}" x1="{x1:.1f}" y1="{y1:.1f}" x2="{x2:.1f}" y2="{y2:.1f}"/>'


def _text(x: float, y: float, text: str, kind: str, anchor: str = "start") -> str:
    """Its letters lie over their own outline, where the style sheet gives them one."""
    at = f'x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}"'
    return f'<text class="{kind}" {at} paint-order="stroke">{escape(text)}</text>'


def _svg(width: int, height: int, title: str, told: str, kind: str, parts: Iterable[str]) -> str:
    return (
        f'<svg class="picture {kind}" role="img" viewBox="0 0 {width} {height}">'
        f"<title>{escape(title)}</title><desc>{escape(told)}</desc>{''.join(parts)}</svg>"
    )
