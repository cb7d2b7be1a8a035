"""Templates to pages: one environment for a language, strict about names and about markup."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field, fields
from datetime import datetime
from pathlib import Path
from traceback import extract_tb
from typing import Any

from jinja2 import (
    BaseLoader,
    BytecodeCache,
    ChoiceLoader,
    Environment,
    FileSystemLoader,
    PrefixLoader,
    StrictUndefined,
    TemplateNotFound,
    TemplateSyntaxError,
    pass_context,
    pass_eval_context,
)
from jinja2.bccache import Bucket
from jinja2.nodes import EvalContext
from markupsafe import Markup, escape

from moonwrit.content.models import Observance, Region, Site, in_language
from moonwrit.content.own import Own
from moonwrit.errors import ContentError
from moonwrit.publish import labels, words
from moonwrit.publish.edition import Imprint, evening_path, fasting_path, month_path, tree
from moonwrit.publish.language import Language
from moonwrit.publish.pictures import reach
from moonwrit.publish.sandbox import Sandbox
from moonwrit.resources import themes_folder

THEME = "moonwrit"


@dataclass(frozen=True, slots=True)
class Frame:
    """What every page of a calendar is given. ``calendars``: folder and name; ``languages``: code, tree and language;
    ``own_pages``: path, title and language; ``next_fasting``: of ``fasting_years`` the present or next."""

    imprint: Imprint
    base: str
    feeds: str
    region: Region
    observances: Mapping[str, Observance]
    calendars: tuple[tuple[str, str], ...]
    languages: tuple[tuple[str, str, Language], ...]
    civil_years: range
    years: range
    own_pages: tuple[tuple[str, str, str], ...]
    has_notices: bool
    has_others: bool
    fasting_years: tuple[int, ...]
    next_fasting: int | None


class Later:
    """A value of a page that is made when the page is: ``make`` with what it is given."""

    def __init__(self, make: Callable[..., object], *given: object) -> None:
        self._make, self._given = make, given

    @property
    def digested(self) -> object:
        return self._make, self._given

    def make(self) -> object:
        return self._make(*self._given)


@dataclass(frozen=True, slots=True)
class Page:
    """One page: its path in the tree of its language, its template, its title, and what the template is given."""

    path: str
    template: str
    title: str
    frame: Frame | None = None
    given: Mapping[str, object] = field(default_factory=dict)
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


class _Compiled(BytecodeCache):
    """Templates compiled once in a process, for the environments of all languages."""

    def __init__(self) -> None:
        self.held: dict[str, bytes] = {}

    def load_bytecode(self, bucket: Bucket) -> None:
        if bucket.key in self.held:
            bucket.bytecode_from_string(self.held[bucket.key])

    def dump_bytecode(self, bucket: Bucket) -> None:
        self.held[bucket.key] = bucket.bytecode_to_string()


_COMPILED, _CONFINED = _Compiled(), _Compiled()
"""Outside and inside the sandbox."""


class Renderer:
    """Renders pages of one language.

    ``url`` in templates makes a link relative, so that a site works in any folder: to a path in the language's tree;
    ``top`` to a path from the top of the site.
    """

    def __init__(self, site: Site, language: Language, own: Own | None = None) -> None:
        # Pages and notices are given to their own pages, not to all.
        own = Own(own.look, own.logo, theme=own.theme) if own else Own()
        self._of = (site, language, own)
        self.up = "../" if tree(site, language.code) else ""
        self.theme = own.theme
        self.environment: Environment = (Environment if own.theme is None else Sandbox)(
            loader=_loader(own.theme),
            autoescape=lambda name: name is None or name.endswith((".html", ".xml")),
            undefined=StrictUndefined,
            trim_blocks=True,
            lstrip_blocks=True,
            keep_trailing_newline=True,
            # Whole numbers that are shown are written in the language's digits; with the context, so that none is
            # written while a template is compiled, which is done once for all languages.
            finalize=pass_context(lambda _, value: (
                language.digits(value) if isinstance(value, int) and not isinstance(value, bool) else value
            )),
            bytecode_cache=_COMPILED if own.theme is None else _CONFINED,
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
            month_path=month_path, evening_path=evening_path, fasting_path=fasting_path, reach=reach,
            own=own, logo_alt=_logo_alt(own, site, language),
        )

    @property
    def digested(self) -> object:
        return self._of

    def text(self, template: str, given: Mapping[str, object]) -> bytes:
        """A plain text, not escaped."""
        return self._made(template, given)

    def sitemap(self, folders: Sequence[str]) -> bytes:
        """``sitemap.xml`` (sitemaps.org 0.9), each page with its other languages."""
        return self._made("sitemap.xml", {"folders": folders})

    def render(self, page: Page) -> bytes:
        frame = page.frame
        return self._made(f"pages/{page.template}.html", {
            **({one.name: getattr(frame, one.name) for one in fields(frame)} if frame else {}),
            **{name: value.make() if isinstance(value, Later) else value for name, value in page.given.items()},
            "page": page,
            "url": lambda path: (page.root + path) or "./",
            "top": lambda path: (page.root + self.up + path) or "./",
        })

    def check(self) -> None:
        """Read every template of the community's own. Raises ContentError."""
        for file in sorted(self.theme.rglob("*") if self.theme else ()):
            if file.is_file() and file.suffix in (".html", ".txt", ".xml", ".js") and not file.name.startswith("."):
                with self._faults():
                    self.environment.get_template(file.relative_to(self.theme or file).as_posix())

    def _made(self, template: str, given: Mapping[str, Any]) -> bytes:
        with self._faults():
            if isinstance(self.environment, Sandbox):
                self.environment.steps = 0
            return self.environment.get_template(template).render(**given).encode()

    @contextmanager
    def _faults(self) -> Iterator[None]:
        """What fails in a template of the community's own is theirs to mend, and one message with its line."""
        try:
            yield
        except Exception as fault:
            where = [(frame.filename, frame.lineno or 0) for frame in extract_tb(fault.__traceback__)]
            if isinstance(fault, TemplateSyntaxError):
                where.append((fault.filename or "", fault.lineno))
            own = [(file, line) for file, line in where if self.theme and Path(file).is_relative_to(self.theme)]
            if not own:
                raise
            said = " ".join(str(fault).split())[:200]
            if isinstance(fault, TemplateNotFound):
                said = f'there is no template "{fault.name}"'
            mend = "mend it, or remove the file to have the theme's own"
            raise ContentError(*own[-1], f"the template fails ({said or type(fault).__name__})", mend) from fault


