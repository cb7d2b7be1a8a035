"""Published policies by name, each with its source."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from zoneinfo import ZoneInfo

from moonwrit.calendars import TABULAR_NAMES, tabular_by_name
from moonwrit.content.models import Place
from moonwrit.errors import RequestError, did_you_mean
from moonwrit.policy.conditions import Either, Every, Scoped
from moonwrit.policy.methods import Method
from moonwrit.policy.names import CRITERIA, graded_name, published_names
from moonwrit.policy.scopes import Anywhere, AtPlaces, Before, Within
from moonwrit.policy.walk import Era
from moonwrit.sky import Places
from moonwrit.sky.comparison import (
    Any,
    Comparison,
    conjunction_before_dawn,
    conjunction_before_hour,
    lag,
)
from moonwrit.sky.criteria import Criterion, criterion
from moonwrit.sky.land import american_mainland


@dataclass(frozen=True, slots=True)
class NamedPlace:
    """A place by name: geodetic degrees (north, east positive), metres above sea level, time zone."""

    name: str
    latitude_deg: float
    longitude_deg: float
    elevation_m: float
    zone: ZoneInfo | None

    @classmethod
    def of(cls, name: str, place: Place) -> NamedPlace:
        """A place of the content, by a name."""
        return cls(name, place.latitude, place.longitude, place.elevation, place.zone)

    @property
    def row(self) -> tuple[float, float, float, ZoneInfo | None]:
        return self.latitude_deg, self.longitude_deg, self.elevation_m, self.zone

    def scope(self) -> AtPlaces:
        return AtPlaces((self.name,), Places.of([self.row]))


MAKKAH = NamedPlace("Makkah", 21.4225, 39.826, 0.0, ZoneInfo("Asia/Riyadh"))
"""21.4225 N, 39.826 E: R. H. van Gent, The Islamic calendar, Utrecht University (web). Elevation 0, the plain
standard horizon: of the conventions tried it agrees with the published table in the most months."""
EAST_CAPE = NamedPlace("East Cape, New Zealand", -38.7, 178.0, 0.0, ZoneInfo("Pacific/Auckland"))
"""Where dawn first reaches New Zealand; 38.7 S, 178.0 E reproduces the dates that Türkiye announced."""


def _year(year: int) -> int:
    return (year - 1) * 12


def _at(rule_of: str, place: NamedPlace) -> Scoped:
    return Scoped(criterion(rule_of).rule(), place.scope())


def _umm_al_qura() -> Method:
    by_midnight = Scoped(Comparison(conjunction_before_hour(24), ">", 0.0), MAKKAH.scope())
    return Method(
        "umm-al-qura", "Umm al-Qura",
        "rules by period: R. H. van Gent, The Islamic calendar, Utrecht University (web); from 1423 on also "
        "Z. Mostafa, The Observatory 125 (2005), from memory",
        "calculation",
        eras=(
            Era(_year(1393), by_midnight),
            Era(_year(1420), _at("moonset-after-sunset", MAKKAH)),
            Era(_year(1423), _at("moon-up-after-conjunction", MAKKAH)),
        ),
        rests_on=(criterion("moonset-after-sunset"), criterion("moon-up-after-conjunction")),
        note="From the year 1451 on the table carried by common software no longer follows the published rule; "
        "Moonwrit follows the rule.",
    )


def _umm_al_qura_table() -> Method:
    rule = Any((
        Comparison(conjunction_before_hour(-3), ">", 0.0),
        Comparison(lag(), ">=", 19.75),
    ))
    return Method(
        "umm-al-qura-table", "Umm al-Qura, as the table in software runs",
        "the published rules for 1420 to 1451/3; before and after, inferred from the table that ICU and java.time "
        "carry, and published nowhere known",
        "calculation",
        eras=(
            Era(_year(1411), Scoped(rule, MAKKAH.scope())),
            Era(_year(1420), _at("moonset-after-sunset", MAKKAH)),
            Era(_year(1423), _at("moon-up-after-conjunction", MAKKAH)),
            Era(_year(1451) + 3, Scoped(rule, MAKKAH.scope())),
        ),
        note="The rule for 1411-1419 and from 1451/4 on was found by fitting a table; its makers have not stated "
        "it.",
    )


def _istanbul_1978() -> Method:
    rule = criterion("istanbul-5-8").rule()
    return Method(
        "istanbul-1978", "Istanbul 1978", criterion("istanbul-5-8").source, "calculation",
        eras=(Era(0, Scoped(rule, Anywhere(Before(hour_ut=24.0)))),),
        rests_on=(criterion("istanbul-5-8"),),
        note="Anywhere between 60 S and 60 N before 24:00 UT of the date; geocentric elongation, topocentric "
        "airless altitude, the frames that reproduce the dates Türkiye announced.",
    )


def _istanbul_2016() -> Method:
    rule = criterion("istanbul-5-8").rule()
    return Method(
        "istanbul-2016", "Istanbul 2016",
        "International Hijri Calendar Union congress, Istanbul, May 2016, as reported by linggaupos (2024), "
        "muhammadiyahnews (2024) and tarjih.or.id (2023)",
        "calculation",
        eras=(Era(0, Either((
            Scoped(rule, Anywhere(Before(hour_ut=24.0))),
            Every((
                Scoped(Comparison(conjunction_before_dawn(), ">", 0.0), EAST_CAPE.scope()),
                Scoped(rule, Within(american_mainland())),
            )),
        ))),),
        rests_on=(criterion("istanbul-5-8"),),
        note="One zone for the whole Earth; the clause for the American mainland and New Zealand's dawn included. "
        "Searches stay between 60 S and 60 N.",
    )


def _here(
    name: str, test: Criterion, accept: tuple[str, ...] | None, title: str, place: NamedPlace | None
) -> Method:
    if place is None:
        raise RequestError(
            f"the policy {name} leaves the place open", 'give one: --place "name,lat,lon,elevation,zone"'
        )
    return Method(
        name, title, test.source, "record" if test.grades else "calculation",
        eras=(Era(0, Scoped(test.rule(accept), place.scope())),),
        note="Unverified: its values could not be confirmed." if test.unverified else "",
        rests_on=(test,),
    )


def _tabular(name: str) -> Method:
    return Method(
        name, f"Tabular calendar ({name.removeprefix('tabular-')})",
        "arithmetic of thirty-year cycles; R. H. van Gent, The Islamic calendar, Utrecht University (web)",
        "calculation", tabular=tabular_by_name(name),
    )


_WHOLE: dict[str, Callable[[], Method]] = {
    "umm-al-qura": _umm_al_qura,
    "umm-al-qura-table": _umm_al_qura_table,
    "istanbul-1978": _istanbul_1978,
    "istanbul-2016": _istanbul_2016,
}


def published(name: str, place: NamedPlace | None = None) -> Method:
    """A published policy; ``place`` where it leaves the place open.

    Raises RequestError for an unknown name, or a place that is missing.
    """
    if name in _WHOLE:
        return _WHOLE[name]()
    if name in TABULAR_NAMES:
        return _tabular(name)
    for test_name, labels in CRITERIA.items():
        test = criterion(test_name)
        if name == test_name and not labels:
            return _here(name, test, None, test.title, place)
        for index, label in enumerate(labels):
            if name == graded_name(test_name, label):
                span = f"class {label}" if index == 0 else f"classes {labels[0]} to {label}"
                return _here(name, test, labels[: index + 1], f"{test.title}, {span}", place)
    raise RequestError(f'policy "{name}" is not known', did_you_mean(name, published_names()))
