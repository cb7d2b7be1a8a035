"""The whole site: every page, picture and feed, built and put in place."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from urllib.parse import urlsplit

from moonwrit.almanac import Almanac
from moonwrit.content.models import in_language
from moonwrit.content.own import Own
from moonwrit.journal import Ledger, site_marker
from moonwrit.publish.basis import basis_feed
from moonwrit.publish.dates import next_feed, year_file
from moonwrit.publish.edition import Edition
from moonwrit.publish.embed import embed_files
from moonwrit.publish.icalendar import (
    evenings_feed,
    fasting_feed,
    months_feed,
    observances_feed,
    tag_feed,
    tags,
    year_feed,
)
from moonwrit.publish.jscalendar import calendar_feed
from moonwrit.publish.language import Language
from moonwrit.publish.maps import charts
from moonwrit.publish.messages import messages
from moonwrit.publish.notices import atom_feed, json_feed
from moonwrit.publish.own import look_sheet
from moonwrit.publish.pages import pages
from moonwrit.publish.render import Page, Renderer, icon, stylesheet
from moonwrit.publish.schemas import schema_files
from moonwrit.publish.sheets import SHEETS, Paper, sheet
from moonwrit.publish.writing import put_in_place


def site_files(
    almanacs: Sequence[Almanac], ledger: Ledger, paper: Paper | None = None, own: Own | None = None
) -> dict[str, bytes]:
    """The whole site, path -> content. The first almanac is the main calendar. ``paper``: with PDF sheets.

    ``own``: the community's look, pages, notices and templates. Raises ContentError where one of the last fails.
    """
    site, own = almanacs[0].site, own or Own()
    files = {"style.css": stylesheet(own.theme), "icon.svg": icon(own.theme), **schema_files()}
    if colours := look_sheet(own.look):
        files["look.css"] = colours
    if own.logo:
        files[own.logo.path] = own.logo.data
    listed: list[Page] = []
    drawn = [charts(almanac) for almanac in almanacs]
    for code in site.all_languages:
        names = {in_language(name, site.language): in_language(name, code, site.language) for name in almanacs[0].names}
        language = Language(code, names)
        renderer = Renderer(site, language, own)
        editions = [
            Edition(almanac, ledger, language, index == 0, own, drawn[index]) for index, almanac in enumerate(almanacs)
        ]
        for edition in editions:
            for made in pages(edition, editions):
                page = replace(made, has_sheet=paper is not None and made.template in SHEETS)
                files[edition.tree + page.path] = renderer.render(page)
                if paper is not None and page.has_sheet:
                    files[edition.tree + page.sheet] = sheet(edition.tree + page.path, files, paper)
                if edition.tree == "" and page.template != "missing":
                    listed.append(page)
            files.update(_feeds(edition, alone=len(editions) == 1))
            files.update(embed_files(edition, renderer))
        files.update(messages(editions[0], renderer))
    files["sitemap.xml"] = Renderer(site, Language(site.language), own).sitemap(listed)
    if urlsplit(site.address).path in ("", "/"):
        # Robots ask for it at the top of a host only (RFC 9309, 2.3).
        files["robots.txt"] = f"User-agent: *\nAllow: /\nSitemap: {site.address.rstrip('/')}/sitemap.xml\n".encode()
    return files


def _feeds(edition: Edition, *, alone: bool) -> dict[str, bytes]:
    """The feeds of an edition in their folder; those of the main calendar of several also in one of its own."""
    almanac = edition.almanac
    years = range(almanac.months[0].year, almanac.months[-1].year + 1)
    feeds = {
        "observances.ics": observances_feed(edition),
        "months.ics": months_feed(edition),
        "evenings.ics": evenings_feed(edition),
        **{f"fasting/{place}.ics": fasting_feed(edition, place) for place in almanac.places if almanac.fasting},
        **{f"tags/{tag}.ics": tag_feed(edition, tag) for tag in tags(edition)},
        **{f"years/{year}.ics": year_feed(edition, year) for year in years},
        **{f"years/{year}.json": year_file(edition, year) for year in years},
        "next.json": next_feed(edition),
        "calendar.json": calendar_feed(edition),
        "notices.atom": atom_feed(edition),
        "notices.json": json_feed(edition),
    }
    if not edition.tree:
        feeds["basis.json"] = basis_feed(almanac)
    folders = [edition.feeds]
    if edition.is_main and not alone:
        folders.append(f"feeds/{almanac.calendar_id}/")
    return {edition.tree + folder + name: content for folder in folders for name, content in feeds.items()}


def publish(
    almanacs: Sequence[Almanac], ledger: Ledger, output: Path, paper: Paper | None = None, own: Own | None = None
) -> int:
    """Build the site and put it in place; returns the number of its files."""
    files = site_files(almanacs, ledger, paper, own)
    put_in_place(files, output, site_marker(ledger, almanacs[0].site.address))
    return len(files)


__all__ = ["publish", "site_files"]
