"""Which pages there are, and what each is given: values alone, cut to what the page shows.

A page is made again when one of its values is another (see ``pieces``), so that nothing is given that is not shown:
neither the whole almanac, nor a month where its name is enough.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import date, timedelta
from zoneinfo import ZoneInfo

import segno
from markupsafe import Markup, escape

from moonwrit.almanac import Almanac, Evening, Other
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.content.models import OtherCalendar
from moonwrit.journal import Entry, month_key
from moonwrit.observances import Occurrence
from moonwrit.observances.fasting import FastingMonth
from moonwrit.policy import Month
from moonwrit.policy.differ import Beside, LongRun
from moonwrit.policy.evening import Row
from moonwrit.publish import maps, pictures, words
from moonwrit.publish.asked import asked_in_words
from moonwrit.publish.civil import civil_months, civil_years
from moonwrit.publish.edition import Edition, Imprint, Name, evening_path, fasting_path, month_path, tree
from moonwrit.publish.icalendar import tags
from moonwrit.publish.language import Language
from moonwrit.publish.own import Shown, own_notices, own_pages, recent
from moonwrit.publish.render import Frame, Later, Page, svg
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
    almanac, ledger, language, imprint = edition.almanac, edition.ledger, edition.language, edition.imprint
    _ = language.gettext
    frame = _frame(edition, editions)

    def page(folder: str, template: str, title: str, **given: object) -> Page:
        return Page(f"{imprint.base}{folder}index.html", template, title, frame, given)

    notices = own_notices(edition)
    yield page("", "home", imprint.name, **_home(edition), notices=recent(notices, almanac.as_of))
    months = almanac.months
    for year in range(months[0].year, months[-1].year + 1):
        yield page(f"{year}/", "year", _("Year %(year)s") % {"year": language.digits(year)}, **_year(edition, year))
    for year in civil_years(almanac):
        title = _("Civil year %(year)s") % {"year": language.digits(year)}
        yield page(f"civil/{year}/", "civil", title, **_civil(edition, year))
    for index, month in enumerate(months):
        yield page(month_path(month), "month", words.month_title(month, language), **_month(edition, index))
    for name in almanac.observances:
        yield page(f"observances/{name}/", "observance", imprint.observance(name), **_observance(edition, name))
    yield page("observances/", "observances", _("Observances"))
    for index, evening in enumerate(almanac.evenings):
        title = _("Evening of %(date)s") % {"date": language.long_date(evening.on)}
        yield page(evening_path(evening.on), "evening", title, **_evening(edition, index))
    for table in almanac.fasting:
        title = _("Fasting days of %(month)s") % {"month": words.month_title(table.month, language)}
        yield page(fasting_path(table.month.year), "fasting", title, **_fasting(edition, table))
    yield page("places/", "places", _("Places"), **_places(almanac))
    yield page(
        "policy/", "policy", _("The policy"), method=almanac.method, asked=asked_in_words(almanac.method, language),
        places=almanac.places,
    )
    if almanac.others:
        yield page("differences/", "differences", _("Why it is another day elsewhere"), **_differences(edition))
    yield page("changes/", "changes", _("Changes"), moved=ledger.moved(almanac.calendar_id))
    yield page("subscribe/", "subscribe", _("Subscribe"), **_subscribe(edition))
    yield page("embed/", "embed", _("Put this calendar on your site"), **_embed(imprint))
    yield page("reading/", "reading", _("How to read these pages"))
    for one in (*own_pages(edition), *notices):
        yield page(one.path, "own", one.title, one=one, body=Later(_clean, one))
    if notices:
        yield page("notices/", "notices", _("Notices"), notices=notices)
    if edition.is_main and not imprint.tree:
        yield Page("404.html", "missing", _("No such page"), frame)


def _frame(edition: Edition, editions: Sequence[Edition]) -> Frame:
    almanac, site = edition.almanac, edition.almanac.site
    main = editions[0]
    return Frame(
        imprint=edition.imprint,
        base=edition.imprint.base,
        feeds=edition.imprint.feeds,
        region=almanac.region,
        observances=almanac.observances,
        calendars=tuple((one.imprint.base, one.imprint.name) for one in editions),
        languages=tuple((code, tree(site, code), Language(code)) for code in site.all_languages),
        civil_years=civil_years(almanac),
        years=range(almanac.months[0].year, almanac.months[-1].year + 1),
        own_pages=tuple((one.path, one.title, one.written.language) for one in own_pages(main)),
        has_notices=bool(own_notices(main)),
        has_others=bool(almanac.others),
        fasting_years=tuple(table.month.year for table in almanac.fasting),
        next_fasting=_next_fasting(almanac),
    )


def _clean(one: Shown) -> Markup:
    """The text as HTML that was made safe where it was read."""
    return Markup(one.html())


def _home(edition: Edition) -> dict[str, object]:
    almanac = edition.almanac
    today = almanac.as_of
    current = next((month for month in almanac.months if month.starts <= today <= month.ends), None)
    coming = [one for one in almanac.occurrences if one.ends >= today]
    coming = [one for one in coming if "main" in one.tags][:6] or coming[:6]
    next_evening = _next_evening(almanac)
    return {
        "today": today,
        "current": current,
        "lunar_day": (today - current.starts).days + 1 if current else None,
        "coming": coming,
        "entries": _entries(edition, coming),
        "next_month": next((month for month in almanac.months if month.starts > today), None),
        "next_evening": next_evening and next_evening.on,
    }


def _next_evening(almanac: Almanac) -> Evening | None:
    return next((evening for evening in almanac.evenings if evening.on >= almanac.as_of), None)


def _next_fasting(almanac: Almanac) -> int | None:
    """The year of the present or next month of fasting that has a table, or else the last."""
    months = [table.month for table in almanac.fasting]
    coming = [month for month in months if month.ends >= almanac.as_of]
    return (coming[0] if coming else months[-1]).year if months else None


def _places(almanac: Almanac) -> dict[str, object]:
    evening = _next_evening(almanac)
    return {"places": almanac.places, "next_evening": evening and evening.on, "at": evening and evening.at}


def _entries(edition: Edition, shown: Iterable[Occurrence]) -> Mapping[str, Entry]:
    return {one.key: edition.entry(one.key) for one in shown}


def _names(edition: Edition) -> dict[str, str]:
    """The names of the region's places."""
    return {place: edition.imprint.say(value.name) for place, value in edition.almanac.places.items()}


