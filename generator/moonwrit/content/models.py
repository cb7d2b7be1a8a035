"""The typed values of the content files: what a community writes down, and nothing computed.

Every model forbids unknown keys and is frozen. Words that carry several languages are ``Words``:
a plain string (the site's language) or a mapping from language code to text.
"""

from __future__ import annotations

import re
from datetime import date, datetime
from typing import Annotated, Any, Literal
from zoneinfo import ZoneInfo, available_timezones

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field, model_validator

from moonwrit.errors import did_you_mean

_LANGUAGE = re.compile(r"^[a-z]{2,3}(-[A-Za-z0-9]{2,8})*$")
_CONTROL = re.compile(r"[\x00-\x08\x0b-\x1f\x7f\x85\u2028\u2029]")


def _plain_text(value: str) -> str:
    if _CONTROL.search(value):
        raise ValueError("text holds a control character; remove it")
    if not value.strip():
        raise ValueError("text is empty; write something or drop the key")
    return value.strip()


def _words(value: Any) -> Any:
    if isinstance(value, str):
        return {"": value}
    return value


def _language_codes(value: dict[str, str]) -> dict[str, str]:
    for code in value:
        if code and not _LANGUAGE.match(code):
            raise ValueError(f'"{code}" is not a language code; write for instance en, ar, tr')
    if not value:
        raise ValueError("no text in any language; write at least one")
    return value


def _identifier(value: str) -> str:
    if not re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", value):
        raise ValueError(f'"{value}" cannot be a name here; use small letters, digits and single hyphens')
    return value


def _zone(value: str) -> str:
    if value not in available_timezones():
        raise ValueError(f'time zone "{value}" is unknown; {did_you_mean(value, available_timezones())}')
    return value


Text = Annotated[str, AfterValidator(_plain_text)]
Identifier = Annotated[str, AfterValidator(_identifier)]
Words = Annotated[dict[str, Text], BeforeValidator(_words), AfterValidator(_language_codes)]
ZoneName = Annotated[str, AfterValidator(_zone)]


class _Model(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, populate_by_name=True)


class Place(_Model):
    """A named place: geodetic WGS 84 degrees (north and east positive), metres above sea level, IANA zone."""

    name: Words
    latitude: Annotated[float, Field(ge=-90, le=90)]
    longitude: Annotated[float, Field(ge=-180, le=180)]
    elevation: Annotated[float, Field(ge=-500, le=9000)] = 0.0
    timezone: ZoneName

    @property
    def zone(self) -> ZoneInfo:
        return ZoneInfo(self.timezone)


class Region(_Model):
    """The named places that a policy speaks for."""

    name: Words
    places: Annotated[list[Identifier], Field(min_length=1)]


Weekday = Literal["monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday"]


class When(_Model):
    """An observance rule: which days of which lunar month.

    Exactly one of ``day``, ``last`` and ``last_nights``:
    ``day: 1`` (or ``day: last``) with an optional ``run`` of that many days (``run: month`` to its end);
    ``last: friday`` the last such weekday of the month; ``last_nights: 10`` the nights from the 21st on,
    each its own occurrence, with ``odd: true`` only the odd ones. ``month: every`` repeats in each month.
    ``night: true`` means the night before the day: it begins at the sunset of the evening before.
    """

    month: Annotated[int, Field(ge=1, le=12)] | Literal["every"]
    day: Annotated[int, Field(ge=1, le=30)] | Literal["last"] | None = None
    run: Annotated[int, Field(ge=1, le=30)] | Literal["month"] = 1
    night: bool = False
    last: Weekday | None = None
    last_nights: Annotated[int, Field(ge=1, le=29)] | None = None
    odd: bool = False

    @model_validator(mode="after")
    def _one_kind(self) -> When:
        given = [k for k in ("day", "last", "last_nights") if getattr(self, k) is not None]
        if len(given) != 1:
            raise ValueError("say exactly one of day, last and last_nights")
        if self.odd and self.last_nights is None:
            raise ValueError("odd goes with last_nights; drop it or say last_nights: 10")
        if self.run != 1 and self.day is None:
            raise ValueError("run goes with day; drop it or say the day on which the run begins")
        if self.night and (self.last is not None or self.last_nights is not None or self.run != 1):
            raise ValueError("night goes with a single day; drop night, or the run")
        return self


class Observance(_Model):
    """A named day, night or run of days in the lunar year."""

    name: Words
    when: When
    tags: list[Identifier] = []
    about: Words | None = None


class Years(_Model):
    """Hijri years, both included."""

    first: Annotated[int, Field(alias="from", ge=1)]
    last: Annotated[int, Field(alias="to", ge=1)]

    @model_validator(mode="after")
    def _in_order(self) -> Years:
        if self.last < self.first:
            raise ValueError(f"to: {self.last} comes before from: {self.first}; swap them")
        return self


class Calendar(_Model):
    """One calendar of the site: a policy speaking for a region."""

    name: Words
    policy: Identifier
    region: Identifier


class Site(_Model):
    """The community and its site."""

    community: Words
    address: Annotated[str, Field(pattern=r"^https?://[^\s/?#]+(/[^\s?#]*)?$")]
    language: str = "en"
    years: Years
    revised: datetime
    authority: Words
    contact: Words | None = None
    calendars: Annotated[dict[Identifier, Calendar], Field(min_length=1)]

    @model_validator(mode="after")
    def _stamped(self) -> Site:
        if self.revised.tzinfo is None:
            raise ValueError("revised has no time zone; write it as 2026-12-01T09:00:00+11:00")
        return self


__all__ = [
    "Calendar", "Identifier", "Observance", "Place", "Region", "Site", "Text", "When", "Words", "Years",
    "date",
]
