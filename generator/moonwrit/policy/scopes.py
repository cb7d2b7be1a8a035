"""Where a test must hold, and the answer over a whole scope.

A scope turns a rule's shares at places into one share per evening, and names the place that decides it.
Shares are signed (see ``sky.comparison``): the test is met in the scope where the share is not negative.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any, Protocol

import numpy as np
import numpy.typing as npt

from moonwrit.sky import Array, Evenings, Places
from moonwrit.sky.comparison import Rule, clock, met
from moonwrit.sky.land import Outline

MAX_LATITUDE_DEG = 60.0
"""Searches over the Earth stay between 60 degrees south and north: beyond, a sunset may fail."""


Flags = npt.NDArray[np.bool_]

_HOPELESS = -0.5
"""A coarse search that falls short by half a day's change or more is not improved to a success by a finer one:
the steps of the coarse grids change a share by less than a third of that."""


@dataclass(frozen=True, slots=True)
class Verdict:
    """Over [lunation, evening]: the scope's share, the place that decides it, and its index (-1: a point)."""

    share: Array
    latitude_deg: Array
    longitude_deg: Array
    place: npt.NDArray[np.int64]


class Scope(Protocol):
    """Where a test must hold."""

    def decide(self, rule: Rule, evenings: Evenings) -> Verdict: ...

    def met(self, rule: Rule, evenings: Evenings) -> Flags:
        """Only whether it is met, [lunation, evening]: a search may stop as soon as that is certain."""


@dataclass(frozen=True)
class AtPlaces:
    """At named places, of which a share by weight must meet the test: any (0), all (1) or in between.

    Without a sunset a place is judged at its ``fallback`` where there is one, else it is left out; where
    none is left the share is NaN, which is not met.
    """

    names: tuple[str, ...]
    places: Places
    needed: float = 1.0
    weights: Array | None = None
    fallback: Places | None = None
    fallback_names: tuple[str, ...] = ()

    def __str__(self) -> str:
        listed = ", ".join(self.names)
        if len(self.names) == 1:
            where = f"at {listed}"
        elif self.needed in (0.0, 1.0):
            where = f"at {'any' if self.needed == 0 else 'every one'} of {listed}"
        else:
            where = f"at {self.needed:.0%} at least of {listed}"
        if self.fallback is None:
            return where
        return f"{where} (where the Sun does not set: {', '.join(dict.fromkeys(self.fallback_names))})"

    def all_places(self) -> Places:
        """The places, then their fallbacks: what a verdict's ``place`` counts."""
        return self.places if self.fallback is None else self.places.joined(self.fallback)

    def decide(self, rule: Rule, evenings: Evenings) -> Verdict:
        share = rule.share(evenings.at(self.places))
        latitude = np.broadcast_to(self.places.latitude_deg, share.shape)
        longitude = np.broadcast_to(self.places.longitude_deg, share.shape)
        place = np.broadcast_to(np.arange(len(self.names)), share.shape)
        if self.fallback is not None and np.isnan(share).any():
            gone = np.isnan(share)
            share = np.where(gone, rule.share(evenings.at(self.fallback)), share)
            latitude = np.where(gone, self.fallback.latitude_deg, latitude)
            longitude = np.where(gone, self.fallback.longitude_deg, longitude)
            place = np.where(gone, place + len(self.names), place)
        weights = np.ones(len(self.names)) if self.weights is None else self.weights
        usable = np.where(np.isnan(share), 0.0, weights)
        order = np.argsort(-share, axis=-1, kind="stable")  # what is not a number comes last
        reached = np.cumsum(np.take_along_axis(usable, order, -1), axis=-1)
        goal = self.needed * usable.sum(axis=-1, keepdims=True)
        # The first place, best share first, with which the weight that is needed is reached.
        enough = (reached >= goal - 1e-9) & (reached > 0)
        deciding = np.take_along_axis(order, np.argmax(enough, axis=-1)[..., None], -1)

        def chosen(values: npt.NDArray[Any]) -> npt.NDArray[Any]:
            return np.take_along_axis(values, deciding, -1)[..., 0]

        return Verdict(
            np.where(enough.any(axis=-1), chosen(share), np.nan),
            chosen(latitude), chosen(longitude), chosen(place).astype(np.int64),
        )

    def met(self, rule: Rule, evenings: Evenings) -> Flags:
        return met(self.decide(rule, evenings).share)