def _fasting(edition: Edition, table: FastingMonth) -> dict[str, object]:
    return {
        "table": table,
        "month": table.month,
        "declared": edition.almanac.site.fasting,
        "names": _names(edition),
        "noted": _noted(edition, month_key(table.month.year, table.month.month)),
    }


def _year(edition: Edition, year: int) -> dict[str, object]:
    almanac, language = edition.almanac, edition.language
    months = tuple(month for month in almanac.months if month.year == year)
    drifting = tuple((month.year, month.starts) for month in almanac.months if month.month == 9)
    return {
        "year": year,
        "months": months,
        "strip": Later(_drawn, pictures.margins_strip, months, language),
        "found": [one for one in almanac.occurrences if one.year == year and "main" in one.tags],
        "drift": Later(_drawn, pictures.seasons, drifting, 9, language),
    }


def _drawn(picture: Callable[..., str], *given: object) -> Markup:
    return svg(picture(*given))


def _civil(edition: Edition, year: int) -> dict[str, object]:
    almanac = edition.almanac
    months = tuple(one for one in almanac.months if one.starts.year <= year <= one.ends.year)
    main = tuple(one for one in almanac.occurrences if one.starts.year == year and "main" in one.tags)
    return {
        "year": year,
        "today": almanac.as_of if almanac.as_of.year == year else None,
        "civil_months": Later(civil_months, months, main, year, edition.language.first_weekday),
    }


def _month(edition: Edition, index: int) -> dict[str, object]:
    almanac = edition.almanac
    month = almanac.months[index]
    first, last = month.starts, month.ends
    near = tuple(one for one in almanac.occurrences if one.ends >= first and one.starts <= last)
    today = almanac.as_of if first <= almanac.as_of <= last else None
    return {
        "month": month,
        "before": _name(almanac.months[index - 1]) if index else None,
        "after": _name(almanac.months[index + 1]) if index + 1 < len(almanac.months) else None,
        "evening_on": almanac.evenings[index].on,
        "cells": Later(_cells, month.starts, month.length, near, today, almanac.site.also),
        "superseded": almanac.superseded.get(month.ordinal, ()),
        "noted": _noted(edition, month_key(month.year, month.month)),
        "also": [TITLES[calendar] for calendar in almanac.site.also],
    }


def _name(month: Month) -> Name:
    return Name(month.year, month.month)


def _cells(
    starts: date, length: int, near: Sequence[Occurrence], today: date | None, also: Sequence[OtherCalendar]
) -> list[Cell]:
    days = [starts + timedelta(days=offset) for offset in range(length)]

    def on(day: date) -> tuple[Occurrence, ...]:
        return tuple(one for one in near if one.starts <= day <= one.ends)
    return [
        Cell(number, day, on(day), day == today, tuple(in_calendar(day, calendar) for calendar in also))
        for number, day in enumerate(days, 1)
    ]


def _observance(edition: Edition, name: str) -> dict[str, object]:
    almanac = edition.almanac
    found = [one for one in almanac.occurrences if one.observance == name]
    return {
        "observance": almanac.observances[name],
        "found": found,
        "entries": _entries(edition, found),
        "notes": [entry for one in found if (entry := _noted(edition, one.key))],
    }


def _differences(edition: Edition) -> dict[str, object]:
    almanac, language = edition.almanac, edition.language
    shown = [other.beside for other in almanac.others]
    rows = []
    for index, month in enumerate(almanac.months):
        theirs = [one.months[index].starts for one in shown]
        rows.append((_name(month), month.starts, [(day, (day - month.starts).days) for day in theirs]))
    feasts = [one for one in almanac.occurrences if "main" in one.tags and not one.night]
    return {
        "ours": almanac.method.title,
        "others": almanac.others,
        "agreements": Later(_agreements, almanac.others, language),
        "rows": rows,
        "feasts": [(one, [_shift(other, one) for other in shown]) for one in feasts],
    }


