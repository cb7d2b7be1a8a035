"""What a policy asks, asked everywhere on Earth: for maps of one evening."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from moonwrit.policy.conditions import Condition, Every, Scoped
from moonwrit.policy.methods import Method
from moonwrit.policy.months import Month
from moonwrit.policy.published import NamedPlace
from moonwrit.policy.scopes import MAX_LATITUDE_DEG, Anywhere, AtPlaces, Flags, Within
from moonwrit.policy.walk import Questions
from moonwrit.sky import Array, Circumstances, Evenings, Places
from moonwrit.sky.comparison import met
from moonwrit.sky.maps import Grid, over, spanned

_FAR = 5.0
"""Shares beyond are as good as without end: a Moon that does not set has an endless lag."""


@dataclass(frozen=True)
class Asked:
    """The condition of one month on one evening (``evenings`` has a single row)."""

    condition: Condition
    evenings: Evenings

    def over(self, grid: Grid) -> tuple[Array, Array]:
        """The share, and the lag in minutes, at every point [row, column].

        The share is that of the test as if it were asked at the point: not negative where it is met there. Where an
        area must be searched, only its points before the deadline can meet it, and a test at named places that must
        hold besides is asked there. NaN where nothing can be asked: no sunset, or outside the area searched.
        """
        share, lag = over(grid, self.evenings, self._share, lambda c: c.lag_min)
        return share, lag

    def met(self, places: list[NamedPlace]) -> Flags:
        """Whether the test is met at each place [place], by its own clock and elevation."""
        share = self._share(self.evenings.at(Places.of([place.row for place in places])))
        found: Flags = met(share)[0, 0]
        return found

    def named_places(self) -> list[NamedPlace]:
        """The places that the condition names, each once."""
        found: dict[str, NamedPlace] = {}
        for scope in (scoped.scope for scoped in _scoped(self.condition)):
            if isinstance(scope, AtPlaces):
                at, zones = scope.places, scope.places.zones or (None,) * len(scope.names)
                for index, name in enumerate(scope.names):
                    found.setdefault(name, NamedPlace(
                        name, float(at.latitude_deg[index]), float(at.longitude_deg[index]),
                        float(at.elevation_m[index]), zones[index],
                    ))
        return list(found.values())

    def _share(self, c: Circumstances) -> Array:
        areas = any(not isinstance(scoped.scope, AtPlaces) for scoped in _scoped(self.condition))
        return np.clip(self._of(self.condition, c, gates=areas), -_FAR, _FAR)

    def _of(self, condition: Condition, c: Circumstances, *, gates: bool) -> Array:
        if isinstance(condition, Scoped):
            return self._of_scoped(condition, c, gates=gates)
        parts = [self._of(part, c, gates=gates) for part in condition.parts]
        join = np.minimum if isinstance(condition, Every) else np.fmax
        joined: Array = join.reduce(parts)
        return joined

    def _of_scoped(self, scoped: Scoped, c: Circumstances, *, gates: bool) -> Array:
        scope = scoped.scope
        if isinstance(scope, AtPlaces) and gates:
            there = scope.decide(scoped.rule, self.evenings).share[..., None]
            return np.broadcast_to(np.nan_to_num(there, nan=-_FAR), (*c.day.shape, len(c.places)))
        share = scoped.rule.share(c)
        latitude, longitude = c.places.latitude_deg, c.places.longitude_deg
        if isinstance(scope, Anywhere):
            if scope.before is not None:
                share = np.minimum(share, scope.before.tt(self.evenings)[..., None] - c.sunset_tt)
            share = np.where(np.abs(latitude) <= MAX_LATITUDE_DEG, share, np.nan)
        elif isinstance(scope, Within) and self.condition is not scoped:
            share = np.where(scope.outline.contains(longitude, latitude), share, np.nan)
        return share


def asked_everywhere(method: Method, months: list[Month]) -> list[Asked]:
    """What the method asks on the 29th evening before each month; nothing where it does not ask the sky itself."""
    if not method.eras or not months:
        return []
    ordinals = [month.ordinal for month in months]
    questions = Questions(method.eras, min(ordinals), max(ordinals))
    rows = np.array(ordinals) - int(questions.moons.ordinal[0])
    days = np.array([[month.evidence.evening.toordinal()] for month in months])
    evenings = spanned(questions.evenings(rows, days))
    each = np.arange(len(months))[:, None] == np.arange(len(months))
    return [
        Asked(questions.condition(month.ordinal), evenings.chosen(row[:, None]))
        for month, row in zip(months, each, strict=True)
    ]


def _scoped(condition: Condition) -> list[Scoped]:
    if isinstance(condition, Scoped):
        return [condition]
    return [scoped for part in condition.parts for scoped in _scoped(part)]
