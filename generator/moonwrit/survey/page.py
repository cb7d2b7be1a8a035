"""The results of a survey as one page with pictures drawn from them; it needs no other file and loads none."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape
from typing import Any

from moonwrit.policy.uncertainty import delta_t_error_s
from moonwrit.survey.results import Results
from moonwrit.survey.unit import CLOSENESSES

_STYLE = """
body { font: 1rem/1.5 system-ui, sans-serif; max-width: 60rem; margin: 2rem auto; padding: 0 1rem; color: #1b1f24;
  background: #fff }
table { border-collapse: collapse; margin: 1rem 0 } th, td { padding: .2rem .7rem; text-align: right }
th:first-child, td:first-child { text-align: left } thead th { border-bottom: 1px solid #555 }
figure { margin: 1.5rem 0; overflow-x: auto } svg { max-width: 100%; height: auto } svg text { font: 13px sans-serif }
.edge { fill: #8c2d04 } .close { fill: #d98c2b } .wide { fill: #9fc5e0 } .fixed { fill: #c9c9c9 }
.line { stroke: #1b1f24; stroke-width: 2 } .zero { stroke: #777; stroke-dasharray: 3 3 } .dot { fill: #1b1f24 }
"""
_LETTER = 8.0
"""A generous mean width of a letter in the pictures."""


def page(results: Results) -> bytes:
    """The page, in UTF-8. Equal results give equal bytes."""
    survey = results.survey
    titles = {policy["name"]: policy["title"] for policy in survey["policies"]}
    years = f"{survey['first_year']} to {survey['last_year']} AH"
    where = (f"a grid of {survey['grid_deg']:g} degrees between 60 S and 60 N ({survey['place_count']} places)"
             if survey["grid_deg"] else ", ".join(place["name"] for place in survey["places"]))
    sky = survey["ephemeris"]
    error = max(delta_t_error_s(survey[key] * 354.36707 / 365.2425 + 621.57) for key in ("first_year", "last_year"))
    parts = [
        f"<h1>Survey of {len(titles)} policies, {years}</h1>",
        f"<p>At {escape(where)}. Each number is computed; recorded decisions are left aside. Policies that name no "
        "place of their own are asked at each place. On a grid a place counts by the area that it stands for.</p>",
        f"<p>Ephemeris {escape(sky['file'])}, {escape(sky['span'])}. How far the Earth has turned is not known exactly "
        f"ahead, nor long ago: in these years the standard error reaches about {error:.1f} s, and calls closer than "
        "that are open.</p>",
        "<h2>Agreement</h2>",
    ]
    if results.seams:
        parts.insert(3, f"<p><strong>{results.seams} joints of two runs of years do not meet</strong>: a walk had not "
                     "settled within two years, as near the poles. Do not count on month lengths there.</p>")
    if results.agreement:
        parts.append(_figure(_matrix(results, list(titles))))
        parts.append(_table(
            ("", "same day", "first begins earlier", "later", "least at a place", "most at a place", "most days apart"),
            [
                (f"{row['policy']} / {row['other']}",
                 *(f"{row[key]:.2%}" for key in ("agreement", "earlier_share", "later_share", "least_agreement",
                                                 "most_agreement")), str(row["most_days_apart"]))
                for row in results.agreement
            ],
        ))
    if results.cells:
        parts.append(_figure(_map(results)))
    parts += ["<h2>How close the calls were</h2>", _figure(_margins(results)),
              "<h2>First evenings and the conjunction</h2>", _figure(_ages(results)), "<h2>Months</h2>"]
    parts.append(_table(
        ("", "29 days", "30 days", "longest run of 29", "of 30", "earliest start", "latest start",
         "before the conjunction"),
        [
            (titles[row["policy"]], f"{row['length_shares']['29']:.2%}", f"{row['length_shares']['30']:.2%}",
             _run(row["longest_29"]), _run(row["longest_30"]), _age(row["age_least"]), _age(row["age_most"]),
             f"{row['before_conjunction_share']:.2%}")
            for row in results.policies
        ],
    ))
    parts.append("<p>Earliest and latest: hours from the conjunction to the sunset of the eve, with the month and the "
                 "place. By place: policies.csv, agreement.csv, places.csv; in total: survey.json.</p>")
    body = "\n".join(parts)
    return (
        '<!doctype html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>Survey of policies, {years}</title>\n<style>{_STYLE}</style>\n</head>\n"
        f"<body>\n<main>\n{body}\n</main>\n</body>\n</html>\n"
    ).encode()


def _run(run: dict[str, Any]) -> str:
    return f"{run['months']} ({run['from']}, {run['place']})" if run["months"] else "0"


def _age(age: dict[str, Any] | None) -> str:
    return f"{age['hours']:.1f} h ({age['month']}, {age['place']})" if age else "-"


def _table(head: tuple[str, ...], rows: Iterable[tuple[str, ...]]) -> str:
    heads = "".join(f'<th scope="col">{escape(cell)}</th>' if cell else "<td></td>" for cell in head)
    lines = [
        f'<tr><th scope="row">{escape(row[0])}</th>' + "".join(f"<td>{escape(cell)}</td>" for cell in row[1:]) + "</tr>"
        for row in rows
    ]
    body = "\n".join(lines)
    return f"<table>\n<thead><tr>{heads}</tr></thead>\n<tbody>\n{body}\n</tbody>\n</table>"


# --- pictures ---------------------------------------------------------------------------------------------------------


def _figure(svg: str) -> str:
    return f"<figure>{svg}</figure>"


def _svg(name: str, width: float, height: float, title: str, told: str, parts: list[str]) -> str:
    inside = "\n".join(parts)
    return (
        f'<svg viewBox="0 0 {width:.0f} {height:.0f}" width="{width:.0f}" height="{height:.0f}" role="img" '
        f'aria-labelledby="{name}-title {name}-desc">\n<title id="{name}-title">{escape(title)}</title>\n'
        f'<desc id="{name}-desc">{escape(told)}</desc>\n{inside}\n</svg>'
    )


def _text(x: float, y: float, text: str, anchor: str = "start", fill: str = "#1b1f24") -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" fill="{fill}">{escape(text)}</text>'


def _blue(share: float) -> str:
    """From white (0) to a dark blue (1)."""
    return "#" + "".join(f"{round(255 + (end - 255) * share):02x}" for end in (16, 66, 122))


def _matrix(results: Results, names: list[str]) -> str:
    step, beside = 56, max(map(len, names)) * _LETTER + 10
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


def _map(results: Results) -> str:
    """Cells by the share of months on which all policies agree, as an equirectangular map."""
    least = min(share for _, _, share in results.cells)
    most = max(share for _, _, share in results.cells)
    deg = max(5.0, results.survey["grid_deg"])
    parts = [
        f'<rect x="{(longitude + 180 - deg / 2) * 2:.1f}" y="{(60 - latitude - deg / 2) * 2:.1f}" '
        f'width="{2 * deg:.1f}" height="{2 * deg:.1f}" '
        f'fill="{_blue((share - least) / (most - least) if most > least else 1.0)}"/>'
        for latitude, longitude, share in results.cells
    ]
    parts.append(_text(0, 256, f"180 W to 180 E, 60 S to 60 N; white {least:.1%}, dark {most:.1%}"))
    return _svg("map", 720, 262, "Months that all the policies begin on the same day",
                f"From {least:.1%} to {most:.1%} of the months, by place.", parts)


def _margins(results: Results) -> str:
    beside = max(len(row["policy"]) for row in results.policies) * _LETTER + 10
    parts, told = [], []
    for index, row in enumerate(results.policies):
        y, x = 8 + 26 * index, beside
        parts.append(_text(beside - 6, y + 14, row["policy"], "end"))
        said = []
        for kind in CLOSENESSES:
            share = row["margin_shares"][kind]
            if not share:
                continue
            parts.append(f'<rect class="{kind}" x="{x:.1f}" y="{y}" width="{500 * share:.1f}" height="20"/>')
            said.append(f"{kind} {share:.1%}")
            x += 500 * share
        parts.append(_text(beside + 508, y + 14, ", ".join(said)))
        told.append(f"{row['policy']}: {', '.join(said)}.")
    return _svg("margins", beside + 830, 16 + 26 * len(results.policies),
                "How close the calls were: shares of months on the edge, close, wide and fixed", " ".join(told), parts)


def _ages(results: Results) -> str:
    rows = [row for row in results.policies if row["age_least"]]
    ages = [row[key]["hours"] for row in rows for key in ("age_least", "age_most")]
    if not ages:
        return _svg("ages", 300, 30, "Age of the Moon on the eve", "No Sun sets.", [_text(4, 20, "No Sun sets.")])
    low, high = min(0.0, *ages), max(0.0, *ages)
    beside = max(len(row["policy"]) for row in rows) * _LETTER + 10

    def x_of(hours: float) -> float:
        return float(beside + 50 + 500 * (hours - low) / ((high - low) or 1))

    bottom = 12 + 26 * len(rows)
    parts = [f'<line class="zero" x1="{x_of(0):.1f}" y1="4" x2="{x_of(0):.1f}" y2="{bottom}"/>',
             _text(x_of(0), bottom + 16, "conjunction", "middle")]
    told = []
    for index, row in enumerate(rows):
        y = 18 + 26 * index
        least, most, mean = row["age_least"]["hours"], row["age_most"]["hours"], row["age_mean_h"]
        parts += [
            _text(beside - 6, y + 4, row["policy"], "end"),
            f'<line class="line" x1="{x_of(least):.1f}" y1="{y}" x2="{x_of(most):.1f}" y2="{y}"/>',
            f'<circle class="dot" cx="{x_of(mean):.1f}" cy="{y}" r="5"/>',
            _text(x_of(least) - 6, y + 4, f"{least:.1f}", "end"), _text(x_of(most) + 6, y + 4, f"{most:.1f} h"),
        ]
        told.append(f"{row['policy']}: {least:.1f} to {most:.1f} h, mean {mean:.1f} h.")
    return _svg("ages", beside + 620, bottom + 24, "Age of the Moon at the sunset of the eve, in hours",
                " ".join(told), parts)
