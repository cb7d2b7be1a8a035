"""What a survey asks, and the units into which it is cut."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property, lru_cache
from pathlib import Path
from typing import Any, NamedTuple
from zoneinfo import ZoneInfo

from moonwrit import __version__
from moonwrit.calendars import TABULAR_NAMES
from moonwrit.content import Content, load
from moonwrit.content.models import zone_named
from moonwrit.digests import Digests
from moonwrit.errors import RequestError
from moonwrit.policy import Method, NamedPlace, method, named_place
from moonwrit.policy.conditions import point_name
from moonwrit.policy.names import CRITERIA, WHOLE_POLICIES, published_names
from moonwrit.policy.scopes import MAX_LATITUDE_DEG
from moonwrit.sky import ephemeris, span
from moonwrit.sky.ephemeris import LONG_RANGE, using

PLACES_PER_UNIT = 500
YEARS_PER_UNIT = 50
"""Such a unit takes some seconds (DEVELOPERS.md); the 24 months before its first cost 4 % more."""

_SOMEWHERE = NamedPlace("somewhere", 0.0, 0.0, 0.0, None)


class Place(NamedTuple):
    """A named place with its time zone by name: zones read from tzdata do not travel."""

    name: str
    latitude_deg: float
    longitude_deg: float
    elevation_m: float
    timezone: str | None

    @staticmethod
    def of(place: NamedPlace) -> Place:
        return Place(place.name, *place.row[:3], place.zone.key if place.zone else None)

    @property
    def row(self) -> tuple[float, float, float, ZoneInfo | None]:
        return *self[1:4], zone_named(self.timezone) if self.timezone else None


class Unit(NamedTuple):
    """One policy over ``places`` (indices, the last excluded) and Hijri years (both included)."""

    policy: str
    first_place: int
    end_place: int
    first_year: int
    last_year: int

    @property
    def file(self) -> str:
        """Where it is kept, relative to the survey's folder."""
        return f"units/{self.policy}/{self.first_year}-{self.last_year}/{self.first_place:07d}.npz"


@dataclass(frozen=True)
class Plan:
    """The whole question. ``places`` are named ones; on a grid there are none and ``grid_deg`` is its step.

    ``content`` is the folder of the content files, None where only published policies are asked. ``ephemeris`` is as
    in ``sky.ephemeris.using``. A plan travels to the workers of a cluster, which read the content from the same path.
    """

    policies: tuple[str, ...]
    places: tuple[Place, ...]
    grid_deg: float | None
    first_year: int
    last_year: int
    ephemeris: str = ""
    content: Path | None = None
    places_per_unit: int = PLACES_PER_UNIT
    years_per_unit: int = YEARS_PER_UNIT

    @property
    def months(self) -> int:
        return 12 * (self.last_year - self.first_year + 1)

    @cached_property
    def parallels(self) -> int:
        """How many parallels the grid has."""
        return round(2 * MAX_LATITUDE_DEG / self.grid_deg) if self.grid_deg else 0

    @property
    def place_count(self) -> int:
        return self.parallels * 3 * self.parallels if self.grid_deg else len(self.places)

    def place(self, index: int) -> Place:
        """A named place, or the middle of a cell of the grid: from south to north, from 180 W eastward."""
        if not self.grid_deg:
            return self.places[index]
        row, column = divmod(index, 3 * self.parallels)
        latitude, longitude = -MAX_LATITUDE_DEG + (row + 0.5) * self.grid_deg, -180 + (column + 0.5) * self.grid_deg
        return Place(point_name(latitude, longitude), latitude, longitude, 0.0, None)

    def place_chunks(self) -> list[tuple[int, int]]:
        step, count = self.places_per_unit, self.place_count
        return [(first, min(first + step, count)) for first in range(0, count, step)]

    def year_chunks(self) -> list[tuple[int, int]]:
        step = self.years_per_unit
        years = range(self.first_year, self.last_year + 1, step)
        return [(first, min(first + step - 1, self.last_year)) for first in years]

    def units(self) -> Iterator[Unit]:
        """Policy by policy. All places of some years follow each other: what they share is computed once."""
        for policy in self.policies:
            for years in self.year_chunks():
                for places in self.place_chunks():
                    yield Unit(policy, *places, *years)

    @property
    def unit_count(self) -> int:
        return len(self.policies) * len(self.year_chunks()) * len(self.place_chunks())

    def method(self, name: str) -> Method:
        """The policy made ready; one that leaves its place open stands somewhere: see ``leaves_place_open``."""
        return _method(self.content, name)

    def leaves_place_open(self, name: str) -> bool:
        """Is it asked at each place of the survey? The others name their own places, or none."""
        fixed = (*WHOLE_POLICIES, *TABULAR_NAMES)
        return name not in fixed and (self.content is None or name not in _content(self.content).policies)

    def as_json(self) -> dict[str, Any]:
        """All on which the results depend: what a survey's folder must agree with to be carried on."""
        with using(self.ephemeris):
            sky = ephemeris()
            kernel = {"file": sky.file.name, "bytes": sky.file.stat().st_size, "span": sky.span_text()}
        return {
            "moonwrit": __version__,
            "policies": [
                {"name": name, "title": self.method(name).title, "source": self.method(name).source,
                 "at_each_place": self.leaves_place_open(name), "digest": Digests().of(_asked(self.method(name))).hex()}
                for name in self.policies
            ],
            "grid_deg": self.grid_deg,
            "places": [place._asdict() for place in self.places],
            "place_count": self.place_count,
            "first_year": self.first_year,
            "last_year": self.last_year,
            "ephemeris": kernel,
            "units": {"places": self.places_per_unit, "years": self.years_per_unit},
        }


