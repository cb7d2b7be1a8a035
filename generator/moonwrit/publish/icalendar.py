"""iCalendar feeds (RFC 5545, 7986): all-day events for observances and month starts, timed ones for evenings.

SEQUENCE, DTSTAMP and LAST-MODIFIED come from the journal, so that an event that did not change is the same bytes at
every build, and one that moved keeps its UID. A feed's parts are its head, its events and its end.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from datetime import date, datetime, timedelta
from zoneinfo import ZoneInfo

from icalendar import Alarm, Calendar, Event, vDDDTypes, vDuration, vText, vUri

from moonwrit import __version__
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.content.models import Place
from moonwrit.journal import Entry, month_key
from moonwrit.observances import Occurrence
from moonwrit.observances.fasting import FastingDay
from moonwrit.policy import Month
from moonwrit.policy.evening import Row
from moonwrit.publish import words
from moonwrit.publish.edition import Edition, Imprint, evening_path, fasting_path, month_path
from moonwrit.publish.language import Language
from moonwrit.publish.pieces import Parts, Piece, plain
from moonwrit.publish.timezones import vtimezone

REFRESH = timedelta(hours=12)
"""A lower bound on how often a client should ask (RFC 7986, 5.7); clients keep their own hours."""
WITHDRAWN_DAYS = 60
"""A withdrawn event stays in the feeds as cancelled for this many days, so that clients learn of it."""


class FeedText(vText):
    """TEXT as RFC 5545, 3.3.11 has it. The library takes a backslash before a letter N for a line break."""

    def to_ical(self) -> bytes:
        return re.sub(r"[\\;,]", r"\\\g<0>", self).replace("\n", r"\n").encode()


def observances_feed(edition: Edition) -> Parts:
    """``observances.ics``: one event for each occurrence, and those withdrawn lately."""
    title = edition.language.gettext("%(calendar)s: observances") % {"calendar": edition.imprint.name}
    first = edition.first_rolling_year
    return _feed(edition, "observances.ics", title, [
        *_occurrences(edition, lambda one: one.year >= first), *_withdrawn(edition, None),
    ])


def tag_feed(edition: Edition, tag: str) -> Parts:
    """``tags/<tag>.ics``: the observances of one tag."""
    title = edition.language.gettext("%(calendar)s: %(tag)s") % {"calendar": edition.imprint.name, "tag": tag}
    first = edition.first_rolling_year
    return _feed(edition, f"tags/{tag}.ics", title, [
        *_occurrences(edition, lambda one: one.year >= first and tag in one.tags), *_withdrawn(edition, tag),
    ])


def year_feed(edition: Edition, year: int) -> Parts:
    """``years/<year>.ics``: the month starts and observances of one Hijri year, for a single import."""
    names = {"calendar": edition.imprint.name, "year": year}
    title = edition.language.gettext("%(calendar)s: year %(year)s") % names
    return _feed(edition, f"years/{year}.ics", title, [
        *_months(edition, lambda month: month.year == year), *_occurrences(edition, lambda one: one.year == year),
    ])


def months_feed(edition: Edition) -> Parts:
    """``months.ics``: one event for the first day of each month."""
    title = edition.language.gettext("%(calendar)s: months") % {"calendar": edition.imprint.name}
    first = edition.first_rolling_year
    return _feed(edition, "months.ics", title, _months(edition, lambda month: month.year >= first))


def evenings_feed(edition: Edition) -> Parts:
    """``evenings.ics``: every 29th evening at each place, from sunset to moonset.

    No event where the Moon sets before the Sun or one of them does not set: there is nothing to look for.
    """
    almanac = edition.almanac
    title = edition.language.gettext("%(calendar)s: evenings for observers") % {"calendar": edition.imprint.name}
    zones = {place.timezone: place.zone for place in almanac.places.values()}
    return _feed(edition, "evenings.ics", title, _evenings(edition), [zone for _, zone in sorted(zones.items())])


def fasting_feed(edition: Edition, place: str) -> Parts:
    """``fasting/<place>.ics``: the days of fasting at a place, from dawn to sunset.

    A whole day where the Sun does not reach the angle or does not set: there is no time to give.
    """
    here = edition.almanac.places[place]
    title = edition.language.gettext("%(calendar)s: fasting days at %(place)s") % {
        "calendar": edition.imprint.name, "place": edition.imprint.say(here.name)}
    return _feed(edition, f"fasting/{place}.ics", title, _fasts(edition, place), [here.zone])


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


_Dated = tuple[Entry, Piece]
"""An event, and what the journal knows of it."""


def _occurrences(edition: Edition, wanted: Callable[[Occurrence], bool]) -> Iterable[_Dated]:
    for one in filter(wanted, edition.almanac.occurrences):
        entry = edition.entry(one.key)
        if one.key not in edition.events:
            month = edition.month_of[one.year, one.month]
            edition.events[one.key] = edition.piece(_occurrence, edition.imprint, one, month, entry)
        yield entry, edition.events[one.key]


def _occurrence(imprint: Imprint, one: Occurrence, month: Month, entry: Entry) -> bytes:
    observance, remind = imprint.observances[one.observance], imprint.site.remind_hours_before
    event = _all_day(
        imprint, entry,
        words.event_title(imprint.say(observance.name), one, imprint.language, moved=entry.was is not None),
        [*([imprint.say(observance.about)] if observance.about else []), *_reasons(month, imprint.language)],
        f"observances/{one.observance}/", one.tags,
    )
    if remind is not None and "main" in one.tags:
        event.add_component(_reminder(remind, str(event["summary"])))
    return bytes(event.to_ical())


def _months(edition: Edition, wanted: Callable[[Month], bool]) -> Iterable[_Dated]:
    for month in filter(wanted, edition.almanac.months):
        entry = edition.entry(month_key(month.year, month.month))
        yield entry, edition.piece(_month, edition.imprint, month, entry)


def _month(imprint: Imprint, month: Month, entry: Entry) -> bytes:
    title = words.month_title(month, imprint.language)
    event = _all_day(
        imprint, entry, words.remarked(title, month.standing, imprint.language, moved=entry.was is not None),
        _reasons(month, imprint.language), month_path(month), ("month",), one_day=True,
    )
    return bytes(event.to_ical())


def _withdrawn(edition: Edition, tag: str | None) -> Iterable[_Dated]:
    """Withdrawn lately and still to be announced as cancelled; of one tag, those whose observance still carries it."""
    almanac = edition.almanac
    for (calendar, _), entry in sorted(edition.ledger.current.items()):
        if calendar != almanac.calendar_id or entry.standing != "withdrawn":
            continue
        if almanac.as_of - entry.at.date() > timedelta(days=WITHDRAWN_DAYS):
            continue
        observance = words.observance_of(entry.key, almanac.observances)
        if tag is None or (observance is not None and tag in almanac.observances[observance].tags):
            yield entry, edition.piece(_cancelled, edition.imprint, entry)


def _evenings(edition: Edition) -> Iterable[_Dated]:
    almanac = edition.almanac
    for before, evening in zip([None, *almanac.months[:-1]], almanac.evenings, strict=True):
        if evening.month.year < edition.first_rolling_year:
            continue
        # The evening's date hangs on where the month before began.
        hangs_on = before or evening.month
        entry = edition.entry(month_key(hangs_on.year, hangs_on.month))
        for name, place in almanac.places.items():
            row = evening.at[name]
            lag = row["lag_min"]
            if isinstance(row["sunset_utc"], str) and isinstance(row["moonset_utc"], str) and (
                    isinstance(lag, float) and lag > 0):
                yield entry, edition.piece(_timed, edition.imprint, entry, evening.month, row, name, place)


def _fasts(edition: Edition, place: str) -> Iterable[_Dated]:
    here = edition.almanac.places[place]
    for table in edition.almanac.fasting:
        if table.month.year < edition.first_rolling_year:
            continue
        entry = edition.entry(month_key(table.month.year, table.month.month))
        for one in table.at[place]:
            if one.day is not None:
                yield entry, edition.piece(_fast, edition.imprint, entry, table.month, one, place, here)


def _reasons(month: Month, language: Language) -> list[str]:
    return [
        words.basis_sentence(month, language), words.margin_sentence(month.margin, language),
        words.standing_sentence(month, language),
    ]


def _also(imprint: Imprint, day: date) -> list[str]:
    """The first day in the other calendars that the site keeps beside its own."""
    found = [
        f"{imprint.language.gettext(TITLES[calendar])} {other}" for calendar in imprint.site.also
        if (other := in_calendar(day, calendar)) is not None
    ]
    return [imprint.language.listing(found) + "."] if found else []


def _all_day(
    imprint: Imprint, entry: Entry, title: str, paragraphs: Iterable[str], path: str, tags: Iterable[str],
    *, one_day: bool = False,
) -> Event:
    paragraphs = [*was_sentence(entry, imprint.language), *paragraphs, *_also(imprint, entry.starts)]
    event = _event(imprint, entry.key, entry, title, paragraphs, path)
    _span(event, entry.starts, entry.starts if one_day else entry.ends)
    event.add("status", "TENTATIVE" if entry.standing == "expected" else "CONFIRMED")
    if tags := list(tags):
        event.add("categories", tags)
    return event


def _cancelled(imprint: Imprint, entry: Entry) -> bytes:
    _ = imprint.language.gettext
    name = words.published_name(entry.key, imprint.observances, imprint.site.language, imprint.language)
    reason = _("Withdrawn: %(reason)s.") % {"reason": words.reason(entry.because, imprint.language)}
    event = _event(imprint, entry.key, entry, _("%(title)s (withdrawn)") % {"title": name}, [reason], "changes/")
    _span(event, entry.starts, entry.ends)
    event.add("status", "CANCELLED")
    return bytes(event.to_ical())


def _timed(imprint: Imprint, entry: Entry, month: Month, row: Row, place: str, here: Place) -> bytes:
    name, language = imprint.say(here.name), imprint.language
    _ = language.gettext
    starts, best, ends = (
        datetime.fromisoformat(str(row[key])).astimezone(here.zone)
        for key in ("sunset_utc", "best_time_utc", "moonset_utc")
    )
    event = _event(
        imprint, f"evening-{month.year}-{month.month:02d}-{place}", entry,
        _("Look for the crescent of %(month)s: %(place)s") % {
            "month": words.month_title(month, language), "place": name},
        [_("Best time %(best)s.") % {"best": language.clock(best)}, words.basis_sentence(month, language),
         _(words.EYES)],
        evening_path(month.evidence.evening),
    )
    event.add("dtstart", starts)
    event.add("dtend", ends)
    _at(event, name, here)
    event.add("status", "CONFIRMED" if month.standing != "expected" else "TENTATIVE")
    return bytes(event.to_ical())


def _fast(imprint: Imprint, entry: Entry, month: Month, one: FastingDay, place: str, here: Place) -> bytes:
    declared, language = imprint.site.fasting, imprint.language
    assert declared is not None
    _ = language.gettext
    times = _("Dawn %(dawn)s; sunset %(sunset)s.") % {
        which: words.fasting_moment(one, which, language) for which in ("dawn", "sunset")}
    event = _event(
        imprint, f"fast-{month.year}-{one.day:02d}-{place}", entry,
        words.remarked(words.fast_title(one, language), month.standing, language, moved=entry.was is not None),
        [
            *was_sentence(entry, language), times, *words.fasting_notes([one], language),
            words.fasting_rule(declared, language), words.fasting_caution(language),
            words.standing_sentence(month, language),
        ],
        fasting_path(month.year),
    )
    if isinstance(one.dawn, datetime) and isinstance(one.sunset, datetime):
        event.add("dtstart", one.dawn)
        event.add("dtend", one.sunset)
    else:
        _span(event, one.on, one.on)
    _at(event, imprint.say(here.name), here)
    event.add("status", "CONFIRMED" if month.standing != "expected" else "TENTATIVE")
    return bytes(event.to_ical())


def _at(event: Event, name: str, here: Place) -> None:
    event.add("location", FeedText(name))
    event.add("geo", (here.latitude, here.longitude))


def _event(
    imprint: Imprint, key: str, entry: Entry, title: str, paragraphs: Iterable[str], path: str
) -> Event:
    """What every event has; its days and status are the caller's."""
    language = imprint.language
    event = Event()
    event.add("uid", imprint.uid(key))
    # Without a METHOD, DTSTAMP means when the event was last revised (RFC 5545, 3.8.7.2).
    event.add("dtstamp", entry.at)
    event.add("last-modified", entry.at)
    event.add("sequence", entry.seq)
    event.add("summary", FeedText(title, params={"LANGUAGE": language.code}))
    event.add("description", FeedText(
        "\n\n".join([*paragraphs, words.authority_sentence(imprint.authority, language)]),
        params={"LANGUAGE": language.code},
    ))
    event.add("transp", "TRANSPARENT")
    event.add("url", vUri(imprint.page(path)))
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
    edition: Edition, name: str, title: str, events: Iterable[_Dated], zones: Sequence[ZoneInfo] = ()
) -> Parts:
    """``zones``: those of timed events."""
    events, evenings = list(events), edition.almanac.evenings
    changed = edition.last_of(entry for entry, _ in events)
    years = evenings[0].on.year, evenings[-1].on.year
    head = edition.piece(_head, edition.imprint, name, title, changed, zones, years if zones else None)
    return (head, *(event for _, event in events), plain(_END))


