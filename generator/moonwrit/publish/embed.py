"""The list of coming dates that other sites show: a script that carries its own data, and a page for a frame."""

from __future__ import annotations

import json
from typing import Any

from moonwrit.publish import words
from moonwrit.publish.dates import upcoming
from moonwrit.publish.edition import Edition
from moonwrit.publish.render import Page, Renderer

DATES = 10
MONTHS = 6
"""So many main dates and months go with the script, which stays under 6 kB."""


def embed_files(edition: Edition, renderer: Renderer) -> dict[str, bytes]:
    """``embed/<language>.js`` and ``embed/<language>.html``, in a folder of the calendar where it is not the main one.

    The data are in the script, so that another site needs no permission to fetch them. Paths are from the top.
    """
    stem = f"embed/{edition.base}{edition.language.code}"
    data = _data(edition)
    text = json.dumps(data, ensure_ascii=False, separators=(",", ":"))
    frame = Page(f"{stem}.html", "framed", edition.name, {"data": data, "script": f"{edition.language.code}.js"})
    return {
        f"{stem}.js": renderer.text("embed/dates.js", {"data": text, "address": edition.page("embed/")}),
        frame.path: renderer.render(frame),
    }


def _data(edition: Edition) -> dict[str, Any]:
    """``dates``: first day, last day, title, when, standing, path of the page; ``months``: first day, length, name."""
    language = edition.language
    months, dates = upcoming(edition)
    dates = [one for one in dates if one.ends >= edition.almanac.as_of]
    main = [one for one in dates if "main" in one.tags] or dates
    return {
        "lang": language.code,
        "dir": language.direction,
        "title": edition.name,
        "site": edition.page(),
        "months": [
            [month.starts.isoformat(), month.length, words.month_title(month, language)] for month in months[:MONTHS]
        ],
        "dates": [
            [
                one.starts.isoformat(), one.ends.isoformat(),
                words.occurrence_title(edition.say(edition.almanac.observances[one.observance].name), one, language),
                words.span(one.starts, one.ends, language), words.standing(one.standing, language),
                f"observances/{one.observance}/",
            ]
            for one in main[:DATES]
        ],
    }


__all__ = ["embed_files"]