@dataclass(frozen=True, slots=True)
class Before:
    """A deadline: a UT hour of the evening's civil date (24 = its end), or the dawn at a place."""

    hour_ut: float | None = None
    dawn_at: Places | None = None
    depression_deg: float = 18.0

    def __str__(self) -> str:
        if self.hour_ut is not None:
            return f"before {clock(self.hour_ut)} UT of the date"
        return f"before the dawn there (Sun {self.depression_deg:g} deg down)"

    def tt(self, evenings: Evenings) -> Array:
        """[lunation, evening]"""
        if self.dawn_at is not None:
            dawn: Array = evenings.at(self.dawn_at).night_end_tt(self.depression_deg)[..., 0]
            return dawn
        assert self.hour_ut is not None
        midnight_ut = evenings.day.astype(np.float64) + 1721424.5
        return evenings.sky.tt(midnight_ut + self.hour_ut / 24)


@dataclass(frozen=True, slots=True)
class Anywhere:
    """Anywhere on Earth whose sunset comes before a deadline.

    On each parallel the westernmost sunset in time sees the oldest Moon, so the search runs along the
    curve on which sunset meets the deadline (or along the date's western end), then closes in on the best
    latitude by halving the step. Civil dates are those of local mean time. Before the conjunction, where an
    elongation shrinks westward, it may fall short of the best share by a few hundredths of a failing one.
    """

    before: Before | None = None
    step_deg: float = 5.0
    halvings: int = 5

    def __str__(self) -> str:
        deadline = f" {self.before}" if self.before is not None else ""
        return f"anywhere on Earth between {MAX_LATITUDE_DEG:g} S and {MAX_LATITUDE_DEG:g} N{deadline}"

    def decide(self, rule: Rule, evenings: Evenings) -> Verdict:
        deadline = None if self.before is None else self.before.tt(evenings)
        shape = (*evenings.day.shape, 1)
        parallels = np.arange(-MAX_LATITUDE_DEG, MAX_LATITUDE_DEG + 1e-9, self.step_deg)
        latitude = np.broadcast_to(parallels, (*evenings.day.shape, len(parallels)))
        step = self.step_deg
        best: Verdict | None = None
        for _ in range(self.halvings + 1):
            found = self._along(rule, evenings, latitude, deadline)
            if best is None or (found.share > best.share).any():
                best = _better(best, found)
            step /= 2
            around = best.latitude_deg[..., None] + np.array([-step, step])
            latitude = np.clip(np.broadcast_to(around, (*shape[:-1], 2)), -MAX_LATITUDE_DEG, MAX_LATITUDE_DEG)
        assert best is not None
        return best

    def met(self, rule: Rule, evenings: Evenings) -> Flags:
        return _coarse_to_fine(replace(self, step_deg=2 * self.step_deg, halvings=0), self, rule, evenings)

    def _along(self, rule: Rule, evenings: Evenings, latitude: Array, deadline: Array | None) -> Verdict:
        flat = np.zeros(latitude.shape)
        longitude = np.full(latitude.shape, -180.0)
        if deadline is not None:
            longitude = flat
            for _ in range(4):
                sunset = evenings.at(Places(latitude, longitude, flat)).sunset_tt
                longitude = np.clip(longitude + (sunset - deadline[..., None]) * 360, -180, 180)
            # A hair east of the curve: the sunset must come before the deadline.
            longitude = np.minimum(longitude + 1e-6, 180.0)
        c = evenings.at(Places(latitude, longitude, flat))
        share = rule.share(c)
        if deadline is not None:
            share = np.where(c.sunset_tt <= deadline[..., None], share, -np.inf)
        return _best_of(np.nan_to_num(share, nan=-np.inf), latitude, longitude)


