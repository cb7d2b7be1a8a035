"""Which pages there are, and what each is given."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import date, timedelta

import segno
from markupsafe import Markup, escape

from moonwrit.almanac import Almanac, Evening
from moonwrit.calendars import month_slug
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.journal import Entry, Ledger, month_key
from moonwrit.observances import Occurrence
from moonwrit.observances.fasting import FastingMonth
from moonwrit.policy import Month
from moonwrit.policy.differ import Beside
from moonwrit.publish import maps, pictures, words
from moonwrit.publish.asked import asked_in_words
from moonwrit.publish.civil import civil_months, civil_years
from moonwrit.publish.edition import Edition, tree
from moonwrit.publish.icalendar import tags
from moonwrit.publish.language import Language
from moonwrit.publish.own import Shown, own_notices, own_pages, recent
from moonwrit.publish.render import Page, svg
from moonwrit.publish.schemas import schemas

NOTED_DAYS = 60
"""A moved date is pointed out on its pages for this many days."""


@dataclass(frozen=True, slots=True)
class Cell:
    """A day of a month's grid: lunar day, civil date, and what falls on it."""

    day: int
    on: date
    occurrences: tuple[Occurrence, ...]
    today: bool
    also: tuple[str | None, ...]


def pages(edition: Edition, editions: Sequence[Edition]) -> Iterator[Page]:
    """Every page of one calendar in one language; ``editions`` are all calendars in it, the main one first."""
    almanac, ledger, language = edition.almanac, edition.ledger, edition.language
    _ = language.gettext
    frame = _Frame(edition, editions)
    notices = own_notices(edition)
    yield frame.page("", "home", edition.name, **_home(almanac), notices=recent(notices, almanac.as_of))
    months = almanac.months
    for year in range(months[0].year, months[-1].year + 1):
        title = _("Year %(year)s") % {"year": language.digits(year)}
        yield frame.page(f"{year}/", "year", title, **_year(almanac, year, language))
    for year in civil_years(almanac):
        yield frame.page(
            f"civil/{year}/", "civil", _("Civil year %(year)s") % {"year": language.digits(year)},
            year=year, civil_months=civil_months(almanac, year, language.first_weekday),
        )
    for index, month in enumerate(months):
        yield frame.page(
            month_path(month), "month", words.month_title(month, language),
            **_month(almanac, ledger, index),
        )
    for name, observance in almanac.observances.items():
        found = [one for one in almanac.occurrences if one.observance == name]
        yield frame.page(
            f"observances/{name}/", "observance", edition.say(observance.name), observance=observance, found=found,
            notes=[entry for one in found if (entry := _noted(almanac, ledger, one.key))],
        )
    yield frame.page("observances/", "observances", _("Observances"))
    for evening in almanac.evenings:
        title = _("Evening of %(date)s") % {"date": language.long_date(evening.on)}
        yield frame.page(evening_path(evening), "evening", title, **_evening(edition, evening))
    for table in almanac.fasting:
        title = _("Fasting days of %(month)s") % {"month": words.month_title(table.month, language)}
        yield frame.page(fasting_path(table.month), "fasting", title, **_fasting(edition, table))
    yield frame.page("places/", "places", _("Places"), next_evening=_next_evening(almanac))
    yield frame.page("policy/", "policy", _("The policy"), asked=asked_in_words(almanac.method, language))
    if almanac.others:
        title = _("Why it is another day elsewhere")
        yield frame.page("differences/", "differences", title, **_differences(almanac, language))
    yield frame.page("changes/", "changes", _("Changes"), moved=ledger.moved(almanac.calendar_id))
    yield frame.page("subscribe/", "subscribe", _("Subscribe"), **_subscribe(edition))
    yield frame.page("embed/", "embed", _("Put this calendar on your site"), **_embed(edition))
    yield frame.page("reading/", "reading", _("How to read these pages"))
    for one in (*own_pages(edition), *notices):
        yield frame.page(one.path, "own", one.title, one=one, body=_clean(one))
    if notices:
        yield frame.page("notices/", "notices", _("Notices"), notices=notices)
    if edition.is_main and not edition.tree:
        yield Page("404.html", "missing", _("No such page"), frame.common)