def _logo_alt(own: Own, site: Site, language: Language) -> str:
    """Nothing where it would only repeat the community's name, which stands beside the logo."""
    if own.look.logo is None:
        return ""
    alt, name = (in_language(one, language.code, site.language) for one in (own.look.logo.alt, site.community))
    return "" if alt == name else alt


def _loader(own: Path | None) -> BaseLoader:
    """The community's own templates first. ``moonwrit/pages/home.html`` always names that of the theme."""
    theme = FileSystemLoader(themes_folder() / THEME)
    return theme if own is None else ChoiceLoader([FileSystemLoader(own), theme, PrefixLoader({THEME: theme})])


def _filled(context: EvalContext, message: str, values: Mapping[str, object]) -> str:
    """A message with its values; in a page both are text, and never taken for markup."""
    return (escape(message) if context.autoescape else message) % values


def stylesheet(own: Path | None = None) -> bytes:
    """``style.css`` of the site: that of pages, and that of what is drawn."""
    return _asset("style.css", own) + pictures_sheet(own)


def icon(own: Path | None = None) -> bytes:
    return _asset("icon.svg", own)


def pictures_sheet(own: Path | None = None) -> bytes:
    return _asset("pictures.css", own)


def _asset(name: str, own: Path | None) -> bytes:
    """A file of the theme as it is, or the community's own of that name."""
    theirs = own / name if own is not None else None
    return (theirs if theirs and theirs.is_file() else themes_folder() / THEME / name).read_bytes()


def svg(text: str) -> Markup:
    """A picture made by ``pictures``, whose texts are escaped there."""
    return Markup(text)
