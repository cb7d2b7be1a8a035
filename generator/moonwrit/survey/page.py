"""The results of a survey as one page with pictures drawn from them; it needs no other file and loads none."""

from __future__ import annotations

from collections.abc import Iterable
from functools import cache
from html import escape
from itertools import pairwise
from typing import Any

import numpy as np

from moonwrit.policy.uncertainty import delta_t_error_s
from moonwrit.sky.land import land
from moonwrit.survey.results import Results
from moonwrit.survey.unit import CLOSENESSES

_STYLE = """
body { font: 1rem/1.5 system-ui, sans-serif; max-width: 60rem; margin: 2rem auto; padding: 0 1rem; color: #1b1f24;
  background: #fff }
table { border-collapse: collapse } th, td { padding: .2rem .7rem; text-align: right; vertical-align: top }
th:first-child, td:first-child { text-align: left; padding-left: 0 } thead th { border-bottom: 1px solid #555 }
tbody th, td, small { white-space: pre } small { display: block; color: #4a5058 }
.scroll { overflow-x: auto; margin: 1rem 0 } figure .scroll { margin: 0 }
figure { margin: 1.5rem 0 } figcaption { margin-top: .3rem }
svg { display: block; max-width: 100%; height: auto } svg text { font: 14px sans-serif } .scroll svg { max-width: none }
#agreement text { font-size: 13px }
.key { display: inline-block; width: .8em; height: .8em }
.edge { fill: #8c2d04; background: #8c2d04 } .close { fill: #d98c2b; background: #d98c2b }
.wide { fill: #9fc5e0; background: #9fc5e0 } .fixed { fill: #c9c9c9; background: #c9c9c9 }
.line { stroke: #1b1f24; stroke-width: 2 } .zero { stroke: #777; stroke-width: 2 } .dot { fill: #1b1f24 }
.land { fill: none; stroke: #d9480f; stroke-width: .8 } .frame { fill: none; stroke: #777 }
"""
_LETTER = 8.0
"""A generous mean width of a letter in the pictures."""
_WIDTH = 400
"""Of pictures with letters: on a phone they are drawn little smaller."""

_CLOSENESSES = {
    "edge": "within 2% of a day's change", "close": "within 15%", "wide": "further", "fixed": "nothing is measured",
}


def page(results: Results) -> bytes:
    """The page, in UTF-8. Equal results give equal bytes."""
    survey = results.survey
    names = [policy["name"] for policy in survey["policies"]]
    years = f"{survey['first_year']} to {survey['last_year']} AH"
    where = (f"On a grid of {survey['grid_deg']:g} degrees between 60 S and 60 N ({survey['place_count']} places), "
             "where a place counts by the area that it stands for"
             if survey["grid_deg"] else "At " + "; ".join(place["name"] for place in survey["places"]))
    sky = survey["ephemeris"]
    error = max(delta_t_error_s(survey[key] * 354.36707 / 365.2425 + 621.57) for key in ("first_year", "last_year"))
    parts = [f"<h1>Survey of {len(names)} {'policies' if len(names) > 1 else 'policy'}, {years}</h1>",
             f"<p>{escape(where)}. Each number is computed; recorded decisions are left aside.</p>", "<ul>"]
    parts += [
        f"<li><strong>{escape(policy['name'])}</strong>: {escape(policy['title'])}; "
        f"{'asked at each place' if policy['at_each_place'] else 'the same at every place'}</li>"
        for policy in survey["policies"]
    ]
    parts += [
        "</ul>",
        f"<p>Ephemeris {escape(sky['file'])}, {escape(sky['span'])}. How far the Earth has turned is not known exactly "
        f"ahead, nor long ago: in these years the standard error reaches about {error:.1f} s, and calls closer than "
        "that are open.</p>",
    ]
    if results.seams:
        parts.append(f"<p><strong>{results.seams} joints of two runs of years do not meet</strong>: a walk had not "
                     "settled within two years, as near the poles. Do not count on month lengths there.</p>")
    if results.agreement:
        parts += [
            "<h2>Agreement</h2>",
            _figure(_scroll("Agreement of each two", _matrix(results, names)),
                    "Months that two policies begin on the same day."),
            _table("Agreement in numbers",
                   ("", "same day", "first begins earlier", "first begins later", "least at a place", "most at a place",
                    "most days apart"),
                   [((f"{row['policy']} /\n{row['other']}",),
                     *((f"{row[key]:.2%}",) for key in ("agreement", "earlier_share", "later_share",
                                                        "least_agreement", "most_agreement")),
                     (str(row["most_days_apart"]),))
                    for row in results.agreement]),
        ]
        if results.cells:
            shares = [share for _, _, share in results.cells]
            parts.append(_figure(_map(results, min(shares), max(shares)), (
                f"Months that {'all' if len(names) > 2 else 'both'} the policies begin on the same day: from white, "
                f"{min(shares):.1%}, to dark, {max(shares):.1%}. 180 W to 180 E, 60 S to 60 N.")))
    kinds = [kind for kind in CLOSENESSES if any(row["margin_shares"][kind] for row in results.policies)]
    keys = "; ".join(f'<span class="key {kind}"></span> {kind}: {_CLOSENESSES[kind]}' for kind in kinds)
    parts += [
        "<h2>How close the calls were</h2>", _figure(_margins(results), f"Shares of months. {keys}."),
        "<h2>First evenings and the conjunction</h2>",
        _figure(_ages(results), "Age of the Moon at the sunset of the eve, in hours from the conjunction: the least, "
                                "the mean (the dot) and the most."),
        "<h2>Months</h2>",
        _table("Months in numbers",
               ("", "29 days", "30 days", "longest run of 29", "longest run of 30", "earliest start", "latest start",
                "before the conjunction"),
               [((row["policy"],), (f"{row['length_shares']['29']:.2%}",), (f"{row['length_shares']['30']:.2%}",),
                 _run(row["longest_29"]), _run(row["longest_30"]), _age(row["age_least"]), _age(row["age_most"]),
                 (f"{row['before_conjunction_share']:.2%}",))
                for row in results.policies]),
        "<p>Runs are given with their first month, and where they are found first. Earliest and latest: hours from the "
        "conjunction to the sunset of the eve. By place: policies.csv, agreement.csv, places.csv; in total: "
        "survey.json.</p>",
    ]
    body = "\n".join(parts)
    return (
        '<!doctype html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>Survey of policies, {years}</title>\n<style>{_STYLE}</style>\n</head>\n"
        f"<body>\n<main>\n{body}\n</main>\n</body>\n</html>\n"
    ).encode()


