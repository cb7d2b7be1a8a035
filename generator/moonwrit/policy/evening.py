"""The evening of any civil date at any places, and places written as text."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from datetime import date

import numpy as np

from moonwrit.content.models import zone_named
from moonwrit.errors import RequestError, did_you_mean
from moonwrit.policy.published import NamedPlace
from moonwrit.sky import Evenings, Places, ephemeris
from moonwrit.sky.described import described, instant, iso
from moonwrit.sky.lunation import SYNODIC_DAYS, conjunction_in, near_conjunction_tt

_HALF_DAYS = 3.3


Row = dict[str, float | str | None]
"""Names with units -> numbers, or ISO 8601 UTC for instants; None where the event does not happen."""


def evening_at(on: date, places: Sequence[NamedPlace]) -> list[Row]:
    """One mapping of names with units for each place; instants are UTC.

    The conjunction is the last one before the end of the next civil date, which is taken to half an hour. Raises
    RequestError for a date outside the ephemeris.
    """
    return evenings_at([on], places)[0]


def evenings_at(dates: Sequence[date], places: Sequence[NamedPlace]) -> list[list[Row]]:
    """``evening_at`` of many dates, computed at once."""
    if not dates:
        return []
    sky = ephemeris()
    days = np.array([on.toordinal() for on in dates])
    noon_ut = days + 1721424.5 + 0.5
    windows = sky.windows(noon_ut + 0.5, _HALF_DAYS)
    k = np.floor((noon_ut[:, None] + 1.5 - 2451550.1) / SYNODIC_DAYS) + np.array([-1.0, 0.0, 1.0])
    near = near_conjunction_tt(k.astype(np.int64))
    latest = np.where(near <= noon_ut[:, None] + 1.5, near, -np.inf).max(axis=1)
    conjunction = conjunction_in(sky.windows(latest, 1.0))
    c = Evenings(sky, windows, conjunction, days[:, None]).at(Places.of([p.row for p in places]))
    at = described(c)
    return [
        [
            {
                "date": on.isoformat(),
                "place": place.name,
                "latitude_deg": place.latitude_deg,
                "longitude_deg": place.longitude_deg,
                "elevation_m": place.elevation_m,
                "timezone": place.zone.key if place.zone else None,
                "conjunction_utc": iso(instant(sky, float(conjunction[row]))),
                **at((row, 0, index)),
            }
            for index, place in enumerate(places)
        ]
        for row, on in enumerate(dates)
    ]


def place_from_text(text: str, known: Collection[str] = ()) -> NamedPlace:
    """A place from "name,lat,lon[,elevation[,zone]]". Raises RequestError where it is not one.

    Without a zone, civil dates are those of local mean time.
    """
    parts = [part.strip() for part in text.split(",")]
    if len(parts) == 1 and known:
        raise RequestError(f'place "{text}" is not known', did_you_mean(text, known))
    if not 3 <= len(parts) <= 5:
        raise RequestError(f'"{text}" is not a place', 'write "name,lat,lon,elevation,zone"')
    name, numbers, zone = parts[0], parts[1:4], parts[4] if len(parts) == 5 else None
    try:
        latitude, longitude, *rest = (float(number) for number in numbers)
    except ValueError:
        raise RequestError(f'"{text}" is not a place', "latitude, longitude and elevation are numbers") from None
    elevation = rest[0] if rest else 0.0
    if not (-90 <= latitude <= 90 and -180 <= longitude <= 180 and -500 <= elevation <= 9000):
        raise RequestError(
            f'"{text}" lies off the Earth',
            "latitude is -90 to 90, longitude -180 to 180 degrees, elevation -500 to 9000 metres",
        )
    try:
        return NamedPlace(name or "here", latitude, longitude, elevation, zone_named(zone) if zone else None)
    except ValueError as fault:
        raise RequestError(str(fault)) from None