class _Frame:
    """What every page of a calendar is given."""

    def __init__(self, edition: Edition, editions: Sequence[Edition]) -> None:
        almanac = edition.almanac
        self.base = edition.base
        self.common = {
            "edition": edition,
            "almanac": almanac,
            "base": edition.base,
            "feeds": edition.feeds,
            "calendars": [(one.base, one.name) for one in editions],
            "languages": [
                (code, tree(edition.site, code), Language(code)) for code in edition.site.all_languages
            ],
            "civil_years": civil_years(almanac),
            "years": range(almanac.months[0].year, almanac.months[-1].year + 1),
            "own_pages": own_pages(editions[0]),
            "has_notices": bool(own_notices(editions[0])),
            "month_path": month_path,
            "evening_path": evening_path,
            "fasting_path": fasting_path,
            "next_fasting": _next_fasting(almanac),
            "month_of": edition.month_of.__getitem__,
            "reach": pictures.reach,
        }

    def page(self, folder: str, template: str, title: str, **given: object) -> Page:
        return Page(f"{self.base}{folder}index.html", template, title, {**self.common, **given})


def _clean(one: Shown) -> Markup:
    """The text as HTML that was made safe where it was read."""
    return Markup(one.html())


def month_path(month: Month) -> str:
    return f"{month.year}/{month_slug(month.month)}/"


def evening_path(evening: Evening) -> str:
    return f"evenings/{evening.on.isoformat()}/"


def fasting_path(month: Month) -> str:
    return f"fasting/{month.year}/"


def _home(almanac: Almanac) -> dict[str, object]:
    today = almanac.as_of
    current = next((month for month in almanac.months if month.starts <= today <= month.ends), None)
    coming = [one for one in almanac.occurrences if one.ends >= today]
    return {
        "today": today,
        "current": current,
        "lunar_day": (today - current.starts).days + 1 if current else None,
        "coming": [one for one in coming if "main" in one.tags][:6] or coming[:6],
        "next_month": next((month for month in almanac.months if month.starts > today), None),
        "next_evening": _next_evening(almanac),
    }


def _next_evening(almanac: Almanac) -> Evening | None:
    return next((evening for evening in almanac.evenings if evening.on >= almanac.as_of), None)


def _next_fasting(almanac: Almanac) -> Month | None:
    """The present or next month of fasting that has a table, or else the last."""
    months = [table.month for table in almanac.fasting]
    return next((month for month in months if month.ends >= almanac.as_of), months[-1] if months else None)


def _fasting(edition: Edition, table: FastingMonth) -> dict[str, object]:
    return {
        "table": table,
        "month": table.month,
        "declared": edition.site.fasting,
        "names": {place: edition.say(value.name) for place, value in edition.almanac.places.items()},
        "noted": _noted(edition.almanac, edition.ledger, month_key(table.month.year, table.month.month)),
        "tables": [one.month for one in edition.almanac.fasting],
    }


def _year(almanac: Almanac, year: int, language: Language) -> dict[str, object]:
    months = [month for month in almanac.months if month.year == year]
    return {
        "year": year,
        "months": months,
        "strip": svg(pictures.margins_strip(months, language)),
        "found": [one for one in almanac.occurrences if one.year == year and "main" in one.tags],
        "drift": svg(pictures.seasons(almanac, 9, language)),
    }


def _month(almanac: Almanac, ledger: Ledger, index: int) -> dict[str, object]:
    month = almanac.months[index]
    return {
        "month": month,
        "before": almanac.months[index - 1] if index else None,
        "after": almanac.months[index + 1] if index + 1 < len(almanac.months) else None,
        "evening": almanac.evenings[index],
        "cells": _cells(almanac, month),
        "superseded": almanac.superseded.get(month.ordinal, ()),
        "noted": _noted(almanac, ledger, month_key(month.year, month.month)),
        "also": [TITLES[calendar] for calendar in almanac.site.also],
    }


def _cells(almanac: Almanac, month: Month) -> list[Cell]:
    days = [month.starts + timedelta(days=offset) for offset in range(month.length)]
    near = [one for one in almanac.occurrences if one.ends >= month.starts and one.starts <= month.ends]

    def on(day: date) -> tuple[Occurrence, ...]:
        return tuple(one for one in near if one.starts <= day <= one.ends)
    return [
        Cell(
            number, day, on(day), day == almanac.as_of,
            tuple(in_calendar(day, calendar) for calendar in almanac.site.also),
        )
        for number, day in enumerate(days, 1)
    ]


def _differences(almanac: Almanac, language: Language) -> dict[str, object]:
    shown = [other.beside for other in almanac.others]
    rows = []
    for index, month in enumerate(almanac.months):
        theirs = [one.months[index].starts for one in shown]
        rows.append((month, [(day, (day - month.starts).days) for day in theirs]))
    feasts = [one for one in almanac.occurrences if "main" in one.tags and not one.night]
    return {
        "others": almanac.others,
        "agreements": [
            (name, svg(pictures.agreement(other.long_run, name, language)))
            for other in almanac.others if other.long_run is not None
            for name in [language.name(other.beside.method.title)]
        ],
        "rows": rows,
        "feasts": [
            (one, [(other, _shift(other, one)) for other in shown]) for one in feasts
        ],
    }


