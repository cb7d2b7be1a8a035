"""From a policy as the content declares it to a method that can be asked."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import TypeVar

import numpy as np

from moonwrit.calendars import Tabular
from moonwrit.content import Content
from moonwrit.content import policies as declared
from moonwrit.content.models import in_language
from moonwrit.errors import RequestError, did_you_mean
from moonwrit.policy.conditions import Condition, Either, Every, Scoped
from moonwrit.policy.methods import Method
from moonwrit.policy.names import published_names
from moonwrit.policy.published import NamedPlace, published
from moonwrit.policy.scopes import MAX_LATITUDE_DEG, Anywhere, AtPlaces, Before, Scope, Within
from moonwrit.policy.walk import Era
from moonwrit.sky import Places
from moonwrit.sky import comparison as compare
from moonwrit.sky.criteria import criterion
from moonwrit.sky.land import Outline

T = TypeVar("T")

GRID_DEG = 0.5
"""How finely the outline of a region is looked at."""


def method(name: str, content: Content | None = None, place: NamedPlace | None = None) -> Method:
    """The method of a policy of the content, or of a published one.

    ``place`` fills the place that a published policy leaves open. Raises ContentError where a declaration
    is at fault, RequestError for an unknown name.
    """
    if content is not None and name in content.policies:
        return _Reader(content, name, (name,)).method()
    known = published_names()
    if name not in known:
        names = [*known, *(content.policies if content else ())]
        raise RequestError(f'policy "{name}" is not known', did_you_mean(name, names))
    return published(name, place)


def named_place(content: Content, place_id: str) -> NamedPlace:
    """A place of the content by the name that the site's language gives it."""
    place = content.places[place_id]
    return NamedPlace.of(in_language(place.name, content.site.language), place)


@dataclass(frozen=True)
class _Reader:
    """Reads one declaration. ``trail`` holds the names that led here: a policy may not adopt itself."""

    content: Content
    name: str
    trail: tuple[str, ...]

    @property
    def policy(self) -> declared.Policy:
        return self.content.policies[self.name]

    def method(self) -> Method:
        policy, language = self.policy, self.content.site.language
        base = Method(
            self.name,
            in_language(policy.name, language),
            in_language(policy.source, language) if policy.source else "",
            policy.decided_by,
            summary=in_language(policy.summary, language) if policy.summary else "",
        )
        if policy.published is not None:
            place = named_place(self.content, policy.place) if policy.place else None
            known = self._pointing(("published",), lambda: published(str(policy.published), place))
            return replace(
                known, name=self.name, title=base.title, source=base.source or known.source, summary=base.summary,
                decided_by=policy.decided_by,
            )
        if policy.arithmetic is not None:
            return replace(base, tabular=Tabular(policy.arithmetic.pattern, policy.arithmetic.epoch))
        if policy.table is not None:
            return replace(base, table=self.content.tables[self.name])
        if policy.adopts is not None:
            return replace(base, adopts=tuple(
                self._adopted(adopted, index) for index, adopted in enumerate(policy.adopts)
            ))
        assert policy.clause is not None
        condition = self._condition(policy.clause, ())
        return replace(
            base, eras=(Era(0, condition),),
            rests_on=tuple(criterion(name) for name in dict.fromkeys(_criteria_in(policy.clause))),
        )

    def _pointing(self, path: tuple[str | int, ...], make: Callable[[], T]) -> T:
        """Run ``make``; a RequestError becomes a ContentError at the declaration's line."""
        try:
            return make()
        except RequestError as fault:
            raise self.content.error("policies.yaml", (self.name, *path), fault.what, fault.mend) from None

    def _adopted(self, adopted: str, index: int) -> Method:
        if adopted in self.trail:
            raise self.content.error(
                "policies.yaml", (self.name, "adopts", index),
                f'policy "{adopted}" adopts itself in the end', "let one of them decide",
            )
        if adopted in self.content.policies:
            return _Reader(self.content, adopted, (*self.trail, adopted)).method()
        return self._pointing(("adopts", index), lambda: published(adopted))

    # --- clauses ------------------------------------------------------------------------------

    def _condition(self, clause: declared.Clause, path: tuple[str | int, ...]) -> Condition:
        if clause.every is not None:
            return Every(tuple(self._condition(c, (*path, "every", i)) for i, c in enumerate(clause.every)))
        if clause.either is not None:
            return Either(tuple(self._condition(c, (*path, "either", i)) for i, c in enumerate(clause.either)))
        assert clause.test is not None
        assert clause.where is not None
        test = clause.test
        rule = self._pointing((*path, "test"), lambda: _rule(test))
        if _old_moon_meets(test):
            rule = compare.All((rule, compare.Comparison(compare.age(), ">", 0.0)))
        return Scoped(rule, self._scope(clause.where, (*path, "where")))

    def _scope(self, where: declared.Where, path: tuple[str | int, ...]) -> Scope:
        if where.place is not None:
            return self._at([where.place], 1.0)
        if where.any_of is not None:
            return self._at(self._place_ids(where.any_of), 0.0)
        if where.every_of is not None:
            return self._at(self._place_ids(where.every_of), 1.0)
        if where.of is not None:
            return self._at(self._place_ids(where.of), where.share or 1.0)
        if where.of_area is not None:
            return Within(self._outline(where.of_area, (*path, "of_area")), where.share or 1.0, step_deg=GRID_DEG)
        if where.within is not None:
            return Within(self._outline(where.within, (*path, "within")), step_deg=GRID_DEG)
        if where.shares_night_with is not None:
            night = named_place(self.content, where.shares_night_with)
            return Anywhere(Before(dawn_at=Places.of([night.row])))
        return Anywhere(None if where.before is None else self._deadline(where.before))

    def _outline(self, region: str, path: tuple[str | int, ...]) -> Outline:
        outline = Outline(tuple(
            tuple(np.array(ring, dtype=np.float64) for ring in polygon)
            for polygon in self.content.outlines[region]
        ))
        if not (np.abs(outline.grid_of_each(GRID_DEG)[1]) <= MAX_LATITUDE_DEG).any():
            raise self.content.error(
                "policies.yaml", (self.name, *path),
                f'the outline of "{region}" lies beyond {MAX_LATITUDE_DEG:g} degrees of latitude, where there may be '
                "no sunset", "name places instead",
            )
        return outline

    def _deadline(self, before: declared.Deadline) -> Before:
        if before.dawn_at is None:
            return Before(hour_ut=before.hour_ut)
        dawn_at = Places.of([named_place(self.content, before.dawn_at).row])
        return Before(dawn_at=dawn_at, depression_deg=before.depression or 18.0)

    def _place_ids(self, named: list[str] | str) -> list[str]:
        return named if isinstance(named, list) else list(self.content.regions[named].places)

    def _at(self, ids: list[str], needed: float) -> AtPlaces:
        places = [named_place(self.content, place_id) for place_id in ids]
        fallback = [self._fallback(place) for place in places] if self.policy.fallback else []
        return AtPlaces(
            tuple(place.name for place in places),
            Places.of([place.row for place in places]),
            needed,
            fallback=Places.of([place.row for place in fallback]) if fallback else None,
            fallback_names=tuple(place.name for place in fallback),
        )

    def _fallback(self, place: NamedPlace) -> NamedPlace:
        instead = self.policy.fallback
        assert instead is not None
        if instead.place is not None:
            return named_place(self.content, instead.place)
        assert instead.latitude is not None
        side = "N" if instead.latitude >= 0 else "S"
        return replace(
            place, name=f"{abs(instead.latitude):g} {side} on the meridian of {place.name}",
            latitude_deg=instead.latitude,
        )


