"""The whole site: every page, picture and feed, put together from pieces and put in place."""

from __future__ import annotations

import gc
from collections import ChainMap
from collections.abc import Container, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import replace
from functools import partial
from pathlib import Path
from urllib.parse import urlsplit

from moonwrit.almanac import Almanac
from moonwrit.content.models import Site, in_language
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
from moonwrit.publish.maps import Charts
from moonwrit.publish.messages import messages
from moonwrit.publish.notices import atom_feed, json_feed
from moonwrit.publish.own import look_sheet
from moonwrit.publish.pages import pages
from moonwrit.publish.pieces import Before, Files, Parts, Piece, Pieces, joined, made, plain
from moonwrit.publish.render import Renderer, icon, stylesheet
from moonwrit.publish.schemas import schema_files
from moonwrit.publish.sheets import SHEETS, Paper, sheet
from moonwrit.publish.writing import ChangedMeanwhileError, put_in_place


def publish(
    almanacs: Sequence[Almanac], ledger: Ledger, output: Path, paper: Paper | None = None, own: Own | None = None,
    processes: int = 1,
) -> int:
    """Build the site and put it in place; returns the number of its files. The first almanac is the main calendar.

    ``paper``: with PDF sheets. ``own``: the community's look, pages, notices and templates; raises ContentError where
    one of the last fails. What did not change stays as it stands at ``output``.
    """
    own, marker = own or Own(), site_marker(ledger, almanacs[0].site.address)
    with _no_collection():
        files, sheets = _parts(almanacs, ledger, paper, own)

    def put(before: Before) -> int:
        kept = before.kept(files)
        found = made(_without(kept, files), before, processes)
        contents = joined(_without(kept, files), found)
        printed = {}
        if paper is not None:
            printed = _printed(files, sheets, paper, ChainMap(contents, before))  # type: ignore[arg-type]
            kept |= before.kept(printed)
            drawn = made(_without(kept, printed), before, processes)
            contents = {**contents, **joined(_without(kept, printed), drawn)}
            found |= drawn
        stamps = put_in_place(contents, output, marker, kept)
        before.note(output, {**files, **printed}, found, stamps)
        return len(stamps)

    try:
        return put(Before(output, own.theme))
    except ChangedMeanwhileError:
        return put(Before(None, own.theme))


@contextmanager
def _no_collection() -> Iterator[None]:
    """Many small values are made that all stay: to look among them again and again for what may go takes a third of the
    time."""
    was = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was:
            gc.enable()


def _without(kept: Container[str], files: Files) -> Files:
    return {path: parts for path, parts in files.items() if path not in kept}


def _parts(
    almanacs: Sequence[Almanac], ledger: Ledger, paper: Paper | None, own: Own
) -> tuple[dict[str, Parts], dict[str, str]]:
    """Path -> parts of everything but sheets; and path of a sheet -> path of its page."""
    site, pieces = almanacs[0].site, Pieces()
    files: dict[str, Parts] = {path: (plain(content),) for path, content in _fixed(own, site).items()}
    sheets: dict[str, str] = {}
    charts = [Charts(almanac) for almanac in almanacs]
    found: list[tuple[str, str, Parts]] = []
    listed: list[str] = []
    for code in site.all_languages:
        names = {in_language(name, site.language): in_language(name, code, site.language) for name in almanacs[0].names}
        language = Language(code, names)
        renderer = Renderer(site, language, own)
        editions = [
            Edition(almanac, ledger, language, index == 0, own, charts[index], pieces)
            for index, almanac in enumerate(almanacs)
        ]
        for edition in editions:
            tree = edition.imprint.tree
            for page in pages(edition, editions):
                if paper is not None and page.template in SHEETS:
                    page = replace(page, has_sheet=True)
                    sheets[tree + page.sheet] = tree + page.path
                found.append((page.path, tree, (edition.piece(Renderer.render, renderer, page),)))
                if tree == "" and page.template != "missing":
                    listed.append(page.folder)
            found += [(path, tree, parts) for path, parts in _feeds(edition, alone=len(editions) == 1).items()]
            files.update(embed_files(edition, renderer))
        files.update(messages(editions[0], renderer))
    files["sitemap.xml"] = (pieces.of(Renderer.sitemap, Renderer(site, Language(site.language), own), listed),)
    # A page beside the same page in other languages, with which it shares its maps.
    files.update((tree + path, parts) for path, tree, parts in sorted(found, key=lambda one: one[:2]))
    return files, sheets


def _printed(
    files: Files, sheets: Mapping[str, str], paper: Paper, contents: Mapping[str, bytes]
) -> dict[str, Parts]:
    """The PDF sheets, drawn from the pages and from what those refer to."""
    pieces = Pieces()
    styles = [piece.key for path in ("style.css", "look.css") for piece in files.get(path, ())]
    return {
        path: (Piece(
            pieces.of(sheet, page, paper, styles, files[page][0].key).key, partial(sheet, page, contents, paper),
        ),)
        for path, page in sheets.items()
    }


def _fixed(own: Own, site: Site) -> dict[str, bytes]:
    """What hangs on no date."""
    files = {"style.css": stylesheet(own.theme), "icon.svg": icon(own.theme), **schema_files()}
    if colours := look_sheet(own.look):
        files["look.css"] = colours
    if own.logo:
        files[own.logo.path] = own.logo.data
    if urlsplit(site.address).path in ("", "/"):
        # Robots ask for it at the top of a host only (RFC 9309, 2.3).
        files["robots.txt"] = f"User-agent: *\nAllow: /\nSitemap: {site.address.rstrip('/')}/sitemap.xml\n".encode()
    return files


def _feeds(edition: Edition, *, alone: bool) -> dict[str, Parts]:
    """The feeds of an edition in their folder; those of the main calendar of several also in one of its own."""
    almanac, imprint = edition.almanac, edition.imprint
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
    if not imprint.tree:
        basis = edition.piece(basis_feed, almanac.site, almanac.calendar_id, almanac.method, almanac.months)
        feeds["basis.json"] = (basis,)
    folders = [imprint.feeds]
    if edition.is_main and not alone:
        folders.append(f"feeds/{almanac.calendar_id}/")
    return {folder + name: parts for folder in folders for name, parts in feeds.items()}


__all__ = ["publish"]
