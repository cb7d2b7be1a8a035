"""Pictures as SVG, drawn from the data; colours and patterns are classes of the style sheet."""

from __future__ import annotations

from collections.abc import Sequence
from html import escape
from math import copysign, cos, log10, pi, radians, sin

from moonwrit.almanac import Almanac, Evening
from moonwrit.policy import Margin, Month
from moonwrit.publish import words
from moonwrit.publish.language import Language

_SHAPES = {"expected": "ring", "settled": "disc", "amended": "diamond"}


def reach(margin: Margin) -> float:
    """-1 to 1: where a margin is drawn. Equal steps are tenfold: the edge is at the middle, a whole day at the end."""
    if margin.day_share is None:
        return 0.0
    size = abs(margin.day_share)
    return copysign(min(1.0, max(0.0, 1 + log10(max(size, 1e-3)) / 3)), margin.day_share)


def margins_strip(months: Sequence[Month], language: Language) -> str:
    """The months of a year side by side: how far each stood from the limit, above or below it."""
    width, height, step, middle = 760, 262, 60, 84
    parts = [
        f'<line class="axis" x1="0" y1="{middle}" x2="{width}" y2="{middle}"/>',
        f'<rect class="near" x="0" y="{middle - 30}" width="{width}" height="60"/>',
    ]
    for index, month in enumerate(months):
        x = 40 + step * index + step / 2
        y = middle - 70 * reach(month.margin)
        kind = month.margin.closeness
        if kind == "fixed":
            parts.append(f'<rect class="bar fixed" x="{x - 9:.1f}" y="{middle - 4}" width="18" height="8"/>')
        else:
            parts.append(f'<line class="stem {kind}" x1="{x:.1f}" y1="{middle}" x2="{x:.1f}" y2="{y:.1f}"/>')
            parts.append(_mark(_SHAPES[month.standing], kind, x, y))
        name = escape(language.month(month.month))
        parts.append(
            f'<text class="name" transform="translate({x + 6:.1f} {middle + 90}) rotate(-40)" text-anchor="end">'
            f"{name}</text>"
        )
    label = escape(language.gettext("How far each month stood from the limit"))
    return _svg(width, height, label, "strip", parts)


def _mark(shape: str, kind: str, x: float, y: float) -> str:
    if shape == "disc":
        return f'<circle class="mark disc {kind}" cx="{x:.1f}" cy="{y:.1f}" r="6"/>'
    if shape == "ring":
        return f'<circle class="mark ring {kind}" cx="{x:.1f}" cy="{y:.1f}" r="5.5"/>'
    return f'<path class="mark diamond {kind}" d="M{x:.1f} {y - 7.5:.1f}l7 7.5-7 7.5-7-7.5z"/>'