def _agreements(others: Sequence[Other], language: Language) -> list[tuple[str, Markup]]:
    runs: list[tuple[str, LongRun]] = [
        (language.name(other.beside.method.title), other.long_run) for other in others if other.long_run is not None
    ]
    return [(name, svg(pictures.agreement(run, name, language))) for name, run in runs]


def _shift(beside: Beside, one: Occurrence) -> int:
    """Days by which another policy keeps an observance later than ours: that of its month."""
    return next((d.days for d in beside.differences if (d.ours.year, d.ours.month) == (one.year, one.month)), 0)


def _evening(edition: Edition, index: int) -> dict[str, object]:
    almanac, language = edition.almanac, edition.language
    evening, names = almanac.evenings[index], _names(edition)
    zones = {place: value.zone for place, value in almanac.places.items()}
    chart = edition.charts.of(index) if edition.charts is not None else None
    return {
        "evening": evening,
        "month": evening.month,
        "names": names,
        "zones": zones,
        "horizons": Later(_horizons, evening.at, zones, names, language),
        "maps": chart and Later(_maps, chart, language, edition.imprint.say(almanac.region.name)),
        "before": _name(almanac.months[index - 1]) if index else None,
        "coming": evening.on >= almanac.as_of,
        "elsewhere": [
            (language.name(other.beside.method.title), other.beside.months[index].starts) for other in almanac.others
        ],
    }


def _horizons(
    at: Mapping[str, Row], zones: Mapping[str, ZoneInfo], names: Mapping[str, str], language: Language
) -> list[tuple[str, Markup]]:
    """The western horizon at each place where there is one to draw."""
    drawn = ((names[place], pictures.horizon(at[place], zone, names[place], language)) for place, zone in zones.items())
    return [(name, svg(picture)) for name, picture in drawn if picture]


def _maps(charted: maps.Charted, language: Language, region: str) -> dict[str, object]:
    chart = charted.chart
    return {
        "world": svg(maps.world_map(chart, language, region)),
        "region": svg(maps.region_map(chart, language)),
        "key": [(svg(swatch), name) for swatch, name in maps.key(language)],
        "told": maps.told(chart, language),
    }


def _subscribe(edition: Edition) -> dict[str, object]:
    _, imprint = edition.language.gettext, edition.imprint
    feeds = [
        _Feed(imprint, "observances.ics", _("Observances"), _("Named days, nights and runs of days.")),
        _Feed(imprint, "months.ics", _("First days of the months"), _("One entry for each lunar month.")),
        _Feed(imprint, "evenings.ics", _("Evenings for observers"),
              _("Each 29th evening at each place, from sunset to moonset.")),
    ]
    some = [_Feed(imprint, f"tags/{tag}.ics", tag, "") for tag in tags(edition)]
    places = edition.almanac.places if edition.almanac.fasting else {}
    fasting = [_Feed(imprint, f"fasting/{place}.ics", imprint.say(one.name), "") for place, one in places.items()]
    return {"subscriptions": feeds, "by_tag": some, "fasting": fasting, "schemas": list(schemas())}


@dataclass(frozen=True)
class _Feed:
    """A feed to subscribe to."""

    imprint: Imprint
    name: str
    title: str
    about: str

    @property
    def address(self) -> str:
        return self.imprint.feed(self.name)

    @property
    def webcal(self) -> str:
        """With the scheme that makes phones and desktop calendars subscribe rather than import."""
        return re.sub(r"^https?:", "webcal:", self.address)

    @property
    def qr(self) -> Markup:
        """Dark on light whatever the page's colours, with the quiet zone that readers need (ISO/IEC 18004)."""
        title = self.imprint.language.gettext("QR code: %(address)s") % {"address": self.webcal}
        made = segno.make(self.webcal, error="m", micro=False)
        return svg(made.svg_inline(scale=4, border=4, light="#fff", dark="#000", title=title, omitsize=True,
                                   svgclass="qr", lineclass=None))


def _embed(imprint: Imprint) -> dict[str, object]:
    stem = imprint.site_path(f"embed/{imprint.base}{imprint.language.code}")
    script, frame = f"{stem}.js", f"{stem}.html"
    link = f'<a href="{escape(imprint.page())}">{escape(imprint.name)}</a>'
    return {
        "script": script,
        "frame": frame,
        "script_text": (
            f'<script async src="{escape(script)}"></script>\n<moonwrit-dates count="5">{link}</moonwrit-dates>'
        ),
        "frame_text": (
            f'<iframe src="{escape(frame)}" title="{escape(imprint.name)}" width="100%" height="360" '
            'loading="lazy" style="border:0"></iframe>'
        ),
    }


def _noted(edition: Edition, key: str) -> Entry | None:
    """The last change of a published date, while it is to be pointed out."""
    almanac = edition.almanac
    entry = edition.ledger.current.get((almanac.calendar_id, key))
    if entry is None or entry.was is None:
        return None
    return entry if almanac.as_of - entry.at.date() <= timedelta(days=NOTED_DAYS) else None
