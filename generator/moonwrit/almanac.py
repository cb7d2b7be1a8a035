"""The one assembled value: months with basis, margin and standing, and dated observances.

Everything here is frozen. ``publish`` reads it and never edits it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date, datetime

from moonwrit.content.models import Calendar, Observance, Place, Region, Site
from moonwrit.content.policies import Policy
from moonwrit.observances import Occurrence
from moonwrit.policy import Month


@dataclass(frozen=True, slots=True)
class Almanac:
    """All that is published for one calendar (a policy speaking for a region).

    ``months`` are consecutive lunar months, first Muharram of the first year to Dhu al-Hijja of the
    last; ``occurrences`` are in order of civil date, then of the observance's name in the content.
    """

    calendar_id: str
    calendar: Calendar
    site: Site
    policy_id: str
    policy: Policy
    region: Region
    places: Mapping[str, Place]
    observances: Mapping[str, Observance]
    months: tuple[Month, ...]
    occurrences: tuple[Occurrence, ...]
    as_of: date
    made: datetime


__all__ = ["Almanac"]
