"""The plain sentences: why a month begins when it does, how close the call was, what is still open.

Used by pages, feeds and ``moonwrit why``. Every sentence is looked up in the language's catalogue.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from datetime import date, datetime
from itertools import pairwise
from typing import TYPE_CHECKING, Literal

from moonwrit.content.models import Fasting, Observance, When, in_language
from moonwrit.observances import Occurrence
from moonwrit.policy.months import Closeness, Finding, Margin, Month, Note, Standing
from moonwrit.publish import labels
from moonwrit.publish.language import ENGLISH, Language

if TYPE_CHECKING:
    from moonwrit.observances.fasting import FastingDay

EYES = labels.EYES


def why_paragraphs(month: Month, language: Language = ENGLISH) -> list[str]:
    """Why the month begins on its day: when, on what basis, how close it was, and what is still open."""
    return [
        begins_sentence(month, language),
        basis_sentence(month, language),
        *([conjunction_sentence(month, language)] if month.evidence.conjunction else []),
        margin_sentence(month.margin, language),
        standing_sentence(month, language),
        *note_sentences(month, language),
    ]


def month_title(month: Month, language: Language = ENGLISH) -> str:
    """Ramadan 1447"""
    return title_of(month.year, month.month, language)


def title_of(year: int, month: int, language: Language = ENGLISH) -> str:
    _ = language.gettext
    return _("%(month)s %(year)s") % {"month": language.month(month), "year": language.digits(year)}


def begins_sentence(month: Month, language: Language = ENGLISH) -> str:
    _ = language.gettext
    return _("%(month)s begins at sunset on %(eve)s; its first day is %(day)s.") % {
        "month": month_title(month, language),
        "eve": language.full_date(month.eve),
        "day": language.full_date(month.starts),
    }


def basis_sentence(month: Month, language: Language = ENGLISH) -> str:
    """What the start rests on, for each basis."""
    _ = language.gettext
    names = {
        "month": language.month(month.month),
        "before": language.month((month.month - 2) % 12 + 1),
        "evening": language.full_date(month.evidence.evening),
        "eve": language.full_date(month.eve),
        "found": found_sentence(month, language),
    }
    match month.basis:
        case "arithmetic":
            text = _("The date follows from arithmetic alone, a fixed pattern of months and years; the sky is not "
                     "asked.")
        case "tabulated":
            text = _("The date is taken from the table that the policy follows.")
        case "adopted" if month.evidence.findings:
            text = _("The date is adopted from another authority, which asked the evening of %(evening)s. "
                     "%(found)s")
        case "adopted":
            text = _("The date is adopted from another authority.")
        case "sighted" if month.evidence.findings:
            text = _("The new crescent is accepted as seen on the evening of %(eve)s. By calculation: %(found)s")
        case "sighted":
            text = _("The new crescent is accepted as seen on the evening of %(eve)s.")
        case "calculated" if month.evidence.met is False:
            text = _("The evening asked is that of %(evening)s. The policy's test is not met. %(found)s")
        case "calculated":
            text = _("On the evening of %(evening)s, the 29th of %(before)s, the policy's test is met. %(found)s")
        case "completed" if month.evidence.met:
            text = _("%(before)s is given thirty days, although the policy's test is met on its 29th evening, "
                     "%(evening)s. %(found)s")
        case "completed":
            text = _("On the evening of %(evening)s, the 29th of %(before)s, the policy's test is not met. "
                     "%(found)s So %(before)s is given thirty days, and %(month)s begins one evening later.")
    return (text % names).strip()


def found_sentence(month: Month, language: Language = ENGLISH) -> str:
    """The deciding comparison in words; empty where nothing was compared."""
    finding = deciding_finding(month)
    if finding is None:
        return ""
    _ = language.gettext
    names = {
        "place": language.name(finding.place),
        "quantity": quantity(finding.quantity, language),
        "value": measured(finding.value, finding.unit, language) if finding.value is not None else "",
        "asked": asked(finding, language),
    }
    if finding.value is None:
        return _("At %(place)s the %(quantity)s has no value, for the Sun or the Moon does not set there; "
                 "%(asked)s is asked.") % names
    return _("At %(place)s the %(quantity)s is %(value)s; %(asked)s is asked.") % names


def conjunction_sentence(month: Month, language: Language = ENGLISH) -> str:
    """When Sun and Moon stood in line, and how old the Moon was at the sunset asked."""
    _ = language.gettext
    moment = month.evidence.conjunction
    if moment is None:
        return ""
    age = month.evidence.circumstances.get("age_h")
    names = {
        "time": language.clock(moment),
        "date": language.long_date(moment.date()),
        "place": language.name(month.evidence.place or ""),
        "age": language.number(abs(age), 1) if isinstance(age, float | int) else "",
    }
    if not isinstance(age, float | int) or not month.evidence.place:
        return _("The conjunction of Moon and Sun is at %(time)s UTC on %(date)s.") % names
    if age < 0:
        return _("The conjunction of Moon and Sun is at %(time)s UTC on %(date)s, %(age)s hours after that "
                 "sunset at %(place)s.") % names
    return _("The conjunction of Moon and Sun is at %(time)s UTC on %(date)s; at that sunset at %(place)s the "
             "Moon is %(age)s hours old.") % names


def margin_sentence(margin: Margin, language: Language = ENGLISH) -> str:
    """How close the call was."""
    _ = language.gettext
    if margin.closeness == "fixed":
        return _("The date is fixed: nothing is measured that could turn out otherwise.")
    label = quantity(margin.quantity, language)
    if margin.margin is None or margin.day_share is None or margin.value is None or margin.threshold is None:
        return _("How close it was cannot be said in numbers, for the %(quantity)s has no value that evening.") % {
            "quantity": label
        }
    names = {
        "gap": measured(abs(margin.margin), margin.unit, language),
        "quantity": label,
        "while": _while(margin.day_share, language),
    }
    above = margin.value >= margin.threshold
    match margin.closeness:
        case "edge":
            text = (
                _("%(gap)s above the limit: on the edge. The %(quantity)s usually changes by as much in "
                  "%(while)s, so a slightly different convention or state of the air would change the date.")
                if above else
                _("%(gap)s below the limit: on the edge. The %(quantity)s usually changes by as much in "
                  "%(while)s, so a slightly different convention or state of the air would change the date.")
            )
        case "close":
            text = (
                _("%(gap)s above the limit: a close call. The %(quantity)s usually changes by as much in "
                  "%(while)s.")
                if above else
                _("%(gap)s below the limit: a close call. The %(quantity)s usually changes by as much in "
                  "%(while)s.")
            )
        case _:
            text = (
                _("%(gap)s above the limit: a wide margin. The %(quantity)s usually changes by as much in "
                  "%(while)s.")
                if above else
                _("%(gap)s below the limit: a wide margin. The %(quantity)s usually changes by as much in "
                  "%(while)s.")
            )
    return text % names


def standing_sentence(month: Month, language: Language = ENGLISH) -> str:
    """Is it settled, and between which days it may still move."""
    _ = language.gettext
    match month.standing:
        case "settled":
            if month.decision is None:
                return _("Settled: the policy itself gives the date, and no decision is needed.")
            return _("Settled: the community has decided.")
        case "amended":
            return _("Amended: a date was settled before, and has been changed to this one.")
        case _:
            pass
    earliest, latest = month.window or (month.starts, month.starts)
    if earliest == latest:
        return _("Expected: no decision is recorded yet.")
    return _("Expected: no decision is recorded yet. For planning, the first day may fall from %(earliest)s to "
             "%(latest)s.") % {
        "earliest": language.full_date(earliest),
        "latest": language.full_date(latest),
    }


def note_sentences(month: Month, language: Language = ENGLISH) -> list[str]:
    """What was unusual about it."""
    return [said(note, language) for note in month.evidence.notes]


def said(note: Note, language: Language = ENGLISH) -> str:
    """A note with its values in the language's form."""
    values = {
        key: language.long_date(value) if isinstance(value, date)
        else in_brief(value, language) if isinstance(value, Finding) else value
        for key, value in note.values.items()
    }
    return language.gettext(note.text) % language.values(values)