def _run(run: dict[str, Any]) -> tuple[str, ...]:
    return (str(run["months"]), run["from"], run["place"]) if run["months"] else ("0",)


def _age(age: dict[str, Any] | None) -> tuple[str, ...]:
    return (f"{age['hours']:.1f} h", age["month"], age["place"]) if age else ("-",)


def _table(name: str, head: tuple[str, ...], rows: Iterable[tuple[tuple[str, ...], ...]]) -> str:
    """Each cell is what it says and what stands below in small letters."""
    def inside(cell: tuple[str, ...]) -> str:
        return escape(cell[0]) + "".join(f"<small>{escape(more)}</small>" for more in cell[1:])

    heads = "".join(f'<th scope="col">{escape(cell)}</th>' if cell else "<td></td>" for cell in head)
    body = "\n".join(
        f'<tr><th scope="row">{inside(row[0])}</th>' + "".join(f"<td>{inside(cell)}</td>" for cell in row[1:]) + "</tr>"
        for row in rows
    )
    return _scroll(name, f"<table>\n<thead><tr>{heads}</tr></thead>\n<tbody>\n{body}\n</tbody>\n</table>")


def _scroll(name: str, wide: str) -> str:
    """What may be wider than the window, moved by finger or keys."""
    return f'<div class="scroll" role="region" tabindex="0" aria-label="{escape(name)}">{wide}</div>'


# --- pictures ---------------------------------------------------------------------------------------------------------


def _figure(picture: str, caption: str) -> str:
    return f"<figure>{picture}<figcaption>{caption}</figcaption></figure>"


def _svg(name: str, width: float, height: float, title: str, told: str, parts: list[str]) -> str:
    inside = "\n".join(parts)
    return (
        f'<svg id="{name}" viewBox="0 0 {width:.0f} {height:.0f}" width="{width:.0f}" height="{height:.0f}" role="img" '
        f'aria-labelledby="{name}-title {name}-desc">\n<title id="{name}-title">{escape(title)}</title>\n'
        f'<desc id="{name}-desc">{escape(told)}</desc>\n{inside}\n</svg>'
    )


def _text(x: float, y: float, text: str, anchor: str = "start", fill: str = "#1b1f24") -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" fill="{fill}">{escape(text)}</text>'


def _blue(share: float) -> str:
    """From white (0) to a dark blue (1)."""
    return "#" + "".join(f"{round(255 + (end - 255) * share):02x}" for end in (16, 66, 122))


