"""iCalendar feeds (RFC 5545, 7986): all-day events for observances and month starts, timed ones for evenings.

SEQUENCE, DTSTAMP and LAST-MODIFIED come from the journal, so that an event that did not change is the same bytes at
every build, and one that moved keeps its UID.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import date, datetime, timedelta
from urllib.parse import urlsplit

from icalendar import Calendar, Event, vDDDTypes, vDuration, vText, vUri

from moonwrit import __version__
from moonwrit.almanac import Almanac, Evening
from moonwrit.calendars import month_slug
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.content.models import in_language
from moonwrit.journal import Entry, Ledger, month_key
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.language import ENGLISH, Language

REFRESH = timedelta(hours=12)
"""A lower bound on how often a client should ask (RFC 7986, 5.7); clients keep their own hours."""
WITHDRAWN_DAYS = 60
"""A withdrawn event stays in the feeds as cancelled for this many days, so that clients learn of it."""


def observances_feed(almanac: Almanac, ledger: Ledger, language: Language = ENGLISH) -> bytes:
    """``feeds/observances.ics``: one event for each occurrence, and those withdrawn lately."""
    months = {(month.year, month.month): month for month in almanac.months}
    events = []
    for one in almanac.occurrences:
        observance = almanac.observances[one.observance]
        name = in_language(observance.name, language.code, almanac.site.language)
        about = [in_language(observance.about, language.code, almanac.site.language)] if observance.about else []
        events.append(_all_day(
            almanac, language, ledger.entry(almanac.calendar_id, one.key), words.event_title(name, one, language),
            [*about, *_reasons(months[one.year, one.month], language)], f"observances/{one.observance}/", one.tags,
        ))
    events += [_cancelled(almanac, language, entry) for entry in withdrawn_lately(almanac, ledger)]
    title = _titled("%(calendar)s: observances", almanac, language)
    return _feed(almanac, ledger, language, "observances", title, events)


def months_feed(almanac: Almanac, ledger: Ledger, language: Language = ENGLISH) -> bytes:
    """``feeds/months.ics``: one event for the first day of each month."""
    events = []
    for month in almanac.months:
        entry = ledger.entry(almanac.calendar_id, month_key(month.year, month.month))
        title = words.month_title(month, language)
        if month.standing == "expected":
            title = language.gettext("%(title)s (expected)") % {"title": title}
        events.append(_all_day(
            almanac, language, entry, title, _reasons(month, language),
            f"{month.year}/{month_slug(month.month)}/", ("month",), one_day=True,
        ))
    return _feed(almanac, ledger, language, "months", _titled("%(calendar)s: months", almanac, language), events)


def evenings_feed(almanac: Almanac, ledger: Ledger, language: Language = ENGLISH) -> bytes:
    """``feeds/evenings.ics``: every 29th evening at each place, from sunset to moonset.

    No event where the Moon sets before the Sun or one of them does not set: there is nothing to look for.
    """
    events = []
    for before, evening in zip([None, *almanac.months[:-1]], almanac.evenings, strict=True):
        # The evening's date hangs on where the month before began.
        month = before or evening.month
        entry = ledger.entry(almanac.calendar_id, month_key(month.year, month.month))
        for place in almanac.places:
            event = _timed(almanac, language, entry, evening, place)
            if event is not None:
                events.append(event)
    title = _titled("%(calendar)s: evenings for observers", almanac, language)
    return _feed(almanac, ledger, language, "evenings", title, events, zoned=True)


def uid(almanac: Almanac, key: str) -> str:
    """The lasting name of an event: it does not change when its date does."""
    return f"{key}.{almanac.calendar_id}@{urlsplit(almanac.site.address).hostname}"


def page(almanac: Almanac, path: str) -> str:
    return almanac.site.address.rstrip("/") + "/" + path


def withdrawn_lately(almanac: Almanac, ledger: Ledger) -> list[Entry]:
    """Entries of the calendar that were withdrawn and are still to be announced as cancelled."""
    return [
        entry for (calendar, _), entry in sorted(ledger.current.items())
        if calendar == almanac.calendar_id and entry.standing == "withdrawn"
        and almanac.as_of - entry.at.date() <= timedelta(days=WITHDRAWN_DAYS)
    ]


def was_sentence(entry: Entry, language: Language) -> list[str]:
    """What the date was before it moved, and why; nothing where it did not."""
    if entry.was is None:
        return []
    return [language.gettext("Moved: it was published as %(was)s. Reason: %(reason)s.") % {
        "was": language.full_date(entry.was), "reason": entry.because or "",
    }]


def _also(almanac: Almanac, day: date, language: Language) -> list[str]:
    """The first day in the other calendars that the site keeps beside its own."""
    found = [
        f"{language.gettext(TITLES[calendar])} {other}" for calendar in almanac.site.also
        if (other := in_calendar(day, calendar)) is not None
    ]
    return [language.listing(found) + "."] if found else []


def _reasons(month: Month, language: Language) -> list[str]:
    return [
        words.basis_sentence(month, language), words.margin_sentence(month.margin, language),
        words.standing_sentence(month, language),
    ]


def _all_day(
    almanac: Almanac, language: Language, entry: Entry, title: str, paragraphs: Iterable[str], path: str,
    tags: Iterable[str], *, one_day: bool = False,
) -> Event:
    if entry.was is not None and entry.standing != "expected":
        title = language.gettext("%(title)s (moved)") % {"title": title}
    paragraphs = [*was_sentence(entry, language), *paragraphs, *_also(almanac, entry.starts, language)]
    event = _event(almanac, language, entry.key, entry, title, paragraphs, path)
    _span(event, entry.starts, entry.starts if one_day else entry.ends)
    event.add("status", "TENTATIVE" if entry.standing == "expected" else "CONFIRMED")
    if tags := list(tags):
        event.add("categories", tags)
    return event


def _cancelled(almanac: Almanac, language: Language, entry: Entry) -> Event:
    observance = next((name for name in sorted(almanac.observances, key=len, reverse=True)
                       if entry.key.startswith(f"{name}-")), None)
    name = entry.key if observance is None else in_language(
        almanac.observances[observance].name, language.code, almanac.site.language)
    title = language.gettext("%(title)s (withdrawn)") % {"title": name}
    reason = language.gettext("Withdrawn: %(reason)s.") % {"reason": entry.because or ""}
    event = _event(almanac, language, entry.key, entry, title, [reason], "changes/")
    _span(event, entry.starts, entry.ends)
    event.add("status", "CANCELLED")
    return event


def _timed(
    almanac: Almanac, language: Language, entry: Entry, evening: Evening, place: str
) -> Event | None:
    row: Mapping[str, float | str | None] = evening.at[place]
    sunset, moonset, best = row["sunset_utc"], row["moonset_utc"], row["best_time_utc"]
    lag = row["lag_min"]
    if not isinstance(sunset, str) or not isinstance(moonset, str) or not isinstance(lag, float) or lag <= 0:
        return None
    zone = almanac.places[place].zone
    name = in_language(almanac.places[place].name, language.code, almanac.site.language)
    month = evening.month
    _ = language.gettext
    starts, ends = (datetime.fromisoformat(text).astimezone(zone) for text in (sunset, moonset))
    best_clock = language.clock(datetime.fromisoformat(str(best)).astimezone(zone))
    event = _event(
        almanac, language, f"evening-{month.year}-{month.month:02d}-{place}", entry,
        _("Look for the crescent of %(month)s: %(place)s") % {
            "month": words.month_title(month, language), "place": name},
        [_("Best time %(best)s.") % {"best": best_clock}, words.basis_sentence(month, language), _(words.EYES)],
        f"evenings/{evening.on.isoformat()}/",
    )
    event.add("dtstart", starts)
    event.add("dtend", ends)
    event.add("location", vText(name))
    event.add("geo", (almanac.places[place].latitude, almanac.places[place].longitude))
    event.add("status", "CONFIRMED" if month.standing != "expected" else "TENTATIVE")
    return event


def _event(
    almanac: Almanac, language: Language, key: str, entry: Entry, title: str, paragraphs: Iterable[str], path: str
) -> Event:
    """What every event has; its days and status are the caller's."""
    authority = in_language(almanac.site.authority, language.code, almanac.site.language)
    event = Event()
    event.add("uid", uid(almanac, key))
    # Without a METHOD, DTSTAMP means when the event was last revised (RFC 5545, 3.8.7.2).
    event.add("dtstamp", entry.at)
    event.add("last-modified", entry.at)
    event.add("sequence", entry.seq)
    event.add("summary", vText(title, params={"LANGUAGE": language.code}))
    event.add("description", vText(
        "\n\n".join([*paragraphs, words.authority_sentence(authority, language)]),
        params={"LANGUAGE": language.code},
    ))
    event.add("transp", "TRANSPARENT")
    event.add("url", vUri(page(almanac, path)))
    return event


