"""Short plain texts ready to send: for every decision and every main observance, in two lengths."""

from __future__ import annotations

from moonwrit.almanac import Almanac
from moonwrit.content.models import in_language
from moonwrit.publish.icalendar import page
from moonwrit.publish.language import Language
from moonwrit.publish.pages import month_path
from moonwrit.publish.render import Renderer


def messages(almanac: Almanac, renderer: Renderer, language: Language) -> dict[str, bytes]:
    """``messages/<year>-<month>/<language>.txt`` for a text message and ``...-email.txt`` for a letter; those of
    observances in a folder of their own below the month."""
    files = {}
    months = {(month.year, month.month): month for month in almanac.months}

    def write(folder: str, kind: str, given: dict[str, object]) -> None:
        for length, ending in (("short", ""), ("email", "-email")):
            text = renderer.text(f"messages/{kind}-{length}.txt", given)
            files[f"messages/{folder}/{language.code}{ending}.txt"] = text

    for month in almanac.months:
        if month.decision is not None:
            write(f"{month.year}-{month.month:02d}", "month",
                  {"month": month, "address": page(almanac, month_path(month))})
    for one in almanac.occurrences:
        if "main" not in one.tags:
            continue
        observance = almanac.observances[one.observance]
        own = almanac.site.language
        write(f"{one.year}-{one.month:02d}/{one.key}", "observance", {
            "one": one,
            "name": in_language(observance.name, language.code, own),
            "about": in_language(observance.about, language.code, own) if observance.about else "",
            "month": months[one.year, one.month],
            "address": page(almanac, f"observances/{one.observance}/"),
        })
    return files
