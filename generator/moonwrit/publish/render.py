"""Templates to pages: one environment for a language, strict about names and about markup."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from functools import cache
from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined, pass_eval_context
from jinja2.nodes import EvalContext
from markupsafe import Markup, escape

from moonwrit.content.models import Site, in_language
from moonwrit.publish import labels, words
from moonwrit.publish.edition import tree
from moonwrit.publish.language import Language
from moonwrit.resources import themes_folder

THEME = "moonwrit"


@dataclass(frozen=True, slots=True)
class Page:
    """One page: its path in the tree of its language, its template, its title, and what the template is given."""

    path: str
    template: str
    title: str
    given: dict[str, Any] = field(default_factory=dict)
    has_sheet: bool = False

    @property
    def folder(self) -> str:
        """The path as it is linked to: a folder's own page is its folder."""
        return self.path.removesuffix("index.html")

    @property
    def sheet(self) -> str:
        """The path of its PDF sheet."""
        return self.folder + "sheet.pdf"

    @property
    def root(self) -> str:
        """From the page to the top of its language's tree."""
        return "../" * self.path.count("/")


class Renderer:
    """Renders pages of one language.

    ``url`` in templates makes a link relative, so that a site works in any folder: to a path in the language's tree;
    ``top`` to a path from the top of the site.
    """

    def __init__(self, site: Site, language: Language) -> None:
        self.up = "../" if tree(site, language.code) else ""
        self.environment = Environment(
            loader=FileSystemLoader(themes_folder() / THEME),
            autoescape=lambda name: name is None or name.endswith((".html", ".xml")),
            undefined=StrictUndefined,
            trim_blocks=True,
            lstrip_blocks=True,
            keep_trailing_newline=True,
            # Whole numbers that are shown are written in the language's digits.
            finalize=lambda value: (
                language.digits(value) if isinstance(value, int) and not isinstance(value, bool) else value
            ),
        )
        self.environment.filters["zip"] = zip
        self.environment.globals.update(
            _=pass_eval_context(
                lambda context, message, **values: _filled(context, language.gettext(message), language.values(values))
            ),
            ngettext=pass_eval_context(lambda context, one, many, number, **values: _filled(
                context, language.ngettext(one, many, number), language.values({"n": number, **values})
            )),
            site=site, L=language, words=words, labels=labels,
            tree=lambda code: tree(site, code), address=site.address.rstrip("/") + "/",
            say=lambda text: in_language(text, language.code, site.language),
            community=in_language(site.community, language.code, site.language),
            authority=in_language(site.authority, language.code, site.language),
            words_eyes=language.gettext(words.EYES),
            clock=lambda iso, zone: language.clock(datetime.fromisoformat(iso).astimezone(zone)),
            outcomes=labels.OUTCOMES,
            aids=labels.AIDS,
        )

    def text(self, template: str, given: dict[str, Any]) -> bytes:
        """A plain text, not escaped."""
        return self.environment.get_template(template).render(**given).encode()

    def sitemap(self, pages: Sequence[Page]) -> bytes:
        """``sitemap.xml`` (sitemaps.org 0.9), each page with its other languages."""
        return self.environment.get_template("sitemap.xml").render(pages=pages).encode()

    def render(self, page: Page) -> bytes:
        template = self.environment.get_template(f"pages/{page.template}.html")
        text = template.render(
            page=page,
            url=lambda path: (page.root + path) or "./",
            top=lambda path: (page.root + self.up + path) or "./",
            **page.given,
        )
        return text.encode()


def _filled(context: EvalContext, message: str, values: Mapping[str, object]) -> str:
    """A message with its values; in a page both are text, and never taken for markup."""
    return (escape(message) if context.autoescape else message) % values


@cache
def stylesheet() -> bytes:
    """``style.css`` of the site: that of pages, and that of what is drawn."""
    return (themes_folder() / THEME / "style.css").read_bytes() + pictures_sheet()


@cache
def icon() -> bytes:
    return (themes_folder() / THEME / "icon.svg").read_bytes()


@cache
def pictures_sheet() -> bytes:
    return (themes_folder() / THEME / "pictures.css").read_bytes()


def svg(text: str) -> Markup:
    """A picture made by ``pictures``, whose texts are escaped there."""
    return Markup(text)