def in_brief(finding: Finding, language: Language = ENGLISH) -> str:
    """A comparison in few words: age of the Moon 5.6 hours (more than 0 hours is asked), Makkah"""
    value = "–" if finding.value is None else measured(finding.value, finding.unit, language)
    return language.gettext("%(quantity)s %(value)s (%(asked)s is asked), %(place)s") % {
        "quantity": quantity(finding.quantity, language), "value": value, "asked": asked(finding, language),
        "place": language.name(finding.place),
    }


def reason(text: str | None, language: Language = ENGLISH) -> str:
    """The journal's reason for a change in the language, as far as it is the journal's own words."""
    _ = language.gettext
    if text is None:
        return ""
    if found := _BY_DECISION.fullmatch(text):
        return _("decision of %(date)s on %(month)s by %(who)s") % {
            "date": language.long_date(date.fromisoformat(found[1])),
            "month": title_of(int(found[2]), int(found[3]), language), "who": found[4],
        }
    if found := _BY_AMENDMENT.fullmatch(text):
        return _("amendment of %(date)s by %(who)s: %(why)s") % {
            "date": language.long_date(date.fromisoformat(found[1])), "who": found[2], "why": found[3],
        }
    return text


_BY_DECISION = re.compile(r"decision of (\d{4}-\d{2}-\d{2}) on month (\d+)-(\d{2}) by (.*)", re.DOTALL)
_BY_AMENDMENT = re.compile(r"amendment of (\d{4}-\d{2}-\d{2}) by (.*?): (.*)", re.DOTALL)
"""As the journal writes them."""


