"""Templates to pages: one environment for a language, strict about names and about markup."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import datetime
from functools import cache
from pathlib import PurePosixPath
from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined
from markupsafe import Markup

from moonwrit.content.models import Site, in_language
from moonwrit.publish import labels, words
from moonwrit.publish.language import Language
from moonwrit.resources import themes_folder

THEME = "moonwrit"


@dataclass(frozen=True, slots=True)
class Page:
    """One page: its path in the site, its template, its title, and what the template is given."""

    path: str
    template: str
    title: str
    given: dict[str, Any] = field(default_factory=dict)

    @property
    def root(self) -> str:
        """From the page to the top of the site."""
        return "../" * (len(PurePosixPath(self.path).parts) - 1)


class Renderer:
    """Renders pages of one language. ``url`` in templates makes a link relative, so that a site works in any folder."""

    def __init__(self, site: Site, language: Language) -> None:
        self.environment = Environment(
            loader=FileSystemLoader(themes_folder() / THEME),
            autoescape=lambda name: name is None or not name.endswith(".txt"),
            undefined=StrictUndefined,
            trim_blocks=True,
            lstrip_blocks=True,
            keep_trailing_newline=True,
            extensions=["jinja2.ext.i18n"],
        )
        self.environment.install_gettext_callables(  # type: ignore[attr-defined]
            language.gettext, language.ngettext, newstyle=True
        )
        self.environment.globals.update(
            site=site, L=language, words=words, labels=labels,
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

    def render(self, page: Page) -> bytes:
        template = self.environment.get_template(f"pages/{page.template}.html")
        text = template.render(
            page=page,
            url=lambda path: (page.root + path) or "./",
            **page.given,
        )
        return text.encode()


@cache
def stylesheet() -> bytes:
    return (themes_folder() / THEME / "style.css").read_bytes()


def svg(text: str) -> Markup:
    """A picture made by ``pictures``, whose texts are escaped there."""
    return Markup(text)