def _matrix(results: Results, names: list[str]) -> str:
    step, beside = 56, (max(map(len, names)) + 3) * _LETTER + 10
    parts = []
    for index, name in enumerate(names):
        middle = 10 + step * (index + 0.5)
        parts.append(_text(beside - 6, middle + 4, f"{index + 1} {name}", "end"))
        parts.append(_text(beside + step * (index + 0.5), 20 + step * len(names), str(index + 1), "middle"))
    places = {name: index for index, name in enumerate(names)}
    told = []
    for row in results.agreement:
        one, other, share = places[row["policy"]], places[row["other"]], row["agreement"]
        told.append(f"{row['policy']} and {row['other']}: {share:.1%}.")
        for across, down in ((one, other), (other, one)):
            x, y = beside + step * across, 10 + step * down
            parts.append(f'<rect x="{x:.1f}" y="{y}" width="{step - 2}" height="{step - 2}" fill="{_blue(share)}"/>')
            parts.append(_text(x + step / 2 - 1, y + step / 2 + 4, f"{share:.1%}", "middle",
                               "#fff" if share > 0.7 else "#1b1f24"))
    return _svg("agreement", beside + step * len(names) + 10, 30 + step * len(names),
                "Months that two policies begin on the same day", " ".join(told), parts)


def _map(results: Results, least: float, most: float) -> str:
    """Cells by the share of months on which all policies agree, under the outlines of land; equirectangular."""
    deg = max(5.0, results.survey["grid_deg"])
    parts = [
        f'<rect x="{(longitude + 180 - deg / 2) * 2:.1f}" y="{(60 - latitude - deg / 2) * 2:.1f}" '
        f'width="{2 * deg:.1f}" height="{2 * deg:.1f}" '
        f'fill="{_blue((share - least) / (most - least) if most > least else 1.0)}"/>'
        for latitude, longitude, share in results.cells
    ]
    parts += [f'<path class="land" d="{_coast()}"/>', '<rect class="frame" width="720" height="240"/>']
    return _svg("map", 720, 240, "Months that all the policies begin on the same day",
                f"From {least:.1%} to {most:.1%} of the months, by place.", parts)


@cache
def _coast() -> str:
    """To half a degree; what lies beyond the map is not drawn, nor a line across it where a ring passes 180 E."""
    drawn = []
    for polygon in land().polygons:
        for ring in polygon:
            if ring[:, 1].max() < -60 or ring[:, 1].min() > 60:
                continue
            points = np.rint(np.stack([360 + 2 * ring[:, 0], 120 - 2 * ring[:, 1]], axis=1)).astype(int).tolist()
            drawn.append("M{} {}".format(*points[0]))
            drawn += ["{}{} {}".format("L" if abs(x - before[0]) < 360 else "M", x, y)
                      for before, (x, y) in pairwise(points) if before != [x, y]]
    return "".join(drawn)


def _margins(results: Results) -> str:
    parts, told = [], []
    for index, row in enumerate(results.policies):
        y, x, said = 62 * index, 0.0, []
        for kind in CLOSENESSES:
            share = row["margin_shares"][kind]
            if not share:
                continue
            width = _WIDTH * share
            parts.append(f'<rect class="{kind}" x="{x:.1f}" y="{y + 20}" width="{width:.1f}" height="18"/>')
            said.append(f"{kind} {share:.1%}")
            x += width
        parts += [_text(0, y + 14, row["policy"]), _text(0, y + 52, ", ".join(said))]
        told.append(f"{row['policy']}: {', '.join(said)}.")
    return _svg("margins", _WIDTH, 62 * len(results.policies),
                "How close the calls were: shares of months on the edge, close, wide and fixed", " ".join(told), parts)


def _ages(results: Results) -> str:
    rows = [row for row in results.policies if row["age_least"]]
    ages = [row[key]["hours"] for row in rows for key in ("age_least", "age_most")]
    if not ages:
        return _svg("ages", 300, 30, "Age of the Moon on the eve", "No Sun sets.", [_text(4, 20, "No Sun sets.")])
    low, high = min(0.0, *ages), max(0.0, *ages)

    def x_of(hours: float) -> float:
        return float(4 + (_WIDTH - 130) * (hours - low) / ((high - low) or 1))

    bottom = 44 * len(rows)
    parts, told = [], []
    for index, row in enumerate(rows):
        y = 44 * index + 28
        least, most, mean = row["age_least"]["hours"], row["age_most"]["hours"], row["age_mean_h"]
        parts += [
            _text(0, y - 12, row["policy"]),
            f'<line class="zero" x1="{x_of(0):.1f}" y1="{y - 7}" x2="{x_of(0):.1f}" y2="{y + 7}"/>',
            f'<line class="line" x1="{x_of(least):.1f}" y1="{y}" x2="{x_of(most):.1f}" y2="{y}"/>',
            f'<circle class="dot" cx="{x_of(mean):.1f}" cy="{y}" r="5"/>',
            _text(x_of(most) + 10, y + 5, f"{least:.1f} to {most:.1f} h"),
        ]
        told.append(f"{row['policy']}: {least:.1f} to {most:.1f} h, mean {mean:.1f} h.")
    parts.append(_text(x_of(0), bottom + 14, "conjunction", "middle" if x_of(0) > 45 else "start"))
    return _svg("ages", _WIDTH, bottom + 24, "Age of the Moon at the sunset of the eve, in hours",
                " ".join(told), parts)