def authority_sentence(authority: str, language: Language = ENGLISH) -> str:
    """The standard caution: whose word it is."""
    _ = language.gettext
    return _("These dates state what the adopted policy gives, and why; they are no religious ruling. The word of "
             "your own community's authority comes first: here, %(authority)s.") % {"authority": authority}


# --- parts of sentences --------------------------------------------------------------------------


def standing(value: Standing, language: Language = ENGLISH) -> str:
    return language.gettext(labels.STANDINGS[value])


def closeness(value: Closeness, language: Language = ENGLISH) -> str:
    return language.gettext(labels.CLOSENESS[value])


def quantity(name: str, language: Language = ENGLISH) -> str:
    return language.gettext(labels.QUANTITIES.get(name, name))


def frame(text: str, language: Language = ENGLISH) -> str:
    """How a quantity is measured: topocentric, airless, at sunset."""
    return language.listing([language.gettext(labels.FRAMES.get(part, part)) for part in text.split(", ")])


def measured(value: float, unit: str, language: Language = ENGLISH) -> str:
    """A number with its unit in words: 0.5 degrees."""
    return language.gettext(labels.UNITS_IN_WORDS[unit]) % {"number": language.number(value)}


def with_sign(
    value: float, unit: str, language: Language = ENGLISH, *, plus: bool = False, decimals: int = 4
) -> str:
    """A number with its unit as a sign: 0.5°; with ``plus``, +0.5°."""
    number = ("+" if plus and value > 0 else "") + language.number(value, decimals)
    return language.gettext(labels.UNITS_AS_SIGNS[unit]) % {"number": number}


def circumstance(key: str, value: float, language: Language = ENGLISH) -> str:
    """A value of the evening, by its key, to the decimals that mean something."""
    unit = labels.UNIT_OF_KEY.get(key.rpartition("_")[2], "")
    return with_sign(value, unit, language, decimals=labels.DECIMALS[unit])


def asked(finding: Finding, language: Language = ENGLISH) -> str:
    """at least 3 degrees"""
    return language.gettext(labels.SIGNS[finding.comparison]) % {
        "limit": measured(finding.threshold, finding.unit, language)
    }


