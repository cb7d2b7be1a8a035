"""A community's own pages and notices: Markdown with a small set of placeholders, and nothing that runs.

``pages/<name>.md`` is a page, ``notices/<date>-<name>.md`` a notice; the same with ``.<language>.md`` in another
language. The first line is ``# Title``. Placeholders stand in braces:

    {community}  {authority}                    the names in site.yaml
    {date eid-al-fitr 1448}                     when an observance falls
    {month-start 9 1448}                        the first day of a lunar month
    {standing eid-al-fitr 1448}                 expected, settled or amended; of a month: {standing 9 1448}

A brace that is meant as one is written ``\\{``. HTML is shown as it is written and never obeyed. ``theme/`` may hold
templates that take the place of the theme's own: they write any markup, and are kept from all else
(``publish/sandbox.py``).
"""

from __future__ import annotations

import html
import re
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from datetime import date
from functools import cached_property
from pathlib import Path
from typing import Any
from urllib.parse import urljoin, urlsplit
from xml.etree.ElementTree import Element

from moonwrit.content.look import Logo, Look
from moonwrit.content.models import _IDENTIFIER, Observance, Site
from moonwrit.errors import ContentError, did_you_mean
from moonwrit.files import utf8
from moonwrit.resources import themes_folder

MAX_BYTES = 256 * 1024
MAX_EFFORT = 2_000_000_000
"""Markdown looks from each bracket, line and star to the end of its paragraph, and from each paragraph to the first:
the sum of the lengths of paragraphs, each times these signs as they weigh, and of what was before. A list of 300 links
without an empty line makes most of this; all of it takes some five seconds."""
_WEIGHTS = (("[", 200), ("\n", 20), *((sign, 1) for sign in "*_`\\&"))
MAX_DEPTH = 40
"""Of lists and quotations in one another, as elements."""
FIRST_YEAR, LAST_YEAR = 1900, 2199
"""Of notices."""
PLACEHOLDERS = ("authority", "community", "date", "month-start", "standing")
_FORMS = {
    "authority": "{authority}", "community": "{community}", "date": "{date eid-al-fitr 1448}",
    "month-start": "{month-start 9 1448}", "standing": "{standing eid-al-fitr 1448} or {standing 9 1448}",
}
_FOUND = re.compile(r"\\(?P<plain>[\\{}])|\{(?P<words>[^{}\n]*)\}|(?P<lone>\{)")
_REFUSED = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x9f\u2028-\u202e\u2066-\u2069\ue000-\uf8ff\ufeff\ufffe\uffff]")
# Marks that stand for what is put in, while Markdown is read; the text itself cannot hold them.
_MARK = re.compile("\ue000(\\d+)\ue001")
# A line that ends within a paragraph.
_WRAPPED = re.compile(r"\n(?!</?(?:p|h[2-6]|[uo]l|li|blockquote|pre|table|thead|tbody|tr|td|th|hr)\b)")
_SCHEMES = frozenset({"http", "https", "mailto", "webcal"})
_TAGS = frozenset({
    "a", "blockquote", "br", "code", "em", "h2", "h3", "h4", "h5", "h6", "hr", "li", "ol", "p", "pre", "strong",
    "table", "tbody", "td", "th", "thead", "tr", "ul",
})


@dataclass(frozen=True, slots=True)
class Placeholder:
    """What is asked for: ``of`` is the name of an observance or the number of a month, 0 where nothing is named."""

    kind: str
    of: str | int = 0
    year: int = 0


@dataclass(frozen=True)
class Written:
    """One text in one language, checked. ``parts`` are its plain pieces and placeholders, the title's first."""

    language: str
    title: tuple[str | Placeholder, ...]
    body: tuple[str | Placeholder, ...]

    @cached_property
    def asked(self) -> tuple[Placeholder, ...]:
        """Each date and standing that it names, once."""
        named = [part for part in (*self.title, *self.body) if isinstance(part, Placeholder) and part.year]
        return tuple(dict.fromkeys(named))

    def heading(self, value: Callable[[Placeholder], str]) -> str:
        """The title as plain text."""
        return "".join(value(part) if isinstance(part, Placeholder) else part for part in self.title)

    def html(self, value: Callable[[Placeholder], str], address: str = "") -> str:
        """The body as clean HTML; ``value`` gives the text of a placeholder. Links are made whole with ``address``."""
        return _clean(_filled(self.body, value), address)

    def text(self, value: Callable[[Placeholder], str]) -> str:
        """The body as plain text, a paragraph a line."""
        import nh3

        unwrapped = _WRAPPED.sub(" ", _filled(self.body, value))
        bare = html.unescape(nh3.clean(unwrapped, tags=set()))
        return "\n".join(line for line in (line.strip() for line in bare.splitlines()) if line)


