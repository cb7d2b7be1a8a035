"""The whole site: every page, picture and feed, built and put in place."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from moonwrit.almanac import Almanac
from moonwrit.journal import Ledger, site_marker
from moonwrit.publish.basis import basis_feed, basis_schema
from moonwrit.publish.icalendar import evenings_feed, months_feed, observances_feed
from moonwrit.publish.jscalendar import calendar_feed
from moonwrit.publish.language import Language
from moonwrit.publish.messages import messages
from moonwrit.publish.notices import atom_feed, json_feed
from moonwrit.publish.pages import pages
from moonwrit.publish.render import Renderer, stylesheet
from moonwrit.publish.writing import put_in_place


def site_files(almanacs: Sequence[Almanac], ledger: Ledger) -> dict[str, bytes]:
    """The whole site, path -> content. The first almanac is the main calendar."""
    language = Language(almanacs[0].site.language)
    files = {"style.css": stylesheet(), "feeds/schema/basis.schema.json": basis_schema()}
    renderer = Renderer(almanacs[0].site, language)
    for index, almanac in enumerate(almanacs):
        base = "" if index == 0 else f"{almanac.calendar_id}/"
        for page in pages(almanac, ledger, language, base, almanacs):
            files[page.path] = renderer.render(page)
        feeds = {
            "observances.ics": observances_feed(almanac, ledger, language),
            "months.ics": months_feed(almanac, ledger, language),
            "evenings.ics": evenings_feed(almanac, ledger, language),
            "calendar.json": calendar_feed(almanac, ledger, language),
            "basis.json": basis_feed(almanac),
            "notices.atom": atom_feed(almanac, ledger, language),
            "notices.json": json_feed(almanac, ledger, language),
        }
        if index == 0:
            files.update(messages(almanac, renderer, language))
        folders = [f"feeds/{almanac.calendar_id}/"] if len(almanacs) > 1 else []
        for folder in (["feeds/"] if index == 0 else []) + folders:
            files.update({folder + name: content for name, content in feeds.items()})
    return files


def publish(almanacs: Sequence[Almanac], ledger: Ledger, output: Path) -> int:
    """Build the site and put it in place; returns the number of its files."""
    files = site_files(almanacs, ledger)
    put_in_place(files, output, site_marker(ledger, almanacs[0].site.address))
    return len(files)


__all__ = ["publish", "site_files"]
