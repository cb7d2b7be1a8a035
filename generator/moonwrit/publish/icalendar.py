"""iCalendar feeds (RFC 5545, 7986): all-day events for observances and for month starts."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import UTC, date, datetime, timedelta
from urllib.parse import urlsplit
from uuid import NAMESPACE_URL, uuid5

from icalendar import Calendar, Event, vDDDTypes, vDuration, vText, vUri

from moonwrit import __version__
from moonwrit.almanac import Almanac
from moonwrit.calendars import month_slug
from moonwrit.content.models import in_language
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.language import ENGLISH, Language

REFRESH = timedelta(hours=12)
"""A lower bound on how often a client should ask (RFC 7986, 5.7); clients keep their own hours."""


def observances_feed(almanac: Almanac, language: Language = ENGLISH) -> bytes:
    """``feeds/observances.ics``: one event for each occurrence."""
    months = {(month.year, month.month): month for month in almanac.months}
    events = []
    for one in almanac.occurrences:
        observance = almanac.observances[one.observance]
        name = in_language(observance.name, language.code, almanac.site.language)
        month = months[one.year, one.month]
        about = [in_language(observance.about, language.code, almanac.site.language)] if observance.about else []
        events.append(_event(
            almanac, language, one.key, one.starts, one.ends, words.event_title(name, one, language),
            one.standing == "expected", [*about, *_reasons(month, language)], f"observances/{one.observance}/",
            one.tags,
        ))
    return _feed(almanac, language, "observances", _("%(calendar)s: observances", almanac, language), events)


def months_feed(almanac: Almanac, language: Language = ENGLISH) -> bytes:
    """``feeds/months.ics``: one event for the first day of each month."""
    events = [
        _event(
            almanac, language, f"month-{month.year}-{month.month:02d}", month.starts, month.starts,
            _month_title(month, language), month.standing == "expected", _reasons(month, language),
            f"{month.year}/{month_slug(month.month)}/", ("month",),
        )
        for month in almanac.months
    ]
    return _feed(almanac, language, "months", _("%(calendar)s: months", almanac, language), events)


def uid(almanac: Almanac, key: str) -> str:
    """The lasting name of an event: it does not change when its date does."""
    return f"{key}.{almanac.calendar_id}@{urlsplit(almanac.site.address).hostname}"


def stamp(almanac: Almanac) -> datetime:
    """When the content was last revised: without a METHOD, DTSTAMP means this and not the time of building."""
    return almanac.site.revised.astimezone(UTC).replace(microsecond=0)


def page(almanac: Almanac, path: str) -> str:
    return almanac.site.address.rstrip("/") + "/" + path


def _reasons(month: Month, language: Language) -> list[str]:
    return [
        words.basis_sentence(month, language), words.margin_sentence(month.margin, language),
        words.standing_sentence(month, language),
    ]


def _month_title(month: Month, language: Language) -> str:
    title = words.month_title(month, language)
    if month.standing != "expected":
        return title
    return language.gettext("%(title)s (expected)") % {"title": title}


def _event(
    almanac: Almanac, language: Language, key: str, starts: date, ends: date, title: str, expected: bool,
    paragraphs: Iterable[str], path: str, tags: Iterable[str],
) -> Event:
    authority = in_language(almanac.site.authority, language.code, almanac.site.language)
    event = Event()
    event.add("uid", uid(almanac, key))
    event.add("dtstamp", stamp(almanac))
    event.add("last-modified", stamp(almanac))
    event.add("sequence", 0)
    event.add("dtstart", starts)
    event.add("dtend", ends + timedelta(days=1))
    event.add("summary", vText(title, params={"LANGUAGE": language.code}))
    event.add("description", vText(
        "\n\n".join([*paragraphs, words.authority_sentence(authority, language)]),
        params={"LANGUAGE": language.code},
    ))
    event.add("transp", "TRANSPARENT")
    event.add("status", "TENTATIVE" if expected else "CONFIRMED")
    event.add("url", vUri(page(almanac, path)))
    if tags := list(tags):
        event.add("categories", tags)
    return event


def _(message: str, almanac: Almanac, language: Language) -> str:
    name = in_language(almanac.calendar.name, language.code, almanac.site.language)
    return language.gettext(message) % {"calendar": name}


def _feed(almanac: Almanac, language: Language, name: str, title: str, events: list[Event]) -> bytes:
    address = page(almanac, f"feeds/{name}.ics")
    authority = in_language(almanac.site.authority, language.code, almanac.site.language)
    calendar = Calendar()
    calendar.add("prodid", f"-//Moonwrit//Moonwrit {__version__}//EN")
    calendar.add("version", "2.0")
    calendar.add("calscale", "GREGORIAN")
    calendar.add("uid", str(uuid5(NAMESPACE_URL, f"{address}#{almanac.calendar_id}")))
    calendar.add("name", vText(title, params={"LANGUAGE": language.code}))
    calendar.add("x-wr-calname", title)
    calendar.add("description", vText(
        words.authority_sentence(authority, language), params={"LANGUAGE": language.code}
    ))
    calendar.add("url", vUri(page(almanac, "")))
    calendar.add("last-modified", stamp(almanac))
    # The library leaves out the parameter that RFC 7986, 5.7 requires.
    refresh = vDDDTypes(REFRESH)
    refresh.params["VALUE"] = "DURATION"
    calendar.add("refresh-interval", refresh)
    calendar.add("x-published-ttl", vDuration(REFRESH))
    source = vUri(address)
    source.params["VALUE"] = "URI"
    calendar.add("source", source)
    calendar.add("color", "midnightblue")
    for event in events:
        calendar.add_component(event)
    return bytes(calendar.to_ical())
