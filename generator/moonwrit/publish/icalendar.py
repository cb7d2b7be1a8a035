"""iCalendar feeds (RFC 5545, 7986): all-day events for observances and month starts, timed ones for evenings.

SEQUENCE, DTSTAMP and LAST-MODIFIED come from the journal, so that an event that did not change is the same bytes at
every build, and one that moved keeps its UID.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping
from datetime import date, datetime, timedelta
from functools import partial
from zoneinfo import ZoneInfo

from icalendar import Alarm, Calendar, Event, vDDDTypes, vDuration, vText, vUri

from moonwrit import __version__
from moonwrit.almanac import Evening
from moonwrit.calendars import month_slug
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.journal import Entry, month_key
from moonwrit.observances import Occurrence
from moonwrit.observances.fasting import FastingDay
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.edition import Edition
from moonwrit.publish.language import Language
from moonwrit.publish.timezones import vtimezone

REFRESH = timedelta(hours=12)
"""A lower bound on how often a client should ask (RFC 7986, 5.7); clients keep their own hours."""
WITHDRAWN_DAYS = 60
"""A withdrawn event stays in the feeds as cancelled for this many days, so that clients learn of it."""


class FeedText(vText):
    """TEXT as RFC 5545, 3.3.11 has it. The library takes a backslash before a letter N for a line break."""

    def to_ical(self) -> bytes:
        return re.sub(r"[\\;,]", r"\\\g<0>", self).replace("\n", r"\n").encode()


def observances_feed(edition: Edition) -> bytes:
    """``observances.ics``: one event for each occurrence, and those withdrawn lately."""
    title = edition.language.gettext("%(calendar)s: observances") % {"calendar": edition.name}
    first = edition.first_rolling_year
    events = [*_occurrences(edition, lambda one: one.year >= first), *_withdrawn(edition, None)]
    return _feed(edition, "observances.ics", title, events)


def tag_feed(edition: Edition, tag: str) -> bytes:
    """``tags/<tag>.ics``: the observances of one tag."""
    title = edition.language.gettext("%(calendar)s: %(tag)s") % {"calendar": edition.name, "tag": tag}
    first = edition.first_rolling_year
    events = [*_occurrences(edition, lambda one: one.year >= first and tag in one.tags), *_withdrawn(edition, tag)]
    return _feed(edition, f"tags/{tag}.ics", title, events)


def year_feed(edition: Edition, year: int) -> bytes:
    """``years/<year>.ics``: the month starts and observances of one Hijri year, for a single import."""
    title = edition.language.gettext("%(calendar)s: year %(year)s") % {"calendar": edition.name, "year": year}
    events = [*_months(edition, lambda month: month.year == year), *_occurrences(edition, lambda one: one.year == year)]
    return _feed(edition, f"years/{year}.ics", title, events)


def months_feed(edition: Edition) -> bytes:
    """``months.ics``: one event for the first day of each month."""
    title = edition.language.gettext("%(calendar)s: months") % {"calendar": edition.name}
    first = edition.first_rolling_year
    return _feed(edition, "months.ics", title, list(_months(edition, lambda month: month.year >= first)))


def evenings_feed(edition: Edition) -> bytes:
    """``evenings.ics``: every 29th evening at each place, from sunset to moonset.

    No event where the Moon sets before the Sun or one of them does not set: there is nothing to look for.
    """
    almanac, first = edition.almanac, edition.first_rolling_year
    events = []
    for before, evening in zip([None, *almanac.months[:-1]], almanac.evenings, strict=True):
        if evening.month.year < first:
            continue
        # The evening's date hangs on where the month before began.
        month = before or evening.month
        entry = edition.entry(month_key(month.year, month.month))
        for place in almanac.places:
            event = _timed(edition, entry, evening, place)
            if event is not None:
                events.append(event.to_ical())
    title = edition.language.gettext("%(calendar)s: evenings for observers") % {"calendar": edition.name}
    zones = {place.timezone: place.zone for place in almanac.places.values()}
    return _feed(edition, "evenings.ics", title, events, zones)


def fasting_feed(edition: Edition, place: str) -> bytes:
    """``fasting/<place>.ics``: the days of fasting at a place, from dawn to sunset.

    A whole day where the Sun does not reach the angle or does not set: there is no time to give.
    """
    almanac, language = edition.almanac, edition.language
    events = [
        _fast(edition, table.month, one, place).to_ical()
        for table in almanac.fasting if table.month.year >= edition.first_rolling_year
        for one in table.at[place] if one.day is not None
    ]
    here = almanac.places[place]
    title = language.gettext("%(calendar)s: fasting days at %(place)s") % {
        "calendar": edition.name, "place": edition.say(here.name)}
    return _feed(edition, f"fasting/{place}.ics", title, events, {here.timezone: here.zone})


def tags(edition: Edition) -> list[str]:
    """Every tag of the observances, in order."""
    return sorted({tag for observance in edition.almanac.observances.values() for tag in observance.tags})


def was_sentence(entry: Entry, language: Language) -> list[str]:
    """What the date was before it moved, and why; nothing where it did not."""
    if entry.was is None:
        return []
    return [language.gettext("Moved: it was published as %(was)s. Reason: %(reason)s.") % {
        "was": language.full_date(entry.was), "reason": words.reason(entry.because, language),
    }]


# --- events ---------------------------------------------------------------------------------------


def _occurrences(edition: Edition, wanted: Callable[[Occurrence], bool]) -> Iterable[bytes]:
    for one in filter(wanted, edition.almanac.occurrences):
        yield _once(edition, one.key, partial(_occurrence, edition, one))


def _occurrence(edition: Edition, one: Occurrence) -> Event:
    observance = edition.almanac.observances[one.observance]
    about = [edition.say(observance.about)] if observance.about else []
    entry = edition.entry(one.key)
    event = _all_day(
        edition, entry,
        words.event_title(edition.say(observance.name), one, edition.language, moved=entry.was is not None),
        [*about, *_reasons(edition.month_of[one.year, one.month], edition.language)],
        f"observances/{one.observance}/", one.tags,
    )
    if edition.site.remind_hours_before is not None and "main" in one.tags:
        event.add_component(_reminder(edition.site.remind_hours_before, str(event["summary"])))
    return event


def _months(edition: Edition, wanted: Callable[[Month], bool]) -> Iterable[bytes]:
    for month in filter(wanted, edition.almanac.months):
        yield _once(edition, month_key(month.year, month.month), partial(_month, edition, month))


def _month(edition: Edition, month: Month) -> Event:
    entry = edition.entry(month_key(month.year, month.month))
    title = words.month_title(month, edition.language)
    return _all_day(
        edition, entry, words.remarked(title, month.standing, edition.language, moved=entry.was is not None),
        _reasons(month, edition.language), f"{month.year}/{month_slug(month.month)}/", ("month",), one_day=True,
    )


def _once(edition: Edition, key: str, make: Callable[[], Event]) -> bytes:
    """The lines of an event, which stands in several feeds, written once."""
    if key not in edition.written:
        edition.written[key] = make().to_ical()
    return edition.written[key]


def _withdrawn(edition: Edition, tag: str | None) -> Iterable[bytes]:
    """Withdrawn lately and still to be announced as cancelled; of one tag, those whose observance still carries it."""
    almanac = edition.almanac
    for (calendar, _), entry in sorted(edition.ledger.current.items()):
        if calendar != almanac.calendar_id or entry.standing != "withdrawn":
            continue
        if almanac.as_of - entry.at.date() > timedelta(days=WITHDRAWN_DAYS):
            continue
        observance = words.observance_of(entry.key, almanac.observances)
        if tag is None or (observance is not None and tag in almanac.observances[observance].tags):
            yield _cancelled(edition, entry).to_ical()


def _reasons(month: Month, language: Language) -> list[str]:
    return [
        words.basis_sentence(month, language), words.margin_sentence(month.margin, language),
        words.standing_sentence(month, language),
    ]


def _also(edition: Edition, day: date) -> list[str]:
    """The first day in the other calendars that the site keeps beside its own."""
    found = [
        f"{edition.language.gettext(TITLES[calendar])} {other}" for calendar in edition.site.also
        if (other := in_calendar(day, calendar)) is not None
    ]
    return [edition.language.listing(found) + "."] if found else []


def _all_day(
    edition: Edition, entry: Entry, title: str, paragraphs: Iterable[str], path: str, tags: Iterable[str],
    *, one_day: bool = False,
) -> Event:
    paragraphs = [*was_sentence(entry, edition.language), *paragraphs, *_also(edition, entry.starts)]
    event = _event(edition, entry.key, entry, title, paragraphs, path)
    _span(event, entry.starts, entry.starts if one_day else entry.ends)
    event.add("status", "TENTATIVE" if entry.standing == "expected" else "CONFIRMED")
    if tags := list(tags):
        event.add("categories", tags)
    return event


def _cancelled(edition: Edition, entry: Entry) -> Event:
    _ = edition.language.gettext
    name = words.published_name(entry.key, edition.almanac.observances, edition.site.language, edition.language)
    reason = _("Withdrawn: %(reason)s.") % {"reason": words.reason(entry.because, edition.language)}
    event = _event(edition, entry.key, entry, _("%(title)s (withdrawn)") % {"title": name}, [reason], "changes/")
    _span(event, entry.starts, entry.ends)
    event.add("status", "CANCELLED")
    return event


def _timed(edition: Edition, entry: Entry, evening: Evening, place: str) -> Event | None:
    row: Mapping[str, float | str | None] = evening.at[place]
    sunset, moonset, best = row["sunset_utc"], row["moonset_utc"], row["best_time_utc"]
    lag = row["lag_min"]
    if not isinstance(sunset, str) or not isinstance(moonset, str) or not isinstance(lag, float) or lag <= 0:
        return None
    here = edition.almanac.places[place]
    name, month, language = edition.say(here.name), evening.month, edition.language
    _ = language.gettext
    starts, ends = (datetime.fromisoformat(text).astimezone(here.zone) for text in (sunset, moonset))
    best_clock = language.clock(datetime.fromisoformat(str(best)).astimezone(here.zone))
    event = _event(
        edition, f"evening-{month.year}-{month.month:02d}-{place}", entry,
        _("Look for the crescent of %(month)s: %(place)s") % {
            "month": words.month_title(month, language), "place": name},
        [_("Best time %(best)s.") % {"best": best_clock}, words.basis_sentence(month, language), _(words.EYES)],
        f"evenings/{evening.on.isoformat()}/",
    )
    event.add("dtstart", starts)
    event.add("dtend", ends)
    event.add("location", FeedText(name))
    event.add("geo", (here.latitude, here.longitude))
    event.add("status", "CONFIRMED" if month.standing != "expected" else "TENTATIVE")
    return event


def _fast(edition: Edition, month: Month, one: FastingDay, place: str) -> Event:
    declared, here, language = edition.site.fasting, edition.almanac.places[place], edition.language
    assert declared is not None
    entry = edition.entry(month_key(month.year, month.month))
    _ = language.gettext
    times = _("Dawn %(dawn)s; sunset %(sunset)s.") % {
        which: words.fasting_moment(one, which, language) for which in ("dawn", "sunset")}
    event = _event(
        edition, f"fast-{month.year}-{one.day:02d}-{place}", entry,
        words.remarked(words.fast_title(one, language), month.standing, language, moved=entry.was is not None),
        [
            *was_sentence(entry, language), times, *words.fasting_notes([one], language),
            words.fasting_rule(declared, language), words.fasting_caution(language),
            words.standing_sentence(month, language),
        ],
        f"fasting/{month.year}/",
    )
    if isinstance(one.dawn, datetime) and isinstance(one.sunset, datetime):
        event.add("dtstart", one.dawn)
        event.add("dtend", one.sunset)
    else:
        _span(event, one.on, one.on)
    event.add("location", FeedText(edition.say(here.name)))
    event.add("geo", (here.latitude, here.longitude))
    event.add("status", "CONFIRMED" if month.standing != "expected" else "TENTATIVE")
    return event


def _event(
    edition: Edition, key: str, entry: Entry, title: str, paragraphs: Iterable[str], path: str
) -> Event:
    """What every event has; its days and status are the caller's."""
    language = edition.language
    event = Event()
    event.add("uid", edition.uid(key))
    # Without a METHOD, DTSTAMP means when the event was last revised (RFC 5545, 3.8.7.2).
    event.add("dtstamp", entry.at)
    event.add("last-modified", entry.at)
    event.add("sequence", entry.seq)
    event.add("summary", FeedText(title, params={"LANGUAGE": language.code}))
    event.add("description", FeedText(
        "\n\n".join([*paragraphs, words.authority_sentence(edition.say(edition.site.authority), language)]),
        params={"LANGUAGE": language.code},
    ))
    event.add("transp", "TRANSPARENT")
    event.add("url", vUri(edition.page(path)))
    return event


