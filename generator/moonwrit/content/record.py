"""The record as it is written down: reports of observers, and decisions of the community."""

from __future__ import annotations

import re
from datetime import date
from typing import Annotated, Literal

from pydantic import AfterValidator, Field, WithJsonSchema, model_validator

from moonwrit.content.models import Day, Identifier, Moment, Text, Words, _Model

_MONTH = r"^\d{3,4}-(0[1-9]|1[0-2])$"
_FIRST_DAY = date(622, 7, 19).toordinal()
_MEAN_MONTH = 29.530588
_TOLERANCE_DAYS = 10
"""A slip of the pen in year or month, and not a method: no calendar is so far from the mean Moon."""
_CLOCK = r"^([01]\d|2[0-3]):[0-5]\d$"


def _month(value: str) -> str:
    if not re.fullmatch(_MONTH, value):
        raise ValueError(f'"{value}" is not a lunar month; write year-month, for instance 1448-09')
    return value


def _clock(value: str) -> str:
    if not re.fullmatch(_CLOCK, value):
        raise ValueError(f'"{value}" is not a time of day; write for instance 18:30')
    return value


LunarMonth = Annotated[str, AfterValidator(_month), WithJsonSchema({"type": "string", "pattern": _MONTH})]
Clock = Annotated[str, AfterValidator(_clock), WithJsonSchema({"type": "string", "pattern": _CLOCK})]

Outcome = Literal["seen", "not-seen", "could-not-look"]
Aid = Literal["naked-eye", "binoculars", "telescope", "camera"]
SkyState = Literal["clear", "haze", "part-cloud", "cloud", "rain"]


class Report(_Model):
    """One observer group's statement about one evening. ``time`` is by the place's clock.

    ``names`` stay private unless ``names_public`` is true.
    """

    evening: Day
    place: Identifier
    outcome: Outcome
    recorded: Moment
    time: Clock | None = None
    aid: Aid | None = None
    observers: Annotated[int, Field(ge=1, le=100_000)] | None = None
    sky: SkyState | None = None
    note: Text | None = None
    names: tuple[Text, ...] = ()
    names_public: bool = False

    @model_validator(mode="after")
    def _sighting_has_an_aid(self) -> Report:
        if self.outcome == "seen" and self.aid is None:
            raise ValueError("a crescent that was seen needs aid: naked-eye, binoculars, telescope or camera")
        return self


class Decision(_Model):
    """The community's recorded word on when a month begins.

    A later decision (by ``at``) on the same month supersedes an earlier one, which stays on record.
    ``knowingly`` says that the community knows that the rules or the sky speak against it.
    """

    month: LunarMonth
    starts: Day
    basis: Literal["sighted", "completed", "calculated", "adopted"]
    by: Text
    at: Moment
    text: Words | None = None
    adopted_from: Text | None = None
    knowingly: bool = False

    @model_validator(mode="after")
    def _authority(self) -> Decision:
        if self.basis == "adopted" and self.adopted_from is None:
            raise ValueError("an adopted date needs adopted_from: the authority it was taken from")
        if self.basis != "adopted" and self.adopted_from is not None:
            raise ValueError("adopted_from goes with basis: adopted; drop it")
        return self

    @model_validator(mode="after")
    def _in_its_season(self) -> Decision:
        about = _FIRST_DAY + _MEAN_MONTH * self.ordinal
        if abs(self.starts.toordinal() - about) > _TOLERANCE_DAYS:
            near = date.fromordinal(int(about)) if 1 <= about < date.max.toordinal() else "outside the civil calendar"
            raise ValueError(f"{self.month} cannot begin on {self.starts}; it begins about {near}: mend one of the two")
        return self

    @property
    def ordinal(self) -> int:
        """Months since Muharram of the year 1 (which is 0)."""
        year, month = self.month.split("-")
        return (int(year) - 1) * 12 + int(month) - 1


class Amendment(_Model):
    """A dated reason for changes of published dates that no decision explains: another policy, a corrected rule.

    It covers the months ``since`` a lunar month (and what hangs on them), or the observances named, or both.
    """

    at: Moment
    by: Text
    reason: Text
    since: LunarMonth | None = None
    observances: tuple[Identifier, ...] = ()

    @model_validator(mode="after")
    def _covers_something(self) -> Amendment:
        if self.since is None and not self.observances:
            raise ValueError("say what it covers: since (a lunar month), observances, or both")
        return self

    def covers(self, key: str, ordinal: int) -> bool:
        """Does it cover the published thing ``key``, which hangs on the month ``ordinal``?"""
        if self.observances and not any(key.startswith(f"{name}-") for name in self.observances):
            return False
        if self.since is None:
            return True
        year, month = self.since.split("-")
        return ordinal >= (int(year) - 1) * 12 + int(month) - 1
