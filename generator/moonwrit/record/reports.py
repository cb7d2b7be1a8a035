"""Reports of observers weighed against the sky: advice to the officer, never a verdict."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import Literal

from moonwrit.content.models import Place
from moonwrit.content.record import Report
from moonwrit.policy import NamedPlace, Note
from moonwrit.policy.evening import evening_at

Weight = Literal["as expected", "unusual", "against the sky"]

DANJON_DEG = 6.4
"""The least elongation, topocentric, at which a crescent has been recorded: Odeh 2004 (found in its abstract)."""
_WELL_WITHIN = 0.216
_OUTSIDE = {"naked-eye": -0.232, "binoculars": -0.293, "telescope": -0.293, "camera": -0.293, None: -0.293}
"""Yallop's q: class A above 0.216; the naked eye is not expected below D (-0.232), no optics below E (-0.293)."""
_CLOCK_SLACK = timedelta(minutes=5)


@dataclass(frozen=True, slots=True)
class Weighed:
    """A report with what the sky says of it."""

    report: Report
    weight: Weight
    advice: tuple[Note, ...]


def weighed(
    reports: Sequence[Report], places: Mapping[str, Place], names: Mapping[str, str]
) -> tuple[Weighed, ...]:
    """Each report against the circumstances of its evening at its place, in order. ``names``: id -> shown name.

    Raises RequestError for an evening outside the ephemeris.
    """
    return tuple(_weigh(report, places[report.place], names[report.place]) for report in reports)


def _weigh(report: Report, place: Place, name: str) -> Weighed:
    here = NamedPlace.of(name, place)
    found = evening_at(report.evening, [here])[0]
    if report.outcome == "could-not-look":
        return Weighed(report, "as expected", ())
    q = found["yallop_q"]
    if report.outcome == "not-seen":
        if isinstance(q, float) and q > _WELL_WITHIN and report.sky == "clear":
            return Weighed(report, "unusual", (Note(
                "The crescent should have been easy to see there that evening (q %(q)s).", {"q": q}
            ),))
        return Weighed(report, "as expected", ())
    against = list(_against(report, place, found))
    if against:
        return Weighed(report, "against the sky", tuple(against))
    limit = _OUTSIDE[report.aid]
    if isinstance(q, float) and q < limit:
        return Weighed(report, "unusual", (Note(
            "By Yallop's criterion the crescent is far beyond what that aid has shown before (q %(q)s).", {"q": q}
        ),))
    return Weighed(report, "as expected", ())


def _against(report: Report, place: Place, found: Mapping[str, float | str | None]) -> list[Note]:
    """What makes a sighting impossible or nearly so, plainest first."""
    notes = []
    age, arcl, moonset = found["age_h"], found["best_elongation_topocentric_deg"], found["moonset_utc"]
    if found["sunset_utc"] is None:
        return [Note("The Sun does not set at that place on that date.")]
    if isinstance(age, float) and age < 0:
        notes.append(Note("The conjunction comes only after that sunset: the Moon is not new yet."))
    if found["moon"] == "stays below":
        notes.append(Note("The Moon does not rise above the horizon there that day."))
    lag = found["lag_min"]
    if isinstance(lag, float) and lag <= 0:
        notes.append(Note("The Moon sets before the Sun there that evening."))
    elif isinstance(moonset, str) and _is_after(report, place, datetime.fromisoformat(moonset)):
        notes.append(Note("The time reported is after moonset (%(moonset)s UTC).", {"moonset": moonset[11:16]}))
    if isinstance(arcl, float) and arcl < DANJON_DEG:
        notes.append(Note(
            "The elongation is %(arcl)s degrees, below the least at which a crescent has been recorded (6.4).",
            {"arcl": arcl},
        ))
    return notes


def _is_after(report: Report, place: Place, moonset: datetime) -> bool:
    """Was the report's time, by the place's clock, after moonset? Small hours belong to the evening's night."""
    if report.time is None:
        return False
    hour, minute = (int(part) for part in report.time.split(":"))
    moment = datetime(
        report.evening.year, report.evening.month, report.evening.day, hour, minute, tzinfo=place.zone
    )
    if hour < 6:
        moment += timedelta(days=1)
    return moment > moonset + _CLOCK_SLACK
