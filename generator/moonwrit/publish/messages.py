"""Short plain texts ready to send: for every decision and every main observance, in two lengths."""

from __future__ import annotations

from moonwrit.publish.edition import Edition, month_path
from moonwrit.publish.pieces import Parts
from moonwrit.publish.render import Renderer


def messages(edition: Edition, renderer: Renderer) -> dict[str, Parts]:
    """``messages/<year>-<month>/<language>.txt`` for a text message and ``...-email.txt`` for a letter; those of
    observances in a folder of their own below the month. Paths are from the top of the site."""
    files: dict[str, Parts] = {}
    imprint = edition.imprint

    def write(folder: str, kind: str, given: dict[str, object]) -> None:
        for length, ending in (("short", ""), ("email", "-email")):
            made = edition.piece(Renderer.text, renderer, f"messages/{kind}-{length}.txt", given)
            files[f"messages/{folder}/{imprint.language.code}{ending}.txt"] = (made,)

    for month in edition.almanac.months:
        if month.decision is not None:
            write(f"{month.year}-{month.month:02d}", "month",
                  {"month": month, "address": imprint.page(month_path(month))})
    for one in edition.almanac.occurrences:
        if "main" not in one.tags:
            continue
        observance = imprint.observances[one.observance]
        write(f"{one.year}-{one.month:02d}/{one.key}", "observance", {
            "one": one,
            "name": imprint.say(observance.name),
            "about": imprint.say(observance.about) if observance.about else "",
            "month": edition.month_of[one.year, one.month],
            "address": imprint.page(f"observances/{one.observance}/"),
        })
    return files
