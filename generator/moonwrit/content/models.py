"""The typed values of the content files: what a community writes down, and nothing computed.

Every model forbids unknown keys and is frozen. Words that carry several languages are ``Words``:
a plain string (the site's language) or a mapping from language code to text.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Mapping
from datetime import date, datetime
from functools import cache
from importlib import resources
from typing import Annotated, Any, Literal
from zoneinfo import ZoneInfo

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    WithJsonSchema,
    model_validator,
)

_IDENTIFIER = r"^[a-z0-9]+(-[a-z0-9]+)*$"
_LANGUAGE = r"^[a-z]{2,3}(-[A-Za-z0-9]{2,8})*$"
_ISO = re.compile(r"[0-9]{4}-[0-9]{2}-[0-9]{2}")
_CONTROL = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x9f\u2028\u2029\ufdd0-\ufdef\ufffe\uffff]")
# Embeddings, overrides and isolates: they would turn around what the site writes after the text, its standing for
# instance. The marks U+200E, U+200F and U+061C, which turn nothing but themselves, remain.
_TURNING = re.compile(r"[\u202a-\u202e\u2066-\u2069]")
_LONGEST_NAME = 80
"""Names become those of files, which no system lets be longer than about 250 bytes."""


def _plain_text(value: str) -> str:
    if _CONTROL.search(value):
        raise ValueError("text holds a control character; remove it")
    if turning := _TURNING.search(value):
        raise ValueError(f"text holds U+{ord(turning.group()):04X}, which turns the text after it; remove it")
    if not value.strip():
        raise ValueError("text is empty; write something or drop the key")
    return value.strip()


def _words(value: Any) -> Any:
    if isinstance(value, str):
        return {"": value}
    if isinstance(value, dict):
        return value
    if value is None:
        raise ValueError("no text is written; write it after the colon")
    if isinstance(value, list):
        raise ValueError("this is a list; write one text, or a text for each language (en: ..., ar: ...)")
    raise ValueError("this is not text; put it in quotes")


def _language(value: str) -> str:
    if not re.fullmatch(_LANGUAGE, value):
        raise ValueError(f'"{value}" is not a language code; write for instance en, ar, tr')
    return value


def _language_codes(value: dict[str, str]) -> dict[str, str]:
    if not value:
        raise ValueError("no text in any language; write at least one")
    for code in value:
        if code:  # the empty code stands for the site's language
            _language(code)
    return value


def _identifier(value: str) -> str:
    if not re.fullmatch(_IDENTIFIER, value):
        raise ValueError(f'"{value}" cannot be a name here; use small letters, digits and single hyphens')
    if len(value) > _LONGEST_NAME:
        raise ValueError(f'"{value[:20]}..." is too long a name; use at most {_LONGEST_NAME} letters')
    return value


@cache
def _zones() -> frozenset[str]:
    # The names of the tzdata package, and not what this machine happens to have: a machine's
    # "localtime" would give other dates elsewhere.
    return frozenset(resources.files("tzdata").joinpath("zones").read_text(encoding="utf-8").split())


def _zone(value: str) -> str:
    if value not in _zones():
        near = difflib.get_close_matches(value, sorted(_zones()), n=1)
        hint = f'did you mean "{near[0]}"?' if near else "write for instance Australia/Melbourne"
        raise ValueError(f'time zone "{value}" is unknown; {hint}')
    return value


def _iso(value: Any, kind: type[date], example: str) -> Any:
    # Not left to pydantic, which would take digits alone for seconds since 1970.
    if not isinstance(value, str):
        return value
    noun = "date and time" if kind is datetime else "date"
    try:
        if _ISO.match(value):
            return kind.fromisoformat(value)
        reason = ""
    except ValueError:  # in words that are not those of every Python
        reason = f" (there is no such {noun})"
    raise ValueError(f'"{value}" is not a {noun}{reason}; write for instance {example}')


def _day(value: Any) -> Any:
    return _iso(value, date, "2026-12-01")


def _moment(value: Any) -> Any:
    return _iso(value, datetime, "2026-12-01T09:00:00+11:00")


def _zoned(value: datetime) -> datetime:
    if value.tzinfo is None:
        raise ValueError(f"{value.isoformat()} has no time zone; write it as 2026-12-01T09:00:00+11:00")
    return value


Text = Annotated[str, AfterValidator(_plain_text)]
Identifier = Annotated[
    str, AfterValidator(_identifier), WithJsonSchema({"type": "string", "pattern": _IDENTIFIER})
]
Language = Annotated[
    str, AfterValidator(_language), WithJsonSchema({"type": "string", "pattern": _LANGUAGE})
]
Words = Annotated[
    dict[str, Text],
    BeforeValidator(_words),
    AfterValidator(_language_codes),
    WithJsonSchema(
        {
            "anyOf": [
                {"type": "string", "minLength": 1},
                {
                    "type": "object",
                    "patternProperties": {_LANGUAGE: {"type": "string", "minLength": 1}},
                    "additionalProperties": False,
                    "minProperties": 1,
                },
            ]
        }
    ),
]
ZoneName = Annotated[str, AfterValidator(_zone)]
Day = Annotated[date, BeforeValidator(_day)]
Moment = Annotated[datetime, BeforeValidator(_moment), AfterValidator(_zoned)]


def in_language(words: Mapping[str, str], language: str, fallback: str = "") -> str:
    """The text of ``words`` in ``language`` (``en-AU``, or else ``en``), or else in the ``fallback`` language.

    A text written without a code is in the site's language; it is taken where neither is there.
    """
    for code in (language, language.partition("-")[0], fallback, ""):
        if code in words:
            return words[code]
    return next(iter(words.values()))


class _Model(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, populate_by_name=True)


@cache
@cache
def zone_named(name: str) -> ZoneInfo:
    """The time zone of an IANA name. Raises ValueError, which says how to mend it, for any other."""
    # From the tzdata package, for the same reason: ZoneInfo(name) would prefer the machine's own files.
    with resources.files("tzdata").joinpath("zoneinfo", *_zone(name).split("/")).open("rb") as file:
        return ZoneInfo.from_file(file, key=name)


# A field's description is read by people: it stands in the schemas that editors use, and an error
# says "write <description>".


class Place(_Model):
    """A named place: geodetic WGS 84 degrees (north and east positive), metres above sea level, IANA zone."""

    name: Words
    latitude: Annotated[
        float, Field(ge=-90, le=90, description="degrees north of the equator, -90 to 90; south is negative")
    ]
    longitude: Annotated[
        float, Field(ge=-180, le=180, description="degrees east of Greenwich, -180 to 180; west is negative")
    ]
    elevation: Annotated[
        float, Field(ge=-500, le=9000, description="metres above sea level, -500 to 9000")
    ] = 0.0
    timezone: Annotated[ZoneName, Field(description="an IANA time zone, for instance Australia/Melbourne")]

    @property
    def zone(self) -> ZoneInfo:
        return zone_named(self.timezone)


class Region(_Model):
    """The named places that a policy speaks for, the first of which stands for it; and its outline."""

    name: Words
    places: Annotated[list[Identifier], Field(min_length=1, description="a list of one or more places")]
    outline: Annotated[
        Text | None, Field(description="the name of a GeoJSON file beside regions.yaml, which holds polygons")
    ] = None


Weekday = Literal["monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday"]


class When(_Model):
    """An observance rule: which days of which lunar month.

    Exactly one of ``day``, ``last`` and ``last_nights``:
    ``day: 1`` (or ``day: last``) with an optional ``run`` of that many days (``run: month`` to its end);
    ``last: friday`` the last such weekday of the month; ``last_nights: 10`` the nights from the 21st on
    (``n``: from day 31 - n on), each its own occurrence, with ``odd: true`` only the odd ones.
    ``month: every`` repeats in each month. A run longer than what is left of the month runs on.
    ``night: true`` means the night before the day: it begins at the sunset of the evening before.
    """

    month: Annotated[
        Annotated[int, Field(ge=1, le=12)] | Literal["every"],
        Field(description="a lunar month, 1 (Muharram) to 12 (Dhu al-Hijja), or every"),
    ]
    day: Annotated[
        Annotated[int, Field(ge=1, le=30)] | Literal["last"] | None,
        Field(description="a day of the lunar month, 1 to 30, or last"),
    ] = None
    run: Annotated[
        Annotated[int, Field(ge=1, le=30)] | Literal["month"],
        Field(description="how many days, 1 to 30, or month (to its end)"),
    ] = 1
    night: Annotated[
        bool, Field(description="true for the night before the day, from the sunset of the evening before")
    ] = False
    last: Annotated[
        Weekday | None, Field(description="a weekday, monday to sunday: the last one of the month")
    ] = None
    last_nights: Annotated[
        Annotated[int, Field(ge=1, le=29)] | None,
        Field(description="how many nights, 1 to 29, up to that of the 30th; 10 is from the 21st on"),
    ] = None
    odd: Annotated[bool, Field(description="true for the odd nights only, otherwise false")] = False

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
    tags: Annotated[list[Identifier], Field(description="a list of words of your own, such as main")] = []
    about: Words | None = None


class Years(_Model):
    """Hijri years, both included."""

    first: Annotated[int, Field(alias="from", ge=1, description="the first Hijri year, for instance 1447")]
    last: Annotated[int, Field(alias="to", ge=1, description="the last Hijri year, for instance 1449")]

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


class Fasting(_Model):
    """The table of dawn and sunset in the month of fasting. ``minute-safe`` rounds both so that the fast is never
    shorter than reckoned: dawn down, sunset up."""

    dawn_depression: Annotated[
        float, Field(ge=6, le=24, description="degrees of the Sun below the horizon at dawn, 6 to 24")
    ]
    rounding: Literal["minute-safe", "nearest-minute"] = "minute-safe"


OtherCalendar = Literal["solar-hijri", "solar-hijri-33", "rumi", "julian"]


_FOLDERS = frozenset({
    "changes", "civil", "differences", "embed", "evenings", "fasting", "feeds", "messages", "notices", "observances",
    "pages", "places", "policy", "reading", "schema", "subscribe", "tags", "years",
})


class Site(_Model):
    """The community and its site."""

    community: Words
    address: Annotated[
        str,
        Field(
            pattern=r"^https?://[A-Za-z0-9][A-Za-z0-9._-]*(:[0-9]{1,5})?(/[^\s?#\x00-\x1f\x7f-\x9f\\\"'<>^`{|}]*)?$",
            description="the address under which the site will stand, for instance https://example.org/calendar/",
        ),
    ]
    language: Language = "en"
    languages: Annotated[
        tuple[Language, ...], Field(description="further languages of the site, each in a folder of its own")
    ] = ()
    years: Years
    authority: Words
    contact: Words | None = None
    also: Annotated[
        tuple[OtherCalendar, ...], Field(description="other calendars whose dates stand beside the lunar ones")
    ] = ()
    remind_hours_before: Annotated[
        int | None,
        Field(ge=0, le=168, description="hours before midnight at which feeds remind of main observances, 0 to 168"),
    ] = None
    fasting: Annotated[
        Fasting | None, Field(description="dawn_depression: degrees, with which a table of the fasting days is made")
    ] = None
    calendars: Annotated[dict[Identifier, Calendar], Field(min_length=1)]

    @property
    def all_languages(self) -> tuple[str, ...]:
        """The default language first."""
        return (self.language, *self.languages)

    @model_validator(mode="after")
    def _languages_apart(self) -> Site:
        if len(set(self.all_languages)) < len(self.all_languages):
            raise ValueError("a language is named twice; languages lists those besides language")
        if both := set(self.languages) & set(self.calendars):
            raise ValueError(f'"{min(both)}" is a language and a calendar, which want one folder; rename the calendar')
        # The first calendar stands at the top, and only its feeds also in a folder of its name.
        if taken := _FOLDERS & set(list(self.calendars)[1:]):
            raise ValueError(f'a calendar cannot be called "{min(taken)}", which is a folder of the site; rename it')
        return self


__all__ = [
    "Calendar",
    "Day",
    "Fasting",
    "Identifier",
    "Language",
    "Moment",
    "Observance",
    "Place",
    "Region",
    "Site",
    "Text",
    "When",
    "Words",
    "Years",
    "date",
    "in_language",
    "zone_named",
]
