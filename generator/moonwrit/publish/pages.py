"""Which pages there are, and what each is given."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import date, timedelta

from moonwrit.almanac import Almanac, Evening
from moonwrit.calendars import month_slug
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.content.models import in_language
from moonwrit.journal import Entry, Ledger, month_key
from moonwrit.observances import Occurrence
from moonwrit.policy import Month
from moonwrit.policy.differ import Beside
from moonwrit.publish import pictures, words
from moonwrit.publish.language import Language
from moonwrit.publish.render import Page, svg

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


def pages(
    almanac: Almanac, ledger: Ledger, language: Language, base: str, almanacs: Sequence[Almanac]
) -> Iterator[Page]:
    """Every page of one calendar; ``base`` is the folder in which its pages stand ("" for the main calendar)."""
    _ = language.gettext
    frame = _Frame(almanac, ledger, language, base, almanacs)
    yield frame.page("", "home", in_language(almanac.calendar.name, language.code, almanac.site.language),
                     **_home(almanac))
    months = almanac.months
    for year in range(months[0].year, months[-1].year + 1):
        yield frame.page(f"{year}/", "year", _("Year %(year)s") % {"year": year}, **_year(almanac, year, language))
    for index, month in enumerate(months):
        yield frame.page(
            month_path(month), "month", words.month_title(month, language),
            **_month(almanac, ledger, index),
        )
    for name, observance in almanac.observances.items():
        found = [one for one in almanac.occurrences if one.observance == name]
        title = in_language(observance.name, language.code, almanac.site.language)
        yield frame.page(
            f"observances/{name}/", "observance", title, observance=observance, found=found,
            notes=[entry for one in found if (entry := _noted(almanac, ledger, one.key))],
        )
    yield frame.page("observances/", "observances", _("Observances"))
    for evening in almanac.evenings:
        title = _("Evening of %(date)s") % {"date": language.long_date(evening.on)}
        yield frame.page(evening_path(evening), "evening", title, **_evening(almanac, evening, language))
    yield frame.page("policy/", "policy", _("The policy"))
    if almanac.others:
        yield frame.page("differences/", "differences", _("Why it is another day elsewhere"), **_differences(almanac))
    yield frame.page("changes/", "changes", _("Changes"), moved=ledger.moved(almanac.calendar_id))
    yield frame.page("subscribe/", "subscribe", _("Subscribe"))
    yield frame.page("reading/", "reading", _("How to read these pages"))
    if not base:
        yield Page("404.html", "missing", _("No such page"), frame.common)


class _Frame:
    """What every page of a calendar is given."""

    def __init__(
        self, almanac: Almanac, ledger: Ledger, language: Language, base: str, almanacs: Sequence[Almanac]
    ) -> None:
        self.base = base
        self.common = {
            "almanac": almanac,
            "base": base,
            "calendars": [
                ("" if index == 0 else f"{one.calendar_id}/",
                 in_language(one.calendar.name, language.code, one.site.language))
                for index, one in enumerate(almanacs)
            ],
            "years": range(almanac.months[0].year, almanac.months[-1].year + 1),
            "month_path": month_path,
            "evening_path": evening_path,
            "month_of": {(month.year, month.month): month for month in almanac.months}.__getitem__,
            "feeds": f"feeds/{almanac.calendar_id}/" if base else "feeds/",
            "reach": pictures.reach,
        }

    def page(self, folder: str, template: str, title: str, **given: object) -> Page:
        return Page(f"{self.base}{folder}index.html", template, title, {**self.common, **given})


def month_path(month: Month) -> str:
    return f"{month.year}/{month_slug(month.month)}/"


def evening_path(evening: Evening) -> str:
    return f"evenings/{evening.on.isoformat()}/"


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
        "next_evening": next((evening for evening in almanac.evenings if evening.on >= today), None),
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


def _differences(almanac: Almanac) -> dict[str, object]:
    shown = [other.beside for other in almanac.others]
    rows = []
    for index, month in enumerate(almanac.months):
        theirs = [one.months[index].starts for one in shown]
        rows.append((month, [(day, (day - month.starts).days) for day in theirs]))
    feasts = [one for one in almanac.occurrences if "main" in one.tags and not one.night]
    return {
        "others": almanac.others,
        "rows": rows,
        "feasts": [
            (one, [(other, _shift(other, one)) for other in shown]) for one in feasts
        ],
    }


def _shift(beside: Beside, one: Occurrence) -> int:
    """Days by which another policy keeps an observance later than ours: that of its month."""
    return next((d.days for d in beside.differences if (d.ours.year, d.ours.month) == (one.year, one.month)), 0)


def _evening(almanac: Almanac, evening: Evening, language: Language) -> dict[str, object]:
    names = {
        place: in_language(value.name, language.code, almanac.site.language) for place, value in almanac.places.items()
    }
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
        "before": almanac.months[index - 1] if index else None,
        "coming": evening.on >= almanac.as_of,
        "elsewhere": [(other.beside.method.title, other.beside.months[index].starts) for other in almanac.others],
    }


def _noted(almanac: Almanac, ledger: Ledger, key: str) -> Entry | None:
    """The last change of a published date, while it is to be pointed out."""
    entry = ledger.current.get((almanac.calendar_id, key))
    if entry is None or entry.was is None:
        return None
    return entry if almanac.as_of - entry.at.date() <= timedelta(days=NOTED_DAYS) else None