def deciding_finding(month: Month) -> Finding | None:
    """The finding on which the margin rests, or else the first."""
    margin = month.margin
    for finding in month.evidence.findings:
        if (finding.quantity, finding.value, finding.threshold) == (
            margin.quantity, margin.value, margin.threshold
        ):
            return finding
    return month.evidence.findings[0] if month.evidence.findings else None


def _while(day_share: float, language: Language) -> str:
    """A share of a day as a time in words, no more exact than it is known."""
    minutes = abs(day_share) * 1440
    if minutes < 1:
        return language.gettext("less than a minute")
    if minutes < 90:
        n = round(minutes)
        return language.ngettext("about %(n)s minute", "about %(n)s minutes", n) % {"n": language.digits(n)}
    n = round(minutes / 60)
    return language.ngettext("about %(n)s hour", "about %(n)s hours", n) % {"n": language.digits(n)}


# --- the days of fasting -------------------------------------------------------------------------


def fasting_rule(declared: Fasting, language: Language = ENGLISH) -> str:
    """What dawn and sunset are, and how they are rounded."""
    _ = language.gettext
    text = (
        _("Dawn: the Sun's centre comes to %(degrees)s° below the horizon, rounded down to the minute. Sunset: its "
          "upper limb goes below a level horizon, rounded up to the minute. So both are on the cautious side.")
        if declared.rounding == "minute-safe" else
        _("Dawn: the Sun's centre comes to %(degrees)s° below the horizon. Sunset: its upper limb goes below a level "
          "horizon. Both are given to the nearest minute.")
    )
    return text % {"degrees": language.number(declared.dawn_depression)}


def fasting_caution(language: Language = ENGLISH) -> str:
    return language.gettext("The times of the local authority prevail over these.")


def fasting_moment(one: FastingDay, which: Literal["dawn", "sunset"], language: Language = ENGLISH) -> str:
    """04:58; with its date where that is another; or why there is no time."""
    _ = language.gettext
    moment = one.dawn if which == "dawn" else one.sunset
    if isinstance(moment, datetime):
        clock = language.clock(moment)
        if moment.date() == one.on:
            return clock
        return _("%(time)s on %(date)s") % {"time": clock, "date": language.short_date(moment.date())}
    if which == "dawn":
        return (_("none: the Sun stays above the angle") if moment == "stays above"
                else _("none: the Sun stays below the angle"))
    return _("none: the Sun does not set") if moment == "stays above" else _("none: the Sun does not rise")


def fasting_notes(days: Sequence[FastingDay], language: Language = ENGLISH) -> list[str]:
    """What is unusual about the days at one place: clocks that change, times that do not happen."""
    _ = language.gettext
    offsets = [
        (one.on, moment.utcoffset()) for one in days
        for moment in (one.dawn, one.sunset) if isinstance(moment, datetime) and moment.date() == one.on
    ]
    notes = [
        _("The clocks change on %(date)s; the times are by the clock in force.") % {"date": language.full_date(on)}
        for (_before, was), (on, now) in pairwise(dict(offsets).items()) if was != now
    ]
    if not all(one.complete for one in days):
        notes.append(_("Where no time stands, the Sun does not go so far on that date. None is made up here: the "
                       "community's own rule decides."))
    return notes


def fast_title(one: FastingDay, language: Language = ENGLISH) -> str:
    """Fast, day 3: dawn 04:58 – sunset 18:23"""
    _ = language.gettext
    day = language.digits(one.day or "")
    if not one.complete:
        return _("Fast, day %(day)s: by the community's own rule") % {"day": day}
    return _("Fast, day %(day)s: dawn %(dawn)s – sunset %(sunset)s") % {
        "day": day, "dawn": fasting_moment(one, "dawn", language), "sunset": fasting_moment(one, "sunset", language),
    }


# --- observances ---------------------------------------------------------------------------------