def _criteria_in(part: object) -> Iterator[str]:
    """The names of the criteria anywhere in a clause or a test."""
    match part:
        case declared.Criterion():
            yield part.criterion
        case declared.AllOf():
            for test in part.all:
                yield from _criteria_in(test)
        case declared.AnyOf():
            for test in part.any:
                yield from _criteria_in(test)
        case declared.Clause():
            for below in (part.test, *(part.every or ()), *(part.either or ())):
                yield from _criteria_in(below)


def _rule(test: declared.Criterion | declared.AllOf | declared.AnyOf | declared.Threshold) -> compare.Rule:
    if isinstance(test, declared.Criterion):
        return criterion(test.criterion).rule(test.accept)
    if isinstance(test, declared.AllOf):
        return compare.All(tuple(_rule(part) for part in test.all))
    if isinstance(test, declared.AnyOf):
        return compare.Any(tuple(_rule(part) for part in test.any))
    return _threshold(test)


def _old_moon_meets(test: declared.Test) -> bool:
    """Can a test be met as well before the conjunction as after it? Then all months would have 29 days."""
    if isinstance(test, declared.AllOf):
        return all(map(_old_moon_meets, test.all))
    if isinstance(test, declared.AnyOf):
        return any(map(_old_moon_meets, test.any))
    if isinstance(test, declared.Criterion) or test.quantity == "conjunction":
        return False
    return test.quantity in _UNSIGNED or (test.at_least is None and test.more_than is None)


_UNSIGNED = ("elongation", "relative-azimuth", "width", "illuminated-percent")
"""As large a day before the conjunction as a day after it."""


def _threshold(test: declared.Threshold) -> compare.Comparison:
    if test.before_hour_ut is not None:
        return compare.Comparison(compare.conjunction_before_hour(test.before_hour_ut), ">", 0.0)
    if test.before_dawn is not None:
        return compare.Comparison(compare.conjunction_before_dawn(test.before_dawn), ">", 0.0)
    signs: tuple[tuple[compare.Sign, float | None], ...] = (
        (">=", test.at_least), (">", test.more_than), ("<=", test.at_most), ("<", test.less_than),
    )
    sign, value = next((sign, value) for sign, value in signs if value is not None)
    return compare.Comparison(_quantity(test), sign, value)


def _quantity(test: declared.Threshold) -> compare.Quantity:
    frame = test.frame or "topocentric"
    match test.quantity:
        case "altitude":
            return compare.altitude(frame, test.limb or "centre", test.air == "refracted", test.at or "sunset")
        case "elongation":
            return compare.elongation(frame, test.at or "sunset")
        case "arc-of-vision":
            return compare.arc_of_vision(frame, test.at or "best-time")
        case "relative-azimuth":
            return compare.relative_azimuth(frame, test.at or "best-time")
        case "width":
            return compare.width(frame, test.at or "best-time")
        case "lag":
            return compare.lag()
        case "age":
            return compare.age()
        case _:
            return compare.illumination(test.at or "sunset")