def plan(
    policies: Sequence[str], places: Sequence[NamedPlace], grid_deg: float | None, first_year: int, last_year: int,
    chosen_ephemeris: str = "", content: Path | None = None,
) -> Plan:
    """A plan that can be carried out; without policies or places, those of the content.

    Raises RequestError (ContentError in the content) for an unknown policy, a grid that does not fit the Earth, or
    years outside the ephemeris or a policy's own span.
    """
    if grid_deg is not None and places:
        raise RequestError("--grid and --place are both given", "choose one")
    if grid_deg is not None and abs(2 * MAX_LATITUDE_DEG / grid_deg - round(2 * MAX_LATITUDE_DEG / grid_deg)) > 1e-9:
        raise RequestError(f"a grid of {grid_deg:g} degrees does not fit between 60 S and 60 N",
                           "choose a step that divides 120, such as 5, 1 or 0.25")
    read = None if content is None else _content(content)
    if not policies:
        policies = tuple(read.policies) if read else ()
    if not places and grid_deg is None and read is not None:
        calendar = next(iter(read.site.calendars.values()))
        places = [named_place(read, place_id) for place_id in read.regions[calendar.region].places]
    if read is not None and not set(policies) & set(read.policies):
        content = None  # which the workers of a cluster then need not see
    if not policies or (not places and grid_deg is None):
        raise RequestError("there is nothing to survey",
                           "name a --policy, and a --place or a --grid, or a content folder")
    for kind, names in (("policy", list(policies)), ("place", [place.name for place in places])):
        if twice := [name for name in names if names.count(name) > 1]:
            raise RequestError(f'the {kind} "{twice[0]}" is given twice', "drop one")
    if chosen_ephemeris not in ("", LONG_RANGE):
        chosen_ephemeris = str(Path(chosen_ephemeris).resolve())
    made = Plan(
        tuple(policies), tuple(map(Place.of, places)), grid_deg, first_year, last_year, chosen_ephemeris, content
    )
    with using(chosen_ephemeris):
        _refuse_years_outside(made)
        for name in policies:
            for year in {first_year, last_year}:
                made.method(name).starts(year, year)
    return made


def _refuse_years_outside(made: Plan) -> None:
    earliest, latest = span()
    # Whole years, and the month after the last, which ends it.
    first, last = -(-earliest // 12) + 1, latest // 12
    if first <= made.first_year and made.last_year <= last:
        return
    sky = ephemeris()
    mend = f"ask for years from {first} to {last} AH"
    if not made.ephemeris:
        mend += f", or reach from 957 to 2089 AH with --ephemeris {LONG_RANGE}"
    raise RequestError(
        f"the years {made.first_year} to {made.last_year} AH reach beyond the ephemeris {sky.file.name} "
        f"({sky.span_text()})", mend,
    )


@lru_cache
def _content(folder: Path) -> Content:
    return load(folder, published_names(), CRITERIA)


@lru_cache(maxsize=256)
def _method(folder: Path | None, name: str) -> Method:
    return method(name, None if folder is None else _content(folder), _SOMEWHERE)


def _asked(policy: Method) -> object:
    """All of a policy on which its months depend."""
    return policy.eras, policy.tabular, policy.table, tuple(_asked(one) for one in policy.adopts)