def _head(
    imprint: Imprint, name: str, title: str, changed: datetime, zones: Sequence[ZoneInfo], years: tuple[int, int] | None
) -> bytes:
    language = imprint.language
    calendar = Calendar()
    calendar.add("prodid", f"-//Moonwrit//Moonwrit {__version__}//EN")
    calendar.add("version", "2.0")
    calendar.add("calscale", "GREGORIAN")
    # No UID for the whole (RFC 7986, 5.3): subscribers that split a feed, such as vdirsyncer, give it to every event.
    calendar.add("name", FeedText(title, params={"LANGUAGE": language.code}))
    calendar.add("x-wr-calname", FeedText(title))
    calendar.add("description", FeedText(
        words.authority_sentence(imprint.authority, language), params={"LANGUAGE": language.code}
    ))
    calendar.add("url", vUri(imprint.page()))
    calendar.add("last-modified", changed)
    # The library leaves out the parameter that RFC 7986, 5.7 requires.
    refresh = vDDDTypes(REFRESH)
    refresh.params["VALUE"] = "DURATION"
    calendar.add("refresh-interval", refresh)
    calendar.add("x-published-ttl", vDuration(REFRESH))
    source = vUri(imprint.feed(name))
    source.params["VALUE"] = "URI"
    calendar.add("source", source)
    calendar.add("color", "midnightblue")
    for zone in zones:
        assert years is not None
        calendar.add_component(vtimezone(zone, *years))
    return bytes(calendar.to_ical()).removesuffix(_END)


__all__ = [
    "FeedText", "evenings_feed", "fasting_feed", "months_feed", "observances_feed", "tag_feed", "tags", "was_sentence",
    "year_feed",
]