@dataclass(frozen=True, slots=True)
class Own:
    """All that is a community's own beside its calendar.

    ``pages`` by name; ``notices`` by date and name, newest first; each has its texts by language. ``theme`` is the
    folder of its own templates.
    """

    look: Look = field(default_factory=Look)
    logo: Logo | None = None
    pages: Mapping[str, Mapping[str, Written]] = field(default_factory=dict)
    notices: Mapping[tuple[date, str], Mapping[str, Written]] = field(default_factory=dict)
    theme: Path | None = None


def in_tree(texts: Mapping[str, Written], language: str, site: Site) -> Written:
    """The text in a language of the site, or else in its default one."""
    return texts.get(language, texts[site.language])


def read_texts(
    folder: Path, site: Site, observances: Mapping[str, Observance], faults: list[ContentError]
) -> dict[str, dict[str, Written]]:
    """The Markdown files of ``folder``, by name and by language; what is wrong with them goes to ``faults``."""
    found: dict[str, dict[str, Written]] = {}
    files = sorted(folder.iterdir()) if folder.is_dir() and not _is_link(folder, faults) else []
    for file in (one for one in files if not one.name.startswith(".")):
        try:
            name, language = _named(file, site)
            if language in found.setdefault(name, {}):
                raise ContentError(file, 0, f"there are two files in {language}", "keep one of them")
            found[name][language] = _read(file, language, site, observances)
        except ContentError as fault:
            faults.append(fault)
    for name, texts in found.items():
        if site.language not in texts and not faults:
            faults.append(ContentError(folder / f"{name}.md", 0, "the file is missing",
                                       f"write it in the site's language, {site.language}, too"))
    return found


def dated(
    texts: Mapping[str, dict[str, Written]], folder: Path, faults: list[ContentError]
) -> dict[tuple[date, str], dict[str, Written]]:
    """Notices by the date with which their name begins, newest first."""
    found = {}
    for name, text in texts.items():
        try:
            on, rest = date.fromisoformat(name[:10]), name[10:]
            if not rest.startswith("-") or not FIRST_YEAR <= on.year <= LAST_YEAR:
                raise ValueError
        except ValueError:
            faults.append(ContentError(folder / f"{name}.md", 0, "the name does not begin with a date",
                                       "name it for instance 2026-11-20-hall-closed.md"))
        else:
            found[on, name] = text
    return dict(sorted(found.items(), reverse=True))


def theme_of(folder: Path, faults: list[ContentError]) -> Path | None:
    """The folder of a community's own templates, each of which has the name of one of the theme's."""
    own, theme = folder / "theme", themes_folder() / "moonwrit"
    if not own.is_dir() or _is_link(own, faults):
        return None
    known = [
        file.relative_to(theme).as_posix() for file in theme.rglob("*") if file.is_file() and "locale" not in file.parts
    ]
    for file in sorted(own.rglob("*")):
        name = file.relative_to(own).as_posix()
        if _is_link(file, faults) or not file.is_file() or file.name.startswith("."):
            continue
        # A part of one's own, for one's own templates to include, has a name of one's own.
        if not name.startswith("parts/") and name not in known:
            faults.append(ContentError(file, 0, "the theme has no template of this name", did_you_mean(name, known)))
        else:
            try:
                _text_of(file)
            except ContentError as fault:
                faults.append(fault)
    return own


def _is_link(file: Path, faults: list[ContentError]) -> bool:
    """What is linked to may lie outside the content, and would be published."""
    if file.is_symlink():
        faults.append(ContentError(file, 0, "this is a link to somewhere else", "put what it leads to there itself"))
        return True
    return False


