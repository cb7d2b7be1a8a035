"""One calendar in one language, as it is published: what every page and feed is made from, and where each stands."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from datetime import date, datetime
from functools import cached_property
from typing import Any, NamedTuple
from urllib.parse import urlsplit

from moonwrit.almanac import Almanac
from moonwrit.calendars import month_slug
from moonwrit.content.models import Observance, Site, in_language
from moonwrit.content.own import Own
from moonwrit.journal import Entry, Ledger
from moonwrit.observances import Occurrence
from moonwrit.policy import Month
from moonwrit.publish.language import Language
from moonwrit.publish.maps import Charts
from moonwrit.publish.pieces import Piece, Pieces


@dataclass(frozen=True)
class Imprint:
    """What all pages and feeds of a calendar in a language have in common: names and addresses, and no date.

    ``is_main``: the main calendar, whose pages stand at the top of a language's tree. A language has a tree of its own:
    the top of the site for the default one, ``<code>/`` for any other. Paths are relative to it; ``page`` and ``feed``
    give whole addresses.
    """

    site: Site
    language: Language
    calendar_id: str
    is_main: bool
    observances: Mapping[str, Observance]

    @property
    def tree(self) -> str:
        return tree(self.site, self.language.code)

    @property
    def base(self) -> str:
        """The folder of the calendar's pages in the tree."""
        return "" if self.is_main else f"{self.calendar_id}/"

    @property
    def feeds(self) -> str:
        """The folder of its feeds in the tree."""
        return f"feeds/{self.base}"

    def site_path(self, path: str) -> str:
        """The whole address of a path from the top of the site."""
        return f"{self.site.address.rstrip('/')}/{path}"

    def address(self, path: str = "") -> str:
        """The whole address of a path in the language's tree."""
        return self.site_path(self.tree + path)

    def page(self, path: str = "") -> str:
        """The whole address of a page of the calendar."""
        return self.address(self.base + path)

    def feed(self, name: str) -> str:
        """The whole address of a feed of the calendar."""
        return self.address(self.feeds + name)

    def uid(self, key: str) -> str:
        """The lasting name of a published thing: the same in every language, and when its date changes."""
        return f"{key}.{self.calendar_id}@{urlsplit(self.site.address).hostname}"

    def say(self, words: Mapping[str, str]) -> str:
        """A text of the content in this language, or else in the site's."""
        return in_language(words, self.language.code, self.site.language)

    @property
    def name(self) -> str:
        """The calendar's name."""
        return self.say(self.site.calendars[self.calendar_id].name)

    @property
    def authority(self) -> str:
        return self.say(self.site.authority)

    def observance(self, name: str) -> str:
        """An observance's name."""
        return self.say(self.observances[name].name)


@dataclass(frozen=True)
class Edition:
    """``charts`` are the maps of the evenings; ``piece`` makes one of a function and what it is given."""

    almanac: Almanac
    ledger: Ledger
    language: Language
    is_main: bool = True
    own: Own = field(default_factory=Own)
    charts: Charts | None = None
    pieces: Pieces = field(default_factory=Pieces)

    @cached_property
    def imprint(self) -> Imprint:
        almanac = self.almanac
        return Imprint(almanac.site, self.language, almanac.calendar_id, self.is_main, almanac.observances)

    def piece(self, make: Callable[..., bytes], *given: Any) -> Piece:
        return self.pieces.of(make, *given)

    def entry(self, key: str) -> Entry:
        """What the journal knows of a published thing."""
        return self.ledger.entry(self.almanac.calendar_id, key)

    @cached_property
    def events(self) -> dict[str, Piece]:
        """Events of the feeds by key: most stand in several."""
        return {}

    @cached_property
    def month_of(self) -> Mapping[tuple[int, int], Month]:
        """The month by its year and number."""
        return {(month.year, month.month): month for month in self.almanac.months}

    @cached_property
    def first_rolling_year(self) -> int:
        """Feeds to subscribe to begin with the Hijri year before the present one; older years have their own files."""
        past = [month.year for month in self.almanac.months if month.starts <= self.almanac.as_of]
        return (past[-1] if past else self.almanac.months[0].year) - 1

    @cached_property
    def last_change(self) -> datetime:
        """When anything of the calendar was last published anew."""
        own = [entry.at for (calendar, _), entry in self.ledger.current.items() if calendar == self.almanac.calendar_id]
        return max(own)

    def last_of(self, entries: Iterable[Entry]) -> datetime:
        """When one of these was last published anew; of none, anything of the calendar."""
        return max((entry.at for entry in entries), default=self.last_change)


class Name(NamedTuple):
    """Which month, and nothing else of it."""

    year: int
    month: int


def month_path(month: Month | Name | Occurrence) -> str:
    """The folder of a month's page: that of the month, or of the one in which an occurrence falls."""
    return f"{month.year}/{month_slug(month.month)}/"


def evening_path(on: date) -> str:
    return f"evenings/{on.isoformat()}/"


def fasting_path(year: int) -> str:
    return f"fasting/{year}/"


def tree(site: Site, code: str) -> str:
    """The folder in which the pages of a language stand."""
    return "" if code == site.language else f"{code}/"


__all__ = ["Edition", "Imprint", "Name", "evening_path", "fasting_path", "month_path", "tree"]