def _span(event: Event, starts: date, ends: date) -> None:
    """Whole days; the end is exclusive (RFC 5545, 3.6.1)."""
    event.add("dtstart", starts)
    event.add("dtend", ends + timedelta(days=1))


def _titled(message: str, almanac: Almanac, language: Language) -> str:
    name = in_language(almanac.calendar.name, language.code, almanac.site.language)
    return language.gettext(message) % {"calendar": name}


def last_change(almanac: Almanac, ledger: Ledger) -> datetime:
    """When anything of the calendar was last published anew."""
    return max(entry.at for (calendar, _), entry in ledger.current.items() if calendar == almanac.calendar_id)


def _feed(
    almanac: Almanac, ledger: Ledger, language: Language, name: str, title: str, events: list[Event],
    *, zoned: bool = False,
) -> bytes:
    address = page(almanac, f"feeds/{name}.ics")
    authority = in_language(almanac.site.authority, language.code, almanac.site.language)
    calendar = Calendar()
    calendar.add("prodid", f"-//Moonwrit//Moonwrit {__version__}//EN")
    calendar.add("version", "2.0")
    calendar.add("calscale", "GREGORIAN")
    # No UID for the whole (RFC 7986, 5.3): subscribers that split a feed, such as vdirsyncer, give it to every event.
    calendar.add("name", vText(title, params={"LANGUAGE": language.code}))
    calendar.add("x-wr-calname", title)
    calendar.add("description", vText(
        words.authority_sentence(authority, language), params={"LANGUAGE": language.code}
    ))
    calendar.add("url", vUri(page(almanac, "")))
    calendar.add("last-modified", last_change(almanac, ledger))
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
    if zoned:
        first, last = almanac.evenings[0].on, almanac.evenings[-1].on
        calendar.add_missing_timezones(date(first.year - 1, 1, 1), date(last.year + 1, 12, 31))
    return bytes(calendar.to_ical())


__all__ = [
    "evenings_feed", "last_change", "months_feed", "observances_feed", "page", "uid", "was_sentence",
    "withdrawn_lately",
]
