"""A civil date in the other calendars that a community may want beside its own."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import date
from functools import cache
from typing import TYPE_CHECKING

from moonwrit.errors import RequestError

if TYPE_CHECKING:
    from moonwrit.calendars import SolarHijri
    from moonwrit.content.models import OtherCalendar

TITLES: Mapping[OtherCalendar, str] = {
    "solar-hijri": "Solar Hijri",
    "solar-hijri-33": "Solar Hijri (33-year approximation)",
    "rumi": "Rumi",
    "julian": "Julian",
}
"""Calendar -> its title."""


@cache
def _astronomical() -> SolarHijri:
    from moonwrit.calendars import SolarHijri
    from moonwrit.sky.equinox import march_equinox

    return SolarHijri.from_equinoxes(march_equinox)


def in_calendar(day: date, calendar: OtherCalendar) -> str | None:
    """``day`` in another calendar as "year-month-day"; None where that calendar did not run.

    The solar Hijri calendar is the astronomical one (noon of 52.5 E) inside the ephemeris.
    """
    # Here, for the command's help needs the titles alone.
    from moonwrit.calendars import THIRTY_THREE_YEAR, julian_from_date, rumi_from_date

    try:
        match calendar:
            case "solar-hijri":
                year, month, dom = _astronomical().from_date(day)
            case "solar-hijri-33":
                year, month, dom = THIRTY_THREE_YEAR.from_date(day)
            case "julian":
                year, month, dom = julian_from_date(day)
            case "rumi":
                rumi = rumi_from_date(day)
                if rumi is None:
                    return None
                year, month, dom = rumi
    except RequestError:
        return None
    return f"{year}-{month:02d}-{dom:02d}"
