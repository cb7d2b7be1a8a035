"""VTIMEZONE components (RFC 5545, 3.6.5), a change of the clocks at a time.

The rules that icalendar writes, with RDATE, put the start of summer time an hour late and are misread by ical.js;
single changes are read alike by every client that was tried.
"""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from functools import cache
from zoneinfo import ZoneInfo

from icalendar import Timezone, TimezoneDaylight, TimezoneStandard

_HOUR = timedelta(hours=1)


@cache
def vtimezone(zone: ZoneInfo, first_year: int, last_year: int) -> Timezone:
    """The zone's offsets in some civil years, both included."""
    first, last = (datetime(year, 1, 1, tzinfo=UTC) for year in (first_year, last_year + 1))
    out = Timezone()
    out.add("tzid", zone.key)
    before = first.astimezone(zone)
    out.add_component(_observance(before.replace(tzinfo=None), before, before))
    for moment in changes(zone, first, last):
        earlier, after = (moment - _HOUR).astimezone(zone), moment.astimezone(zone)
        offset = earlier.utcoffset() or timedelta(0)
        # The onset is told by the clock as it was (RFC 5545, 3.6.5).
        out.add_component(_observance((moment + offset).replace(tzinfo=None), earlier, after))
    return out


@cache
def changes(zone: ZoneInfo, first: datetime, last: datetime) -> tuple[datetime, ...]:
    """The first minute (UTC) of each other offset or name; found day by day, and then by halving."""
    day, found = first, []
    while day < last:
        end = min(day + timedelta(days=1), last)
        if _told(zone, day) != _told(zone, end):
            low, high = day, end
            while high - low > timedelta(minutes=1):
                middle = low + (high - low) / 2
                low, high = (low, middle) if _told(zone, middle) != _told(zone, low) else (middle, high)
            found.append(high.replace(second=0, microsecond=0))  # clocks change at whole minutes
        day = end
    return tuple(found)


def _told(zone: ZoneInfo, moment: datetime) -> tuple[timedelta | None, str | None]:
    local = moment.astimezone(zone)
    return local.utcoffset(), local.tzname()


def _observance(onset: datetime, before: datetime, after: datetime) -> TimezoneStandard | TimezoneDaylight:
    made = TimezoneDaylight() if after.dst() else TimezoneStandard()
    made.add("dtstart", onset)
    made.add("tzoffsetfrom", before.utcoffset())
    made.add("tzoffsetto", after.utcoffset())
    made.add("tzname", after.tzname())
    return made


__all__ = ["changes", "vtimezone"]