def _shift(beside: Beside, one: Occurrence) -> int:
    """Days by which another policy keeps an observance later than ours: that of its month."""
    return next((d.days for d in beside.differences if (d.ours.year, d.ours.month) == (one.year, one.month)), 0)


def _evening(edition: Edition, evening: Evening) -> dict[str, object]:
    almanac, language = edition.almanac, edition.language
    names = {place: edition.say(value.name) for place, value in almanac.places.items()}
    index = almanac.evenings.index(evening)
    return {
        "evening": evening,
        "month": evening.month,
        "names": names,
        "zones": {place: value.zone for place, value in almanac.places.items()},
        "horizons": [
            (names[place], svg(drawn)) for place, value in almanac.places.items()
            if (drawn := pictures.horizon(evening.at[place], value.zone, names[place], language))
        ],
        "maps": _maps(edition, evening),
        "before": almanac.months[index - 1] if index else None,
        "coming": evening.on >= almanac.as_of,
        "elsewhere": [
            (language.name(other.beside.method.title), other.beside.months[index].starts) for other in almanac.others
        ],
    }


def _maps(edition: Edition, evening: Evening) -> dict[str, object] | None:
    chart, language = edition.charts.get(evening.on), edition.language
    if chart is None:
        return None
    return {
        "world": svg(maps.world_map(chart, language, edition.say(edition.almanac.region.name))),
        "region": svg(maps.region_map(chart, language)),
        "key": [(svg(swatch), name) for swatch, name in maps.key(language)],
        "told": maps.told(chart, language),
    }


def _subscribe(edition: Edition) -> dict[str, object]:
    _ = edition.language.gettext
    feeds = [
        _Feed(edition, "observances.ics", _("Observances"), _("Named days, nights and runs of days.")),
        _Feed(edition, "months.ics", _("First days of the months"), _("One entry for each lunar month.")),
        _Feed(edition, "evenings.ics", _("Evenings for observers"),
              _("Each 29th evening at each place, from sunset to moonset.")),
    ]
    some = [_Feed(edition, f"tags/{tag}.ics", tag, "") for tag in tags(edition)]
    places = edition.almanac.places if edition.almanac.fasting else {}
    fasting = [_Feed(edition, f"fasting/{place}.ics", edition.say(one.name), "") for place, one in places.items()]
    return {"subscriptions": feeds, "by_tag": some, "fasting": fasting, "schemas": list(schemas())}


@dataclass(frozen=True)
class _Feed:
    """A feed to subscribe to."""

    edition: Edition
    name: str
    title: str
    about: str

    @property
    def address(self) -> str:
        return self.edition.feed(self.name)

    @property
    def webcal(self) -> str:
        """With the scheme that makes phones and desktop calendars subscribe rather than import."""
        return re.sub(r"^https?:", "webcal:", self.address)

    @property
    def qr(self) -> Markup:
        """Dark on light whatever the page's colours, with the quiet zone that readers need (ISO/IEC 18004)."""
        title = self.edition.language.gettext("QR code: %(address)s") % {"address": self.webcal}
        made = segno.make(self.webcal, error="m", micro=False)
        return svg(made.svg_inline(scale=4, border=4, light="#fff", dark="#000", title=title, omitsize=True,
                                   svgclass="qr", lineclass=None))


def _embed(edition: Edition) -> dict[str, object]:
    _ = edition.language.gettext
    script, frame = (edition.site_path(f"embed/{edition.base}{edition.language.code}{end}") for end in (".js", ".html"))
    link = f'<a href="{escape(edition.page())}">{escape(edition.name)}</a>'
    return {
        "script": script,
        "frame": frame,
        "script_text": (
            f'<script async src="{escape(script)}"></script>\n<moonwrit-dates count="5">{link}</moonwrit-dates>'
        ),
        "frame_text": (
            f'<iframe src="{escape(frame)}" title="{escape(edition.name)}" width="100%" height="360" '
            'loading="lazy" style="border:0"></iframe>'
        ),
    }


def _noted(almanac: Almanac, ledger: Ledger, key: str) -> Entry | None:
    """The last change of a published date, while it is to be pointed out."""
    entry = ledger.current.get((almanac.calendar_id, key))
    if entry is None or entry.was is None:
        return None
    return entry if almanac.as_of - entry.at.date() <= timedelta(days=NOTED_DAYS) else None
