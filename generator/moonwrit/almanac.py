"""The one assembled value: months with basis, margin and standing, and dated observances.

Everything here is frozen. ``publish`` reads it and never edits it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date

from moonwrit.content import Content
from moonwrit.content.models import Calendar, Observance, Place, Region, Site
from moonwrit.observances import Occurrence, occurrences
from moonwrit.policy import Method, Month, method


@dataclass(frozen=True, slots=True)
class Almanac:
    """All that is published for one calendar (a policy speaking for a region).

    ``months`` are consecutive lunar months, first Muharram of the first year to Dhu al-Hijja of the
    last; ``occurrences`` are in order of civil date, then of the observance's name in the content.
    ``method`` is the policy made ready, with its title, source and notes. ``as_of`` is "today".
    """

    calendar_id: str
    calendar: Calendar
    site: Site
    method: Method
    region: Region
    places: Mapping[str, Place]
    observances: Mapping[str, Observance]
    months: tuple[Month, ...]
    occurrences: tuple[Occurrence, ...]
    as_of: date


def assemble(content: Content, as_of: date) -> tuple[Almanac, ...]:
    """The almanac of each calendar of the site, the main one first.

    Raises ContentError where a declaration is at fault, RequestError where a year cannot be computed.
    """
    years = content.site.years
    out = []
    for calendar_id, calendar in content.site.calendars.items():
        adopted = method(calendar.policy, content)
        months = adopted.months(years.first, years.last)
        region = content.regions[calendar.region]
        out.append(Almanac(
            calendar_id, calendar, content.site, adopted, region,
            {place: content.places[place] for place in region.places},
            content.observances, months, occurrences(content.observances, months), as_of,
        ))
    return tuple(out)


__all__ = ["Almanac", "assemble"]