def _text_of(file: Path) -> str:
    with file.open("rb") as stream:
        data = stream.read(MAX_BYTES + 1)
    if len(data) > MAX_BYTES:
        raise ContentError(file, 0, f"the text is larger than {MAX_BYTES // 1024} kB", "split or shorten it")
    return utf8(data, file)


def _named(file: Path, site: Site) -> tuple[str, str]:
    """The name and the language of a Markdown file, from what it is called."""
    name, _, language = file.name.removesuffix(".md").partition(".")
    if not file.is_file() or file.is_symlink() or not file.name.endswith(".md"):
        raise ContentError(file, 0, "this is not a Markdown file", "name it <name>.md, or keep it elsewhere")
    if not re.fullmatch(_IDENTIFIER, name):
        mend = "use small letters, digits and single hyphens"
        raise ContentError(file, 0, f'"{name}" cannot be the name of a page', mend)
    if language and language not in site.all_languages:
        what = f'"{language}" is no language of the site'
        raise ContentError(file, 0, what, did_you_mean(language, site.all_languages))
    return name, language or site.language


def _read(file: Path, language: str, site: Site, observances: Mapping[str, Observance]) -> Written:
    text = _text_of(file)

    def fault(at: int, what: str, mend: str) -> ContentError:
        return ContentError(file, text.count("\n", 0, at) + 1, what, mend)

    if refused := _REFUSED.search(text):
        raise fault(refused.start(), f"the character U+{ord(refused[0]):04X} is written here", "remove it")
    match = re.match(r"#[ \t]+(\S[^\n]*?)[ \t#]*(?:\n|$)", text)
    if match is None:
        raise fault(0, "the text does not begin with its title", "write the first line as # Title")
    title = tuple(_parts(text, match.start(1), match.end(1), fault, site, observances))
    body = tuple(_parts(text, match.end(), len(text), fault, site, observances))
    if not any(isinstance(part, Placeholder) or part.strip() for part in body):
        raise fault(0, "there is nothing below the title", "write the text, or remove the file")
    effort = 0
    for number, paragraph in enumerate(re.finditer(r"(?:.+\n?)+", text)):
        weight = sum(paragraph[0].count(sign) * times for sign, times in (_WEIGHTS))
        effort += len(paragraph[0]) * weight + 5 * number
        if effort > MAX_EFFORT:
            raise fault(paragraph.start(), "the paragraphs up to this one are too long or too many to be read",
                        "split the text, put empty lines into the long ones, or write fewer links")
    try:
        _filled(body, lambda _: "x", lambda said, what, mend: fault(max(text.find(said), 0), what, mend))
    except RecursionError:
        raise fault(0, *_TOO_DEEP) from None
    return Written(language, title, body)


def _parts(
    text: str, start: int, end: int, fault: Callable[[int, str, str], ContentError], site: Site,
    observances: Mapping[str, Observance],
) -> Iterator[str | Placeholder]:
    """Plain pieces and placeholders; a brace that was escaped is a piece of its own."""
    for match in _FOUND.finditer(text, start, end):
        yield text[start:match.start()]
        start = match.end()
        if match["plain"]:
            yield match[0] if match["plain"] == "\\" else match["plain"]
        elif match["lone"]:
            raise fault(match.start(), "this brace is never closed", r"write \{ for a brace that is meant as one")
        else:
            placeholder = _placeholder(match["words"], site, observances)
            if isinstance(placeholder, str):
                what, _, mend = placeholder.partition("; ")
                raise fault(match.start(), what, mend)
            yield placeholder
    yield text[start:end]


