"""The tables of a survey by place, column by column, and the JSON Schema of ``survey.json``, which is made of them."""

from __future__ import annotations

from typing import Any

from moonwrit.survey.running import PLAN
from moonwrit.survey.unit import CLOSENESSES

Row = dict[str, Any]

MOST_PLACES = 100
"""``survey.json`` lists single places up to so many; beyond, they stand in the tables alone."""

_TEXT = {"type": "string"}
_COUNT = {"type": "integer", "minimum": 0}
_SHARE = {"type": "number", "minimum": 0, "maximum": 1}
_HOURS = {"type": ["number", "null"]}
_MONTH = {"type": ["string", "null"], "pattern": r"^\d+-\d{2}$"}
_DEGREES = {"type": "number"}

PLACE: Row = {"place": _TEXT, "latitude_deg": _DEGREES, "longitude_deg": _DEGREES, "months": _COUNT,
              "all_same": {**_COUNT, "description": "Months that all the policies begin on one day."}}
_WHERE = {key: PLACE[key] for key in ("place", "latitude_deg", "longitude_deg", "months")}

POLICY_AT_PLACE: Row = {
    "policy": _TEXT, **_WHERE, "of_29": _COUNT, "of_30": _COUNT, "other_lengths": _COUNT,
    "longest_29": _COUNT, "longest_29_from": _MONTH, "longest_30": _COUNT, "longest_30_from": _MONTH,
    **dict.fromkeys(CLOSENESSES, _COUNT),
    "age_least_h": _HOURS, "age_least_month": _MONTH, "age_most_h": _HOURS, "age_most_month": _MONTH,
    "age_mean_h": _HOURS,
    "before_conjunction": {**_COUNT, "description": "Months whose eve's sunset comes before the conjunction."},
    "without_sunset": {**_COUNT, "description": "Months on whose eve the Sun does not set: they have no age."},
    "unsettled_seams": {**_COUNT, "description": "Joints between two runs of years at which the walks do not meet."},
}

PAIR_AT_PLACE: Row = {
    "policy": _TEXT, "other": _TEXT, **_WHERE, "same": _COUNT, "agreement": _SHARE,
    "earlier": {**_COUNT, "description": "Months that policy begins before other."},
    "later": {**_COUNT, "description": "Months that policy begins after other."},
    "most_days_apart": _COUNT,
}

TABLES = {"policies": POLICY_AT_PLACE, "agreement": PAIR_AT_PLACE, "places": PLACE}
"""The columns of each table, in order."""


def schema() -> Row:
    """JSON Schema (2020-12) of ``survey.json``; readers must allow for more keys. CSV columns are its keys."""
    run = _object({"months": _COUNT, "from": _MONTH, "place": _TEXT}, "The longest run, and where it is found first.")
    age = {"anyOf": [{"type": "null"}, _object(
        {"hours": {"type": "number"}, "month": _MONTH, "place": _TEXT},
        "Hours from the conjunction to the sunset of the eve; negative before it.",
    )]}
    total = _object({
        "policy": _TEXT,
        "length_shares": _object({"29": _SHARE, "30": _SHARE, "other": _SHARE}, "Of all months at all places."),
        "longest_29": run, "longest_30": run,
        "margin_shares": _object(dict.fromkeys(CLOSENESSES, _SHARE), "Of all months at all places."),
        "age_least": age, "age_most": age, "age_mean_h": _HOURS,
        "before_conjunction_share": _SHARE, "without_sunset_share": _SHARE,
    }, "One policy. On a grid, shares and means count a place by the area of its cell.")
    pair = _object({
        "policy": _TEXT, "other": _TEXT, "agreement": _SHARE, "earlier_share": _SHARE, "later_share": _SHARE,
        "least_agreement": _SHARE, "most_agreement": _SHARE, "most_days_apart": _COUNT,
    }, "Two policies: the share of months begun on one day; the least and the most at any place.")
    place = _object({
        **PLACE,
        "policies": _list(_object(POLICY_AT_PLACE, "One policy at this place.")),
        "agreement": _list(_object(PAIR_AT_PLACE, "Two policies at this place.")),
    }, "One place.")
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "Moonwrit: survey.json: a long-run study of policies",
        **_object({
            "$schema": _TEXT,
            "survey": {"type": "object", "description": f"What was asked, as in {PLAN}."},
            "policies": _list(total),
            "agreement": _list(pair),
            "places": {**_list(place), "description": f"Empty where there are more than {MOST_PLACES}: see the CSV."},
        }, "Months of Hijri years first_year to last_year, by policy and place. Decisions are left aside."),
    }


def _object(properties: Row, description: str) -> Row:
    return {"type": "object", "description": description, "required": list(properties), "properties": properties}


def _list(items: Row) -> Row:
    return {"type": "array", "items": items}
