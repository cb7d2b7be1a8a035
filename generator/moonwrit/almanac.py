"""The one assembled value: months with basis, margin and standing, evenings, and dated observances.

Everything here is frozen. ``publish`` reads it and never edits it.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import UTC, date, datetime, timedelta

from moonwrit.content import Content
from moonwrit.content.models import Calendar, Observance, Place, Region, Site, in_language
from moonwrit.content.outlines import Polygons
from moonwrit.content.record import Decision
from moonwrit.errors import RequestError
from moonwrit.observances import Occurrence, occurrences
from moonwrit.observances.fasting import FastingMonth, fasting_months
from moonwrit.policy import Method, Month, method, named_place
from moonwrit.policy.differ import Beside, LongRun, beside, long_run
from moonwrit.policy.evening import Row, evenings_at
from moonwrit.record import Weighed, in_force, superseded, weighed
from moonwrit.record.decisions import objection
from moonwrit.sky import ephemeris

LONG_RUN_YEARS = 15
"""Policies are held against each other over this many years before and after those published, too."""


@dataclass(frozen=True, slots=True)
class Evening:
    """The 29th evening before a month: when observers look and the policy asks.

    ``at`` gives the circumstances at each place of the region (place id -> names with units); ``month`` is the
    month that begins then or an evening later; ``reports`` are those of this evening, weighed.
    """

    on: date
    month: Month
    at: Mapping[str, Row]
    reports: tuple[Weighed, ...]


@dataclass(frozen=True, slots=True)
class Other:
    """Another policy beside the calendar's: over the years published, and in the long run."""

    beside: Beside
    long_run: LongRun | None


@dataclass(frozen=True, slots=True)
class Almanac:
    """All that is published for one calendar (a policy speaking for a region).

    ``months`` are consecutive lunar months, first Muharram of the first year to Dhu al-Hijja of the last;
    ``evenings`` the 29th evening before each of them; ``occurrences`` are in order of civil date, then of the
    observance's name in the content. ``method`` is the policy made ready, with its title, source and notes.
    ``superseded`` holds, by month ordinal, decisions that later ones have replaced; ``others`` the other
    policies of the content. ``as_of`` is "today". ``names`` are the names of places and policies, and the policies'
    summaries, in the languages in which the content gives them. ``outline`` is that of the region, where it has one.
    ``fasting`` are the tables of the months of fasting, where the site has them.
    """

    calendar_id: str
    calendar: Calendar
    site: Site
    method: Method
    region: Region
    places: Mapping[str, Place]
    observances: Mapping[str, Observance]
    months: tuple[Month, ...]
    evenings: tuple[Evening, ...]
    occurrences: tuple[Occurrence, ...]
    superseded: Mapping[int, tuple[Decision, ...]]
    others: tuple[Other, ...]
    as_of: date
    names: tuple[Mapping[str, str], ...]
    outline: Polygons = ()
    fasting: tuple[FastingMonth, ...] = ()


def assemble(content: Content, as_of: date, known_until: datetime | None = None) -> tuple[Almanac, ...]:
    """The almanac of each calendar of the site, the main one first.

    Of the record, only what was written down until ``known_until`` counts (all: None). Raises ContentError where a
    declaration or a decision is at fault, or a year cannot be computed.
    """
    ephemeris()  # a file that cannot be read is no fault of the years asked for
    years = content.site.years
    decisions = in_force(content.decisions, known_until)
    replaced = superseded(content.decisions, known_until)
    out = []
    for calendar_id, calendar in content.site.calendars.items():
        adopted = method(calendar.policy, content)
        try:
            months = adopted.months(years.first, years.last, decisions)
        except RequestError as fault:
            raise content.error("site.yaml", ("years",), fault.what, fault.mend) from None
        months = tuple(_amended(month, replaced.get(month.ordinal, ())) for month in months)
        region = content.regions[calendar.region]
        evenings = _evenings(months, region, content, known_until)
        _refuse_impossible(content, calendar.policy, months, evenings)
        out.append(Almanac(
            calendar_id, calendar, content.site, adopted, region,
            {place: content.places[place] for place in region.places},
            content.observances, months, evenings, occurrences(content.observances, months), replaced,
            _others(content, calendar.policy, adopted, months), as_of, _names(content),
            content.outlines.get(calendar.region, ()), _fasting(months, region, content),
        ))
    return tuple(out)


