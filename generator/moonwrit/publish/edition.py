"""One calendar in one language, as it is published: what every page and feed is made from, and where each stands."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date, datetime
from functools import cached_property
from urllib.parse import urlsplit

from moonwrit.almanac import Almanac
from moonwrit.content.models import Site, in_language
from moonwrit.content.own import Own
from moonwrit.journal import Entry, Ledger
from moonwrit.policy import Month
from moonwrit.publish.language import Language
from moonwrit.publish.maps import Chart


@dataclass(frozen=True)
class Edition:
    """``is_main``: the main calendar, whose pages stand at the top of a language's tree.

    A language has a tree of its own: the top of the site for the default one, ``<code>/`` for any other. Paths are
    relative to it; ``page`` and ``feed`` give whole addresses. ``charts`` are the maps of the evenings that have some.
    """

    almanac: Almanac
    ledger: Ledger
    language: Language
    is_main: bool = True
    own: Own = field(default_factory=Own)
    charts: Mapping[date, Chart] = field(default_factory=dict)

    @property
    def site(self) -> Site:
        return self.almanac.site

    @property
    def tree(self) -> str:
        return tree(self.site, self.language.code)

    @property
    def base(self) -> str:
        """The folder of the calendar's pages in the tree."""
        return "" if self.is_main else f"{self.almanac.calendar_id}/"

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
        return f"{key}.{self.almanac.calendar_id}@{urlsplit(self.site.address).hostname}"

    def say(self, words: Mapping[str, str]) -> str:
        """A text of the content in this language, or else in the site's."""
        return in_language(words, self.language.code, self.site.language)

    @property
    def name(self) -> str:
        """The calendar's name."""
        return self.say(self.almanac.calendar.name)

    def entry(self, key: str) -> Entry:
        """What the journal knows of a published thing."""
        return self.ledger.entry(self.almanac.calendar_id, key)

    @cached_property
    def month_of(self) -> Mapping[tuple[int, int], Month]:
        """The month by its year and number."""
        return {(month.year, month.month): month for month in self.almanac.months}

    @cached_property
    def written(self) -> dict[str, bytes]:
        """Events of the feeds by key, as they were first written."""
        return {}

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


def tree(site: Site, code: str) -> str:
    """The folder in which the pages of a language stand."""
    return "" if code == site.language else f"{code}/"


__all__ = ["Edition", "tree"]
