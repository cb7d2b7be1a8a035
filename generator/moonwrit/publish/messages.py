"""Short plain texts ready to send: for every decision and every main observance, in two lengths."""

from __future__ import annotations

from moonwrit.publish.edition import Edition
from moonwrit.publish.pages import month_path
from moonwrit.publish.render import Renderer


def messages(edition: Edition, renderer: Renderer) -> dict[str, bytes]:
    """``messages/<year>-<month>/<language>.txt`` for a text message and ``...-email.txt`` for a letter; those of
    observances in a folder of their own below the month. Paths are from the top of the site."""
    files = {}

    def write(folder: str, kind: str, given: dict[str, object]) -> None:
        for length, ending in (("short", ""), ("email", "-email")):
            text = renderer.text(f"messages/{kind}-{length}.txt", given)
            files[f"messages/{folder}/{edition.language.code}{ending}.txt"] = text

    for month in edition.almanac.months:
        if month.decision is not None:
            write(f"{month.year}-{month.month:02d}", "month",
                  {"month": month, "address": edition.page(month_path(month))})
    for one in edition.almanac.occurrences:
        if "main" not in one.tags:
            continue
        observance = edition.almanac.observances[one.observance]
        write(f"{one.year}-{one.month:02d}/{one.key}", "observance", {
            "one": one,
            "name": edition.say(observance.name),
            "about": edition.say(observance.about) if observance.about else "",
            "month": edition.month_of[one.year, one.month],
            "address": edition.page(f"observances/{one.observance}/"),
        })
    return files