def _names(content: Content) -> tuple[Mapping[str, str], ...]:
    summaries = [policy.summary for policy in content.policies.values() if policy.summary is not None]
    return (*(p.name for p in content.places.values()), *(p.name for p in content.policies.values()), *summaries)


def _fasting(months: Sequence[Month], region: Region, content: Content) -> tuple[FastingMonth, ...]:
    if content.site.fasting is None:
        return ()
    places = {place_id: named_place(content, place_id) for place_id in region.places}
    return fasting_months(content.site.fasting, months, places)


def _others(content: Content, policy_id: str, adopted: Method, months: tuple[Month, ...]) -> tuple[Other, ...]:
    """Every other policy of the content that can answer for the years published."""
    first, last = months[0].year, months[-1].year
    out = []
    for name in content.policies:
        if name == policy_id:
            continue
        other = method(name, content)
        try:
            found = beside(other, months, adopted)
        except RequestError:
            continue
        out.append(Other(found, long_run(adopted, other, first - LONG_RUN_YEARS, last + LONG_RUN_YEARS)))
    return tuple(out)


def _amended(month: Month, before: tuple[Decision, ...]) -> Month:
    """A decided month whose date an earlier decision had settled otherwise is amended."""
    if any(decision.starts != month.starts for decision in before):
        return replace(month, standing="amended")
    return month


def _evenings(
    months: Sequence[Month], region: Region, content: Content, known_until: datetime | None
) -> tuple[Evening, ...]:
    names = {place_id: in_language(place.name, content.site.language) for place_id, place in content.places.items()}
    places = [named_place(content, place_id) for place_id in region.places]
    out = []
    for month, rows in zip(months, evenings_at([month.evidence.evening for month in months], places), strict=True):
        on = month.evidence.evening
        reports = [
            report for report in content.reports
            if report.evening == on and (known_until is None or report.recorded <= known_until)
        ]
        at = dict(zip(region.places, rows, strict=True))
        out.append(Evening(on, month, at, weighed(reports, content.places, names)))
    return tuple(out)


def _refuse_impossible(
    content: Content, policy_id: str, months: tuple[Month, ...], evenings: tuple[Evening, ...]
) -> None:
    """Raise ContentError for the first decision that the rules or the sky speak against."""
    policy = content.policies.get(policy_id)
    may_be_28 = policy is not None and policy.if_seen_on_28th == "begin"
    for before, month, evening in zip([None, *months[:-1]], months, evenings, strict=True):
        if month.decision is None:
            continue
        fault = objection(month, before, _conjunction_passed(month, evening), may_be_28)
        if fault is not None:
            index = content.decisions.index(month.decision)
            raise content.error("record/decisions.yaml", (index, "starts"),
                                f"{month.decision.month} cannot begin on {month.starts}: {fault[0]}", fault[1])


def _conjunction_passed(month: Month, evening: Evening) -> bool:
    """By the sunset of the eve at one place of the region, to within a day where that evening was not computed."""
    for row in evening.at.values():
        conjunction, sunset = row["conjunction_utc"], row["sunset_utc"]
        if not isinstance(conjunction, str) or not isinstance(sunset, str):
            return True
        eve_sunset = datetime.fromisoformat(sunset) + timedelta(days=(month.eve - evening.on).days)
        if datetime.fromisoformat(conjunction) < eve_sunset.astimezone(UTC):
            return True
    return False


__all__ = ["Almanac", "Evening", "assemble"]