def horizon(evening: Evening, place: str, place_name: str, language: Language) -> str:
    """The western sky over one place, to scale: Sun and Moon at sunset and the Moon at best time."""
    row = evening.at[place]
    values = {
        key: row[key] for key in (
            "sun_azimuth_deg", "moon_azimuth_deg", "moon_altitude_topocentric_deg", "best_moon_azimuth_deg",
            "best_moon_altitude_topocentric_deg",
        )
    }
    if not all(isinstance(value, float | int) for value in values.values()):
        return ""
    sun_az, moon_az, moon_alt, best_az, best_alt = (float(value) for value in values.values() if value is not None)
    middle = sun_az + _turn(moon_az - sun_az) / 2
    half = max(15.0, abs(_turn(moon_az - sun_az)) / 2 + 8)
    top = max(14.0, moon_alt + 4)
    scale = 720 / (2 * half)
    ground = top * scale + 10
    height = ground + 56

    def at(azimuth: float, altitude: float) -> tuple[float, float]:
        return 360 + _turn(azimuth - middle) * scale, ground - altitude * scale

    parts = [f'<rect class="ground" x="0" y="{ground:.1f}" width="720" height="56"/>']
    for altitude in range(5, int(top) + 1, 5):
        y = ground - altitude * scale
        parts.append(f'<line class="grid" x1="0" y1="{y:.1f}" x2="720" y2="{y:.1f}"/>')
        parts.append(f'<text class="tick" x="4" y="{y - 3:.1f}">{language.number(altitude, 0)}°</text>')
    start = int((middle - half) // 5 + 1) * 5
    for azimuth in range(start, int(middle + half) + 1, 5):
        x, _ = at(azimuth, 0)
        parts.append(f'<line class="grid" x1="{x:.1f}" y1="{ground:.1f}" x2="{x:.1f}" y2="{ground + 6:.1f}"/>')
        parts.append(
            f'<text class="tick" text-anchor="middle" x="{x:.1f}" y="{ground + 20:.1f}">'
            f"{language.number(azimuth % 360, 0)}°</text>"
        )
    radius = max(3.5, 0.26 * scale)
    sun_x, sun_y = at(sun_az, -0.83)
    parts.append(f'<circle class="sun" cx="{sun_x:.1f}" cy="{sun_y:.1f}" r="{radius:.1f}"/>')
    x0, y0 = at(moon_az, moon_alt)
    x1, y1 = at(best_az, best_alt)
    parts.append(f'<line class="path" x1="{x0:.1f}" y1="{y0:.1f}" x2="{x1:.1f}" y2="{y1:.1f}"/>')
    lean = _lean(sun_x - x0, sun_y - y0)
    parts.append(_crescent("moon", x0, y0, radius * 1.6, lean))
    parts.append(_crescent("moon best", x1, y1, radius * 1.6, lean))
    side = 1 if x0 < 560 else -1
    anchor = "start" if side == 1 else "end"
    for x, y, text in (
        (x0, y0, language.gettext("at sunset")), (x1, y1 + 4, language.gettext("at best time")),
    ):
        parts.append(
            f'<text class="name" text-anchor="{anchor}" x="{x + side * radius * 2.4:.1f}" y="{y:.1f}">'
            f"{escape(text)}</text>"
        )
    parts.append(
        f'<text class="name" text-anchor="middle" x="360" y="{ground + 44:.1f}">'
        f'{escape(language.gettext("azimuth, from north through east"))}</text>'
    )
    label = escape(language.gettext("Where to look from %(place)s, to scale") % {"place": place_name})
    return _svg(720, round(height), label, "horizon", parts)


def _turn(degrees: float) -> float:
    return (degrees + 180) % 360 - 180


def _lean(dx: float, dy: float) -> float:
    """Degrees to turn a crescent whose lit limb points to the right, so that it points to the Sun."""
    from math import atan2, degrees

    return degrees(atan2(dy, dx))


def _crescent(kind: str, x: float, y: float, r: float, lean: float) -> str:
    inner = r * 0.86
    path = f"M0 {-r:.2f}A{r:.2f} {r:.2f} 0 0 1 0 {r:.2f}A{inner * 1.25:.2f} {inner * 1.25:.2f} 0 0 0 0 {-r:.2f}z"
    return f'<path class="{kind}" transform="translate({x:.1f} {y:.1f}) rotate({lean:.1f})" d="{path}"/>'


def seasons(almanac: Almanac, month: int, language: Language) -> str:
    """The drift of one lunar month through the civil year: its first days over the years of the calendar, and on
    by the mean lunar year (354.367 days) through a whole round of the seasons."""
    size, centre, radius = 360, 180, 128
    known = [one for one in almanac.months if one.month == month]
    parts = [f'<circle class="axis" cx="{centre}" cy="{centre}" r="{radius}"/>']
    for civil in range(12):
        angle = civil / 12 * 2 * pi
        x, y = centre + (radius + 26) * sin(angle), centre - (radius + 26) * cos(angle)
        from datetime import date

        parts.append(
            f'<line class="grid" x1="{centre + radius * sin(angle):.1f}" y1="{centre - radius * cos(angle):.1f}" '
            f'x2="{centre + (radius + 8) * sin(angle):.1f}" y2="{centre - (radius + 8) * cos(angle):.1f}"/>'
            f'<text class="tick" text-anchor="middle" x="{x:.1f}" y="{y + 4:.1f}">'
            f"{escape(language.short_civil_month(date(2025, civil + 1, 1)))}</text>"
        )
    first = known[0].starts
    for later in range(33):
        day = first.timetuple().tm_yday - 1 + later * 354.36707
        angle = radians(day / 365.2422 * 360)
        r = radius - 8 - later * 2.6
        known_now = later < len(known)
        if known_now:
            angle = radians((known[later].starts.timetuple().tm_yday - 1) / 365.2422 * 360)
        kind = "disc" if known_now else "ring"
        x, y = centre + r * sin(angle), centre - r * cos(angle)
        parts.append(f'<circle class="mark {kind} wide" cx="{x:.1f}" cy="{y:.1f}" r="{4.5 if known_now else 3}"/>')
    label = escape(
        language.gettext("The first day of %(month)s moves through the seasons") % {"month": language.month(month)}
    )
    return _svg(size, size, label, "seasons", parts)


def _svg(width: int, height: int, label: str, kind: str, parts: Sequence[str]) -> str:
    return (
        f'<svg class="picture {kind}" role="img" aria-label="{label}" viewBox="0 0 {width} {height}">'
        + "".join(parts) + "</svg>"
    )


__all__ = ["horizon", "margins_strip", "reach", "seasons", "words"]
