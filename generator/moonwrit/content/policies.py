"""Policies as a community writes them down: a test, where it must hold, by when, and what otherwise."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Discriminator, Field, Tag, model_validator

from moonwrit.content.models import Day, Identifier, Text, Words, _Model


def _pattern_name(value: Any) -> Any:
    # The patterns are named by a leap year, which reads as a number.
    return str(value) if type(value) is int else value


class Arithmetic(_Model):
    """A tabular calendar: an intercalation pattern of thirty years and its epoch."""

    pattern: Annotated[Literal["15", "16", "fatimid", "habash"], BeforeValidator(_pattern_name)] = "16"
    epoch: Literal["civil", "thursday"] = "civil"


class Criterion(_Model):
    """A published criterion by its usual name, with the classes or zones that are accepted."""

    criterion: Identifier
    accept: list[Text] | None = None


QuantityName = Literal[
    "altitude", "elongation", "arc-of-vision", "relative-azimuth", "width", "lag", "age", "illuminated-percent",
    "conjunction",
]
_FRAMED = ("altitude", "elongation", "arc-of-vision", "relative-azimuth", "width")
_AT_BEST = ("arc-of-vision", "relative-azimuth", "width")
"""Measured at best time, unless ``at`` says otherwise; the others at sunset."""
_BOUNDS = ("at_least", "more_than", "at_most", "less_than")


class Threshold(_Model):
    """A named quantity held against a number; its frame is part of the rule.

    Units: degrees; ``width`` arc minutes, ``lag`` minutes, ``age`` hours since the conjunction. ``conjunction``
    is the conjunction itself, to be over before ``before_hour_ut`` of the evening's civil date (24 is its
    end) or ``before_dawn`` (the Sun that many degrees down). A test that the old Moon meets as well, such as an
    elongation alone, asks also for the conjunction to be past.
    """

    quantity: QuantityName
    frame: Literal["geocentric", "topocentric"] | None = None
    limb: Literal["upper", "centre", "lower"] | None = None
    air: Literal["airless", "refracted"] | None = None
    at: Literal["sunset", "best-time"] | None = None
    at_least: float | None = None
    more_than: float | None = None
    at_most: float | None = None
    less_than: float | None = None
    before_hour_ut: Annotated[float, Field(ge=-24, le=48)] | None = None
    before_dawn: Annotated[float, Field(ge=0.5, le=20)] | None = None

    @model_validator(mode="after")
    def _complete(self) -> Threshold:
        given = [k for k in _BOUNDS if getattr(self, k) is not None]
        deadlines = [k for k in ("before_hour_ut", "before_dawn") if getattr(self, k) is not None]
        if self.quantity == "conjunction":
            if len(deadlines) != 1 or given:
                raise ValueError("a conjunction is held against one of before_hour_ut and before_dawn")
        elif len(given) != 1 or deadlines:
            raise ValueError(f"{self.quantity} needs one of at_least, more_than, at_most and less_than")
        if self.quantity in _FRAMED and self.frame is None:
            raise ValueError(f"{self.quantity} needs a frame; say frame: geocentric or frame: topocentric")
        if self.quantity not in _FRAMED and self.frame is not None:
            raise ValueError(f"{self.quantity} has no frame; drop it")
        if self.quantity == "altitude" and self.frame == "topocentric" and self.air is None:
            raise ValueError("a topocentric altitude needs air: airless or air: refracted")
        if self.air is not None and self.quantity != "altitude":
            raise ValueError(f"air goes with an altitude, not with {self.quantity}; drop it")
        if self.limb is not None and self.quantity != "altitude":
            raise ValueError(f"limb goes with an altitude, not with {self.quantity}; drop it")
        if self.frame == "geocentric" and (self.air == "refracted" or self.limb in ("upper", "lower")):
            raise ValueError("a geocentric altitude is of the centre and airless; drop limb and air")
        if self.quantity in ("lag", "age", "conjunction") and self.at is not None:
            raise ValueError(f"{self.quantity} has a time of its own; drop at")
        return self

    @property
    def measured_as(self) -> tuple[str | None, ...]:
        """What makes two thresholds speak of one number."""
        at = self.at or ("best-time" if self.quantity in _AT_BEST else "sunset")
        return self.quantity, self.frame, self.limb or "centre", self.air or "airless", at

    @property
    def bound(self) -> str:
        """In words: "at_least 5"."""
        return next(f"{k} {value:g}" for k in _BOUNDS if (value := getattr(self, k)) is not None)

    def agrees_with(self, other: Threshold) -> bool:
        """Can a number satisfy both?"""
        floors = [v for t in (self, other) for v in (t.at_least, t.more_than) if v is not None]
        roofs = [v for t in (self, other) for v in (t.at_most, t.less_than) if v is not None]
        if not floors or not roofs or floors[0] < roofs[0]:
            return True
        ends_included = all(t.more_than is None and t.less_than is None for t in (self, other))
        return floors[0] == roofs[0] and ends_included


def _test_kind(value: Any) -> str:
    if isinstance(value, dict):
        for key in ("criterion", "all", "any"):
            if key in value:
                return key
        return "threshold"
    kinds: dict[type, str] = {Criterion: "criterion", AllOf: "all", AnyOf: "any"}
    return kinds.get(type(value), "threshold")


class AllOf(_Model):
    """Every test in the list must be met, at the same place."""

    all: Annotated[list[Test], Field(min_length=1)]

    @model_validator(mode="after")
    def _possible(self) -> AllOf:
        thresholds = [test for test in self.all if isinstance(test, Threshold) and test.quantity != "conjunction"]
        for index, one in enumerate(thresholds):
            for other in thresholds[:index]:
                if one.measured_as == other.measured_as and not one.agrees_with(other):
                    raise ValueError(
                        f"no {one.quantity} is {other.bound} and {one.bound} at once; drop one of them, or say any"
                    )
        return self


class AnyOf(_Model):
    """One test in the list is enough."""

    any: Annotated[list[Test], Field(min_length=1)]


Test = Annotated[
    Annotated[Criterion, Tag("criterion")]
    | Annotated[AllOf, Tag("all")]
    | Annotated[AnyOf, Tag("any")]
    | Annotated[Threshold, Tag("threshold")],
    Discriminator(_test_kind),
]


EARLIEST_SUNSET_HOUR_UT = 3
"""At 60 degrees and the longitude of 180 east the earliest sunsets of the year come between 2:52 and 3:00 UT."""


class Deadline(_Model):
    """Sunset must come before a UT hour of the evening's civil date (24 is its end), or before the dawn at a
    place (the Sun ``depression`` degrees down, 18 unless said)."""

    hour_ut: Annotated[float, Field(le=48)] | None = None
    dawn_at: Identifier | None = None
    depression: Annotated[float, Field(ge=0.5, le=20)] | None = None

    @model_validator(mode="after")
    def _one_kind(self) -> Deadline:
        if (self.hour_ut is None) == (self.dawn_at is None):
            raise ValueError("say one of hour_ut and dawn_at")
        if self.depression is not None and self.dawn_at is None:
            raise ValueError("depression goes with dawn_at; drop it")
        if self.hour_ut is not None and self.hour_ut < EARLIEST_SUNSET_HOUR_UT:
            raise ValueError(
                f"no sunset between 60 S and 60 N comes before {EARLIEST_SUNSET_HOUR_UT}:00 UT of its date; "
                "give a later hour_ut, at most 48"
            )
        return self


class Where(_Model):
    """Where the test must hold. Exactly one of:

    ``place`` one named place; ``any_of`` or ``every_of`` named places, or a region's; ``share`` with ``of`` (at
    least that share of named places, or of a region's) or ``of_area`` (of the area of a region's outline);
    ``within`` somewhere inside a region's outline; ``anywhere: earth`` with an optional ``before``;
    ``shares_night_with`` anywhere whose sunset comes before the dawn at that place.
    """

    place: Identifier | None = None
    any_of: list[Identifier] | Identifier | None = None
    every_of: list[Identifier] | Identifier | None = None
    share: Annotated[float, Field(gt=0, le=1)] | None = None
    of: list[Identifier] | Identifier | None = None
    of_area: Identifier | None = None
    within: Identifier | None = None
    anywhere: Literal["earth"] | None = None
    before: Deadline | None = None
    shares_night_with: Identifier | None = None

    @model_validator(mode="after")
    def _one_kind(self) -> Where:
        kinds = ("place", "any_of", "every_of", "share", "within", "anywhere", "shares_night_with")
        given = [kind for kind in kinds if getattr(self, kind) is not None]
        if len(given) != 1:
            raise ValueError(f"say exactly one of {', '.join(kinds[:-1])} and {kinds[-1]}")
        if (self.share is None) != (self.of is None and self.of_area is None):
            raise ValueError("share goes with of or of_area; say of what")
        if self.of is not None and self.of_area is not None:
            raise ValueError("say one of of and of_area")
        if self.before is not None and self.anywhere is None:
            raise ValueError("before goes with anywhere: earth; drop it")
        for kind in ("any_of", "every_of", "of"):
            if getattr(self, kind) == []:
                raise ValueError(f"{kind} names no place; name at least one")
        return self


class Fallback(_Model):
    """Where a place without a sunset is judged: another place, or its own meridian at another latitude."""

    place: Identifier | None = None
    latitude: Annotated[float, Field(ge=-60, le=60)] | None = None

    @model_validator(mode="after")
    def _one_kind(self) -> Fallback:
        if (self.place is None) == (self.latitude is None):
            raise ValueError("say one of place and latitude")
        return self


class Clause(_Model):
    """One clause of a policy: a test and where it must hold; or ``every`` or ``either`` of further clauses."""

    test: Test | None = None
    where: Where | None = None
    every: list[Clause] | None = None
    either: list[Clause] | None = None

    @model_validator(mode="after")
    def _one_kind(self) -> Clause:
        kinds = [k for k in ("test", "every", "either") if getattr(self, k) is not None]
        if len(kinds) != 1:
            raise ValueError("a clause is exactly one of test (with where), every and either")
        if (self.test is None) != (self.where is None):
            raise ValueError("test and where go together; say what must hold and where")
        if self.every == [] or self.either == []:
            raise ValueError("the list of clauses is empty; write at least one")
        return self


class Policy(_Model):
    """What a community has adopted: exactly one of ``published``, ``arithmetic``, ``table``, ``adopts``, and a
    clause (``test`` with ``where``, ``every`` or ``either``).

    ``decided_by: record`` means that months stay *expected* until a decision is recorded;
    ``decided_by: calculation`` means that the computed date is the community's date (*settled*).
    ``place`` fills the place that a published policy leaves open. ``adopts`` names policies, of which the
    first to begin a month decides. Where the test is not met on the 29th evening, thirty days are completed.
    ``if_seen_on_28th``: a crescent seen on the 28th evening shows that the month was found a day late; the
    next month then may ``begin`` at once, after 28 days, or the 29 days are to be made ``complete``.
    """

    name: Words
    summary: Words | None = None
    source: Words | None = None
    adopted: Day | None = None
    decided_by: Literal["record", "calculation"]
    published: Identifier | None = None
    place: Identifier | None = None
    arithmetic: Arithmetic | None = None
    table: Text | None = None
    adopts: Annotated[list[Identifier], Field(min_length=1)] | None = None
    test: Test | None = None
    where: Where | None = None
    every: list[Clause] | None = None
    either: list[Clause] | None = None
    fallback: Fallback | None = None
    if_seen_on_28th: Literal["begin", "complete"] = "complete"

    @model_validator(mode="after")
    def _one_kind(self) -> Policy:
        kinds = ("published", "arithmetic", "table", "adopts", "test", "every", "either")
        given = [k for k in kinds if getattr(self, k) is not None]
        if len(given) != 1:
            raise ValueError(f"say exactly one of {', '.join(kinds[:-1])} and {kinds[-1]}")
        if (self.test is None) != (self.where is None):
            raise ValueError("test and where go together; say what must hold and where")
        if self.place is not None and self.published is None:
            raise ValueError("place goes with published; say where: {place: ...} instead")
        if self.fallback is not None and given[0] not in ("test", "every", "either"):
            raise ValueError(f"fallback goes with a test, not with {given[0]}; drop it")
        if self.every == [] or self.either == []:
            raise ValueError("the list of clauses is empty; write at least one")
        return self

    @property
    def clause(self) -> Clause | None:
        """The policy's clause, where it is of that kind."""
        if self.test is None and self.every is None and self.either is None:
            return None
        return Clause(test=self.test, where=self.where, every=self.every, either=self.either)
