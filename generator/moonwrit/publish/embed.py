"""The list of coming dates that other sites show: a script that carries its own data, and a page for a frame."""

from __future__ import annotations

import json
from typing import Any

from moonwrit.publish import words
from moonwrit.publish.dates import upcoming
from moonwrit.publish.edition import Edition
from moonwrit.publish.pieces import Parts
from moonwrit.publish.render import Page, Renderer

DATES = 10
MONTHS = 6
"""So many main dates and months go with the script, which stays under 6 kB."""


def embed_files(edition: Edition, renderer: Renderer) -> dict[str, Parts]:
    """``embed/<language>.js`` and ``embed/<language>.html``, in a folder of the calendar where it is not the main one.

    The data are in the script, so that another site needs no permission to fetch them. Paths are from the top.
    """
    imprint = edition.imprint
    stem = f"embed/{imprint.base}{imprint.language.code}"
    data = _data(edition)
    text = json.dumps(data, ensure_ascii=False, separators=(",", ":"))
    script = {"data": text, "address": imprint.page("embed/")}
    frame = Page(
        f"{stem}.html", "framed", imprint.name, given={"data": data, "script": f"{imprint.language.code}.js"}
    )
    return {
        f"{stem}.js": (edition.piece(Renderer.text, renderer, "embed/dates.js", script),),
        frame.path: (edition.piece(Renderer.render, renderer, frame),),
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
        "title": edition.imprint.name,
        "site": edition.imprint.page(),
        "months": [
            [month.starts.isoformat(), month.length, words.month_title(month, language)] for month in months[:MONTHS]
        ],
        "dates": [
            [
                one.starts.isoformat(), one.ends.isoformat(),
                words.occurrence_title(edition.imprint.observance(one.observance), one, language),
                words.span(one.starts, one.ends, language), words.standing(one.standing, language),
                f"observances/{one.observance}/",
            ]
            for one in main[:DATES]
        ],
    }


__all__ = ["embed_files"]