def _placeholder(words: str, site: Site, observances: Mapping[str, Observance]) -> Placeholder | str:
    """A placeholder, or what is wrong with it and how to mend it."""
    kind, *rest = words.split() or [""]
    escape = r"write \{ for a brace that is meant as one"
    words = words if len(words) <= 60 else f"{words[:56]}..."
    if kind not in PLACEHOLDERS:
        return f'"{{{words}}}" is no placeholder; {did_you_mean(kind, PLACEHOLDERS)}, or {escape}'
    if kind in ("authority", "community"):
        return Placeholder(kind) if not rest else f"{{{kind}}} stands alone; write {_FORMS[kind]}"
    if len(rest) != 2 or not re.fullmatch(r"[0-9]{1,4}", rest[1]):
        return f'"{{{words}}}" does not say of what and in which Hijri year; write {_FORMS[kind]}'
    of, year = rest[0], int(rest[1])
    if not site.years.first <= year <= site.years.last:
        return (f"{year} is none of the years published, {site.years.first} to {site.years.last}; "
                "correct it, or change the years in site.yaml")
    if kind != "date" and re.fullmatch(r"[0-9]{1,2}", of):
        return Placeholder(kind, int(of), year) if 1 <= int(of) <= 12 else f"there is no month {of}; write 1 to 12"
    if kind == "month-start":
        return f'"{of[:60]}" is no lunar month; write {_FORMS[kind]}'
    if of not in observances:
        return f'observance "{of[:60]}" is not defined; {did_you_mean(of, observances)}'
    when = observances[of].when
    if when.month == "every" or when.last_nights is not None:
        return f'"{of}" falls more than once a year; name an observance of one date'
    return Placeholder(kind, of, year)


def _filled(
    parts: tuple[str | Placeholder, ...], value: Callable[[Placeholder], str],
    fault: Callable[[str, str, str], ContentError] | None = None,
) -> str:
    """Markdown to HTML, with a new converter each time, and the values put in as text.

    Until then marks stand for them, so that no value is read as Markdown; a brace that was escaped is one too.
    """
    from markdown import Markdown
    from markdown.extensions import Extension
    from markdown.treeprocessors import Treeprocessor

    values: list[str] = []

    def marked(part: str | Placeholder) -> str:
        if isinstance(part, str) and part not in ("{", "}"):
            return part
        values.append(html.escape(part if isinstance(part, str) else value(part)))
        return f"\ue000{len(values) - 1}\ue001"

    class Looked(Treeprocessor):
        def run(self, root: Element) -> None:
            if fault is not None and _depth(root) > MAX_DEPTH:
                raise fault("", *_TOO_DEEP)
            for element in root.iter():
                if element.tag == "h1":  # the title is the one heading of its level
                    element.tag = "h2"
                if fault is not None:
                    _look_at(element, fault)

    class OneTitleNoHtml(Extension):
        def extendMarkdown(self, md: Markdown) -> None:  # noqa: N802
            md.preprocessors.deregister("html_block")
            md.inlinePatterns.deregister("html")
            md.treeprocessors.register(Looked(md), "looked", -1)

    made = Markdown(extensions=["tables", "fenced_code", "sane_lists", OneTitleNoHtml()], output_format="html")
    return _MARK.sub(lambda mark: values[int(mark[1])], made.convert("".join(map(marked, parts))))


_TOO_DEEP = ("lists or quotations are nested too deeply", f"nest {MAX_DEPTH // 2} of them at most")


def _depth(root: Element) -> int:
    level, depth = [root], 0
    while level := [below for element in level for below in element]:
        depth += 1
    return depth


def _look_at(element: Element, fault: Callable[[str, str, str], ContentError]) -> None:
    """Raise for a picture, and for a link to what is no page."""
    if element.tag == "img":
        raise fault("![", "a picture is put in here", "say it in words, or link to it: [words](address)")
    address = html.unescape(element.get("href", "").replace("\x02amp\x03", "&"))
    # Browsers drop spaces and control characters before they look for the scheme.
    bare = re.sub(r"[\x00-\x20]", "", address)
    scheme = re.match(r"([^/?#]*?):", bare)
    if scheme and scheme[1].lower() not in _SCHEMES:
        mend = f"link to another page, or by {', '.join(sorted(_SCHEMES))}"
        raise fault(element.get("href", ""), f'the link "{address[:60]}" is none that a page may hold', mend)


def _clean(text: str, address: str) -> str:
    """The second line of defence: whatever Markdown made of it, only these elements and links are left."""
    import nh3

    def whole(tag: str, name: str, value: str) -> str:
        return urljoin(address, value) if address and name == "href" and not urlsplit(value).scheme else value

    options: dict[str, Any] = {"attribute_filter": whole} if address else {}
    return nh3.clean(
        text, tags=set(_TAGS), attributes={"a": {"href", "title"}, "ol": {"start"}}, url_schemes=set(_SCHEMES),
        link_rel=None, **options,
    )


__all__ = ["PLACEHOLDERS", "Own", "Placeholder", "Written", "dated", "in_tree", "read_texts", "theme_of"]