@dataclass(frozen=True, slots=True)
class Within:
    """Anywhere inside an outline, or in a stated share of its area, sampled on a grid.

    Any (``needed`` 0): the best point of the grid, closed in upon by halving the step; every polygon is looked
    at. Otherwise the share of the area (weighted by the cosine of the latitude) on the grid itself.
    """

    outline: Outline
    needed: float = 0.0
    step_deg: float = 2.0
    halvings: int = 3

    def __str__(self) -> str:
        if self.needed > 0:
            return f"over {self.needed:.0%} at least of the area of the outline"
        return "anywhere inside the outline"

    def decide(self, rule: Rule, evenings: Evenings) -> Verdict:
        grid = self.outline.grid if self.needed > 0 else self.outline.grid_of_each
        longitude, latitude = grid(self.step_deg)
        keep = np.abs(latitude) <= MAX_LATITUDE_DEG
        longitude, latitude = longitude[keep], latitude[keep]
        points = Places(latitude, longitude, np.zeros_like(latitude))
        if self.needed > 0:
            names = tuple("" for _ in latitude)
            on_grid = AtPlaces(names, points, self.needed, np.cos(np.radians(latitude)))
            verdict = on_grid.decide(rule, evenings)
            return Verdict(verdict.share, verdict.latitude_deg, verdict.longitude_deg, verdict.place * 0 - 1)
        share = np.nan_to_num(rule.share(evenings.at(points)), nan=-np.inf)
        best = _best_of(share, np.broadcast_to(latitude, share.shape), np.broadcast_to(longitude, share.shape))
        step = self.step_deg
        for _ in range(self.halvings):
            step /= 2
            east, north = (offset.ravel() * step for offset in np.meshgrid([-1, 0, 1], [-1, 0, 1]))
            near_lat = np.clip(best.latitude_deg[..., None] + north, -MAX_LATITUDE_DEG, MAX_LATITUDE_DEG)
            near_lon = best.longitude_deg[..., None] + east
            share = rule.share(evenings.at(Places(near_lat, near_lon, np.zeros_like(near_lat))))
            share = np.where(self.outline.contains(near_lon, near_lat), share, -np.inf)
            best = _better(best, _best_of(np.nan_to_num(share, nan=-np.inf), near_lat, near_lon))
        return best

    def met(self, rule: Rule, evenings: Evenings) -> Flags:
        if self.needed > 0:
            return met(self.decide(rule, evenings).share)
        return _coarse_to_fine(replace(self, step_deg=3 * self.step_deg, halvings=0), self, rule, evenings)


def _coarse_to_fine(coarse: Scope, fine: Scope, rule: Rule, evenings: Evenings) -> Flags:
    """Success in the coarse search is success; only evenings that narrowly failed there are searched finely."""
    share = coarse.decide(rule, evenings).share
    answers = met(share)
    unsure = ~answers & (share > _HOPELESS)
    if unsure.any():
        answers[unsure] = met(fine.decide(rule, evenings.chosen(unsure)).share)[:, 0]
    return answers


def _best_of(share: Array, latitude: Array, longitude: Array) -> Verdict:
    at = np.argmax(share, axis=-1)[..., None]

    def chosen(values: Array) -> Array:
        taken: Array = np.take_along_axis(values, at, -1)[..., 0]
        return taken

    best = chosen(share)
    return Verdict(best, chosen(latitude), chosen(longitude), np.full(best.shape, -1, dtype=np.int64))


def _better(old: Verdict | None, new: Verdict) -> Verdict:
    if old is None:
        return new
    take = new.share > old.share
    return Verdict(
        np.where(take, new.share, old.share),
        np.where(take, new.latitude_deg, old.latitude_deg),
        np.where(take, new.longitude_deg, old.longitude_deg),
        new.place,
    )