def occurrence_title(name: str, occurrence: Occurrence, language: Language = ENGLISH) -> str:
    """Eid al-Fitr; or Mid-Shaban: night of 15 Shaban."""
    if not occurrence.night:
        return name
    _ = language.gettext
    return _("%(name)s: night of %(day)s %(month)s") % {
        "name": name, "day": language.digits(occurrence.day), "month": language.month(occurrence.month)
    }


def event_title(name: str, occurrence: Occurrence, language: Language = ENGLISH, *, moved: bool = False) -> str:
    """The title in a feed, which says by itself when a night begins, and that a date is only expected or has moved."""
    _ = language.gettext
    remarks = [_("begins at sunset")] if occurrence.night else []
    return remarked(occurrence_title(name, occurrence, language), occurrence.standing, language, remarks, moved=moved)


def remarked(
    title: str, standing: Standing, language: Language, remarks: Sequence[str] = (), *, moved: bool = False
) -> str:
    """Eid al-Fitr (expected; moved)"""
    _ = language.gettext
    said = [*remarks, *([_("expected")] if standing == "expected" else []), *([_("moved")] if moved else [])]
    if not said:
        return title
    return _("%(title)s (%(remarks)s)") % {"title": title, "remarks": _("; ").join(said)}


def span(starts: date, ends: date, language: Language = ENGLISH) -> str:
    """Fri 20 Mar 2026, or Fri 20 Mar to Sun 22 Mar 2026"""
    if starts == ends:
        return language.week_date(starts)
    first = language.short_week_date(starts) if starts.year == ends.year else language.week_date(starts)
    return language.gettext("%(first)s to %(last)s") % {"first": first, "last": language.week_date(ends)}


def rule(when: When, language: Language = ENGLISH) -> str:
    """The rule of an observance: 10 Muharram; the nights of 21 Ramadan to the last; ..."""
    _ = language.gettext
    month = _("each month") if when.month == "every" else language.month(when.month)
    names = {"month": month, "day": language.digits(when.day or ""), "n": language.digits(when.run)}
    if when.last is not None:
        weekday = date(2024, 1, 1 + _WEEKDAYS.index(when.last))  # 1 January 2024 was a Monday
        return _("the last %(weekday)s of %(month)s") % {"weekday": language.weekday(weekday), "month": month}
    if when.last_nights is not None:
        names["day"] = language.digits(31 - when.last_nights)
        if when.odd:
            return _("the odd nights from day %(day)s to the end of %(month)s") % names
        return _("the nights from day %(day)s to the end of %(month)s") % names
    if when.day == "last":
        return (_("the night of the last day of %(month)s") if when.night
                else _("the last day of %(month)s")) % names
    if when.night:
        return _("the night of day %(day)s of %(month)s") % names
    if when.run == "month":
        return _("day %(day)s to the end of %(month)s") % names
    if when.run != 1:
        return _("%(n)s days from day %(day)s of %(month)s") % names
    return _("day %(day)s of %(month)s") % names


_WEEKDAYS = ("monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday")


def observance_of(key: str, observances: Mapping[str, Observance]) -> str | None:
    """The observance that a key of the journal is an occurrence of; None where the content has it no more."""
    longest = sorted(observances, key=len, reverse=True)
    return next((name for name in longest if key.startswith(f"{name}-")), None)


def published_name(key: str, observances: Mapping[str, Observance], site_language: str, language: Language) -> str:
    """A key of the journal in words: Ramadan 1447; Ashura 1448; White days 1448, 3."""
    kind, _dash, rest = key.partition("-")
    if kind == "month" and rest[:1].isdigit():
        year, month = rest.split("-")
        return title_of(int(year), int(month), language)
    name = observance_of(key, observances)
    if name is None:
        return key
    year, *others = key.removeprefix(f"{name}-").split("-")
    shown = in_language(observances[name].name, language.code, site_language)
    if others and observances[name].when.month == "every":
        return f"{shown}, {title_of(int(year), int(others[0]), language)}"
    return language.digits(" ".join([shown, year, *others]))