def _span(event: Event, starts: date, ends: date) -> None:
    """Whole days; the end is exclusive (RFC 5545, 3.6.1)."""
    event.add("dtstart", starts)
    event.add("dtend", ends + timedelta(days=1))


_END = b"END:VCALENDAR\r\n"


def _reminder(hours: int, title: str) -> Alarm:
    """Shown so many hours before the day's midnight (RFC 5545, 3.6.6)."""
    alarm = Alarm()
    alarm.add("action", "DISPLAY")
    alarm.add("trigger", timedelta(hours=-hours))
    alarm.add("description", FeedText(title))
    return alarm


def _feed(
    edition: Edition, name: str, title: str, events: list[bytes], zones: Mapping[str, ZoneInfo] | None = None
) -> bytes:
    """``zones``: those of timed events, by name."""
    language = edition.language
    authority = edition.say(edition.site.authority)
    calendar = Calendar()
    calendar.add("prodid", f"-//Moonwrit//Moonwrit {__version__}//EN")
    calendar.add("version", "2.0")
    calendar.add("calscale", "GREGORIAN")
    # No UID for the whole (RFC 7986, 5.3): subscribers that split a feed, such as vdirsyncer, give it to every event.
    calendar.add("name", FeedText(title, params={"LANGUAGE": language.code}))
    calendar.add("x-wr-calname", FeedText(title))
    calendar.add("description", FeedText(
        words.authority_sentence(authority, language), params={"LANGUAGE": language.code}
    ))
    calendar.add("url", vUri(edition.page()))
    calendar.add("last-modified", edition.last_change)
    # The library leaves out the parameter that RFC 7986, 5.7 requires.
    refresh = vDDDTypes(REFRESH)
    refresh.params["VALUE"] = "DURATION"
    calendar.add("refresh-interval", refresh)
    calendar.add("x-published-ttl", vDuration(REFRESH))
    source = vUri(edition.feed(name))
    source.params["VALUE"] = "URI"
    calendar.add("source", source)
    calendar.add("color", "midnightblue")
    first, last = edition.almanac.evenings[0].on.year, edition.almanac.evenings[-1].on.year
    for _, zone in sorted((zones or {}).items()):
        calendar.add_component(vtimezone(zone, first, last))
    head = bytes(calendar.to_ical()).removesuffix(_END)
    return b"".join([head, *events, _END])


__all__ = [
    "FeedText", "evenings_feed", "fasting_feed", "months_feed", "observances_feed", "tag_feed", "tags", "was_sentence",
    "year_feed",
]
