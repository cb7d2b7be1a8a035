"""A community's own pages and notices with the calendar's dates put in, and its look as a style sheet."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from datetime import date, timedelta

from moonwrit.content.look import LightColours, Look
from moonwrit.content.own import Placeholder, Written, in_tree
from moonwrit.observances import Occurrence
from moonwrit.policy import Month
from moonwrit.policy.months import Closeness, Standing
from moonwrit.publish import words
from moonwrit.publish.edition import Edition
from moonwrit.publish.language import Language

RECENT_DAYS = 60
"""A notice stands on the home page for so many days from its date."""

# The theme's names of the colours, where they are other than the content's.
_NAMES = {"link": "sea", "mark": "clay"}


@dataclass(frozen=True, slots=True)
class Named:
    """A date that a text names, with what it rests on."""

    name: str
    starts: date
    ends: date
    standing: Standing
    closeness: Closeness
    month: Month
    night: bool = False


@dataclass(frozen=True, slots=True)
class Shown:
    """A page or a notice in the language of an edition. ``on`` is the date of a notice; ``values`` what stands in the
    place of each placeholder; ``named`` the dates that the text names, each once, in the order in which it does."""

    written: Written
    path: str
    on: date | None
    values: Mapping[Placeholder, str]
    named: tuple[Named, ...]

    @property
    def title(self) -> str:
        return self.written.heading(self.values.__getitem__)

    @property
    def direction(self) -> str:
        return Language(self.written.language).direction

    def html(self, address: str = "") -> str:
        return self.written.html(self.values.__getitem__, address)

    @property
    def text(self) -> str:
        return self.written.text(self.values.__getitem__)


def own_pages(edition: Edition) -> list[Shown]:
    """The community's pages, by name; they stand beside the main calendar."""
    if not edition.is_main:
        return []
    return [_shown(edition, texts, f"pages/{name}/") for name, texts in sorted(edition.own.pages.items())]


def own_notices(edition: Edition) -> list[Shown]:
    """The community's notices, newest first; one with a date to come is kept back until then."""
    if not edition.is_main:
        return []
    return [
        _shown(edition, texts, f"notices/{name}/", on)
        for (on, name), texts in edition.own.notices.items() if on <= edition.almanac.as_of
    ]


def _shown(edition: Edition, texts: Mapping[str, Written], path: str, on: date | None = None) -> Shown:
    written = in_tree(texts, edition.language.code, edition.almanac.site)
    asked = [part for part in (*written.title, *written.body) if isinstance(part, Placeholder)]
    found = (_dated(edition, one) for one in written.asked)
    named = {(one.name, one.starts): one for one in found if one is not None}
    return Shown(written, path, on, {one: value(edition, one) for one in asked}, tuple(named.values()))


def recent(notices: list[Shown], today: date) -> list[Shown]:
    return [one for one in notices if one.on is not None and today - one.on < timedelta(days=RECENT_DAYS)]


def value(edition: Edition, asked: Placeholder) -> str:
    """What stands in the place of a placeholder, as plain text."""
    if asked.kind == "community":
        return edition.imprint.say(edition.almanac.site.community)
    if asked.kind == "authority":
        return edition.imprint.say(edition.almanac.site.authority)
    found, language = _dated(edition, asked), edition.language
    if found is None:
        return language.gettext("not in %(year)s") % {"year": language.digits(asked.year)}
    if asked.kind == "standing":
        return words.standing(found.standing, language)
    alone = found.starts == found.ends
    when = language.full_date(found.starts) if alone else words.span(found.starts, found.ends, language)
    night = language.gettext("(night, from sunset)")
    return f"{when} {night}" if found.night else when


def _dated(edition: Edition, asked: Placeholder) -> Named | None:
    """None for a day that the month of that year does not have."""
    almanac, language = edition.almanac, edition.language
    if isinstance(asked.of, int):
        month = edition.month_of[asked.year, asked.of]
        name = words.month_title(month, language)
        return Named(name, month.starts, month.starts, month.standing, month.margin.closeness, month)
    for one in almanac.occurrences:
        if (one.observance, one.year) == (asked.of, asked.year):
            return _of(edition, one)
    return None


def _of(edition: Edition, one: Occurrence) -> Named:
    name = words.occurrence_title(edition.imprint.observance(one.observance), one, edition.language)
    month = edition.month_of[one.year, one.month]
    return Named(name, one.starts, one.ends, one.standing, one.closeness, month, one.night)


def look_sheet(look: Look) -> bytes | None:
    """``look.css``: the community's colours for screens, over the theme's; None where it has chosen none."""
    rules = "".join(_rules(look.colours))
    return rules.encode() if rules else None


def _rules(colours: LightColours) -> Iterator[str]:
    # Each for its own readers: what is chosen for light pages must not hold on dark ones, nor in print.
    for given, scheme in ((colours.given(), "light"), (colours.dark.given(), "dark")):
        if given:
            lines = "".join(f"    --{_NAMES.get(name, name)}: {colour};\n" for name, colour in given.items())
            yield f"@media screen and (prefers-color-scheme: {scheme}) {{\n  :root {{\n{lines}  }}\n}}\n"


__all__ = ["Named", "Shown", "look_sheet", "own_notices", "own_pages", "recent", "value"]
