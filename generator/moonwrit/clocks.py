"""The clocks by which times were published: where new time-zone data change them, that is said, and no date moves.

Dates are those of the community's calendar, and stand in the journal. Times of an evening are instants, told by the
clock of the place; governments change clocks, and a later release of the time-zone data says so. What was in use is
kept beside the journal, so that a build can tell. Leap seconds change nothing: what is printed is reckoned from UT1.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from datetime import UTC, datetime, timedelta
from pathlib import Path

from pydantic import AwareDatetime, BaseModel, ConfigDict, TypeAdapter, ValidationError, model_validator

from moonwrit.almanac import Almanac
from moonwrit.errors import ContentError
from moonwrit.files import put
from moonwrit.publish.timezones import changes

FILE = "record/clocks.json"
MAX_BYTES = 4 * 1024 * 1024


class Clock(BaseModel):
    """Of a place: its zone, the civil years (both included), and minutes east of UTC from each moment (UTC) on."""

    model_config = ConfigDict(extra="forbid", frozen=True)

    zone: str
    first: int
    last: int
    offsets: tuple[tuple[AwareDatetime, int], ...]

    @model_validator(mode="after")
    def _in_order(self) -> Clock:
        moments = [since for since, _ in self.offsets]
        if not 1 <= self.first <= self.last < 9999 or moments != sorted(moments) or (
                not moments or moments[0] != datetime(self.first, 1, 1, tzinfo=UTC)):
            raise ValueError("the moments are not those of the years")
        return self

    def at(self, moment: datetime) -> int:
        return next(minutes for since, minutes in reversed(self.offsets) if since <= moment)


Clocks = Mapping[str, Clock]
"""By place id."""
_CLOCKS: TypeAdapter[dict[str, Clock]] = TypeAdapter(dict[str, Clock])


def clocks(almanacs: Iterable[Almanac]) -> dict[str, Clock]:
    """Those of every place, in the years of the evenings."""
    found = {}
    for almanac in almanacs:
        first, last = almanac.evenings[0].on.year, almanac.evenings[-1].on.year
        begin, end = (datetime(year, 1, 1, tzinfo=UTC) for year in (first, last + 1))
        for name, place in almanac.places.items():
            since = (begin, *changes(place.zone, begin, end))
            offsets = tuple((moment, _minutes(moment.astimezone(place.zone))) for moment in since)
            found[name] = Clock(zone=place.timezone, first=first, last=last, offsets=offsets)
    return found


def _minutes(local: datetime) -> int:
    return round((local.utcoffset() or timedelta()) / timedelta(minutes=1))


def read(folder: Path) -> dict[str, Clock]:
    """Those of the last build of a content folder; empty where there is no file that says so."""
    try:
        with (folder / FILE).open("rb") as file:
            found = _CLOCKS.validate_json(file.read(MAX_BYTES))
    except (OSError, ValidationError):
        return {}
    return found


def notes(before: Clocks, after: Clocks) -> list[str]:
    """What new time-zone data change for a place whose zone is the same, in years that were published before."""
    said = []
    for name, now in after.items():
        then = before.get(name)
        if then is None or then.zone != now.zone:
            continue
        first, last = max(then.first, now.first), min(then.last, now.last)
        begin, end = (datetime(year, 1, 1, tzinfo=UTC) for year in (first, last + 1))
        moments = sorted({begin, *(since for since, _ in (*then.offsets, *now.offsets) if begin < since < end)})
        other = [moment for moment in moments if moment < end and then.at(moment) != now.at(moment)]
        if other:
            was, is_now = (_told(clock.at(other[0])) for clock in (then, now))
            said.append(
                f"the time-zone data of {now.zone} have changed: from {other[0]:%Y-%m-%d} on clocks at {name} show "
                f"UTC{is_now}, and UTC{was} was published; times there are published anew, and no date moves for it"
            )
    return said


def _told(minutes: int) -> str:
    hours, rest = divmod(abs(minutes), 60)
    return f"{'-' if minutes < 0 else '+'}{hours:02d}:{rest:02d}"


def keep(folder: Path, before: Clocks, after: Clocks) -> None:
    """Write them down where they are others; done once the site is in place. Raises ContentError."""
    if before == after:
        return
    file = folder / FILE
    rows: Sequence[str] = [f'"{name}":{clock.model_dump_json()}' for name, clock in after.items()]
    try:
        put(file, ("{\n" + ",\n".join(rows) + "\n}\n").encode())
    except OSError as fault:
        raise ContentError(file, 0, f"the clocks cannot be written ({fault.strerror})", "mend its folder") from None


__all__ = ["FILE", "Clock", "clocks", "keep", "notes", "read"]
