"""Look, logo, Markdown pages and notices, own templates: what is taken, and what is refused with file and line."""

from __future__ import annotations

import re
import shutil
import struct
import zlib
from collections.abc import Callable
from datetime import date
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moonwrit.content import Content, load
from moonwrit.content.look import DARK, ENOUGH, LIGHT, contrast
from moonwrit.content.own import PLACEHOLDERS, Placeholder
from moonwrit.errors import ContentError

ROOT = Path(__file__).resolve().parents[2]
LOOK_JS = ROOT / "tests/publish/look.js"
EXAMPLE = load(ROOT / "content")
_HEX = st.integers(0, 0xFFFFFF).map("#{:06x}".format)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """The demonstration without anything of its own."""
    shutil.copytree(ROOT / "content", tmp_path / "content", ignore=shutil.ignore_patterns("record"))
    for name in ("pages", "notices"):
        shutil.rmtree(tmp_path / "content" / name)
    (tmp_path / "content/look.yaml").unlink()
    return tmp_path / "content"


def write(file: Path, text: str | bytes) -> Path:
    file.parent.mkdir(parents=True, exist_ok=True)
    file.write_bytes(text if isinstance(text, bytes) else text.encode())
    return file


def refused(folder: Path) -> str:
    """The one message with which the folder is refused, its files named from within."""
    with pytest.raises(ContentError) as caught:
        load(folder)
    return str(caught.value).replace(f"{folder}/", "")


def page(folder: Path, text: str) -> Content:
    write(folder / "pages/about.md", text)
    return load(folder)


def html(folder: Path, body: str, value: Callable[[Placeholder], str] = lambda _: "VALUE") -> str:
    return page(folder, f"# Title\n{body}").own.pages["about"]["en"].html(value)


# --- colours ----------------------------------------------------------------------------------------


def test_a_community_may_have_nothing_of_its_own(folder: Path) -> None:
    """Expected: no look, no pages, no notices and no templates are no fault, and neither is an empty file."""
    write(folder / "look.yaml", "# nothing yet\n")
    own = load(folder).own
    assert (own.look.has_colours, own.logo, own.pages, own.notices, own.theme) == (False, None, {}, {}, None)


def test_contrast_is_that_of_wcag() -> None:
    """Expected: the ratios commonly printed for these pairs (21, 1, and the greys either side of 4.5 on white; common
    practice, no source kept), and each pair the same both ways."""
    for one, other, ratio in (("#000", "#fff", 21), ("#abc", "#aabbcc", 1), ("#767676", "#fff", 4.54),
                              ("#777777", "#ffffff", 4.48), ("#ff0000", "#ffffff", 4.00)):
        assert round(contrast(one, other), 2) == ratio
        assert contrast(one, other) == contrast(other, one)


def test_the_theme_has_the_colours_that_are_checked() -> None:
    """Expected: style.css gives these colours under its own names, light first, then dark, and all of them pass."""
    css = (ROOT / "themes/moonwrit/style.css").read_text(encoding="utf-8")
    light, dark = css[: css.index("@media")], css[css.index("@media") : css.index("* {")]
    for part, colours in ((light, LIGHT), (dark, DARK)):
        for name, colour in colours.items():
            assert f"--{ {'link': 'sea', 'mark': 'clay'}.get(name, name) }: {colour};" in part
        for name in ("ink", "soft", "link", "mark"):
            assert min(contrast(colours[name], colours[behind]) for behind in ("paper", "sheet")) >= ENOUGH


def test_a_faint_colour_is_refused_with_its_ratio_and_one_that_passes(folder: Path) -> None:
    """Expected: file, line, the ratio rounded down, and a colour that is taken when written instead."""
    write(folder / "look.yaml", "colours:\n  link: '#77aabb'\n")
    said = refused(folder)
    ratio = int(contrast("#77aabb", LIGHT["paper"]) * 100) / 100
    assert said.startswith(f"look.yaml:2: link #77aabb on paper #fbf9f4 has a contrast of {ratio}, and text needs 4.5;")
    passing = said.split('"')[1]
    write(folder / "look.yaml", f"colours:\n  link: '{passing}'\n")
    assert load(folder).own.look.colours.link == passing


def test_a_faint_colour_for_dark_pages_and_a_background_are_refused_too(folder: Path) -> None:
    """Expected: the line of the colour that the community chose, even where it is the one behind the text."""
    write(folder / "look.yaml", "colours:\n  link: '#14506e'\n  dark:\n    mark: '#552200'\n")
    assert refused(folder).startswith("look.yaml:4: mark #552200 on paper #12171d has a contrast of 1.")
    write(folder / "look.yaml", "colours:\n  paper: '#999999'\n")
    said = refused(folder)
    assert said.startswith("look.yaml:2: soft #555e69 on paper #999999 has a contrast of 2.")
    passing = said.split('paper would pass as "')[1].split('"')[0]
    write(folder / "look.yaml", f"colours:\n  paper: '{passing}'\n")
    assert load(folder).own.look.colours.paper == passing


def test_backgrounds_that_nothing_stands_apart_from_are_said_to_be_so(folder: Path) -> None:
    """Expected: where one is black and the other white no text passes, and the message says what to change."""
    write(folder / "look.yaml", "colours:\n  paper: '#000'\n  sheet: '#fff'\n  ink: '#888'\n")
    assert "no paper would pass: keep paper and sheet both light or both dark" in refused(folder)
    write(folder / "look.yaml", "colours:\n  ink: '#888'\n  sheet: '#000'\n")
    assert "no ink would pass: keep paper and sheet both light or both dark" in refused(folder)


@settings(deadline=None)
@given(_HEX)
def test_what_is_said_to_pass_passes(colour: str) -> None:
    """Expected: for any colour of links, either it is taken, or the one named is."""
    from moonwrit.content import yaml
    from moonwrit.content.look import Colours, LightColours, too_faint

    def faults(link: str) -> list[ContentError]:
        document = yaml.parse(f"colours: {{link: '{link}'}}".encode(), Path("look.yaml"))
        return list(too_faint(document, LightColours(link=link, dark=Colours())))

    for fault in faults(colour):
        assert faults(fault.mend.split('"')[1]) == []


@pytest.mark.judge("axe")
def test_axe_draws_the_line_where_this_does(folder: Path, tmp_path: Path, node: Callable[..., Any],
                                            chromium: str) -> None:
    """Expected: axe-core finds the contrast of refused colours too low, and that of those named instead high enough."""
    rows = {"refused": "", "named": ""}
    for number, colour in enumerate(("#77aabb", "#ff0000", "#8a8a8a", "#3f7f3f", "#00a0e0")):
        write(folder / "look.yaml", f"colours:\n  link: '{colour}'\n")
        for kind, link in (("refused", colour), ("named", refused(folder).split('"')[1])):
            # Each is refused for what is behind it in one of the two places.
            worst = min(("paper", "sheet"), key=lambda behind: contrast(link, LIGHT[behind]))
            rows[kind] += f'<p id="row{number}" style="background:{LIGHT[worst]};color:{link}">some words</p>'
    for kind, text in rows.items():
        head = '<!doctype html><html lang="en"><title>T</title><main><h1 style="color:#000;background:#fff">T</h1>'
        write(tmp_path / f"site/{kind}.html", head + text + "</main>")
    found = node(LOOK_JS, chromium, tmp_path / "site", "refused.html", "named.html")
    assert len(found) == 8
    for look in found:
        low = " ".join(one for one in look["violations"] if one.startswith("color-contrast:"))
        assert [f"#row{number} " in low for number in range(5)] == [look["page"] == "refused.html"] * 5, look


@pytest.mark.parametrize("colour", [
    "red", "#12345", "#1234567", "14506e", "#fff;} body{display:none", "url(https://evil.example/)", "var(--ink)",
    "#ggg", "#fff\n", "#FFF /*",
])
def test_a_colour_is_six_digits_and_nothing_else(folder: Path, colour: str) -> None:
    """Expected: whatever could end the declaration, or is no colour, is refused at its line."""
    escaped = colour.replace("\n", "\\n")
    write(folder / "look.yaml", f'colours:\n  link: "{escaped}"\n')
    assert refused(folder).startswith("look.yaml:2: link is ")


# --- logo -------------------------------------------------------------------------------------------


def _png(width: int, height: int) -> bytes:
    def chunk(kind: bytes, data: bytes) -> bytes:
        return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))

    rows = (b"\x00" + b"\x00" * width) * height if width * height < 10_000 else b""
    return (b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", struct.pack(">IIBBBBB", width, height, 8, 0, 0, 0, 0))
            + chunk(b"IDAT", zlib.compress(rows)) + chunk(b"IEND", b""))


def with_logo(folder: Path, data: str | bytes, name: str = "ours.svg") -> Path:
    write(folder / name, data)
    write(folder / "look.yaml", f"logo:\n  file: {name}\n  alt: A boat\n")
    return folder


def test_a_logo_is_read_with_its_size(folder: Path) -> None:
    """Expected: the size of an SVG's viewBox or a PNG's header; in the masthead it keeps its shape and its bounds."""
    logo = load(with_logo(folder, '<svg xmlns="http://www.w3.org/2000/svg" viewBox="-2 0 120.5 40"/>')).own.logo
    assert logo is not None
    assert (logo.path, logo.width, logo.height, logo.shown_width, logo.shown_height) == ("logo.svg", 120.5, 40, 120, 40)
    logo = load(with_logo(folder, _png(100, 10), "ours.png")).own.logo
    assert logo is not None
    assert (logo.path, logo.width, logo.height, logo.shown_width, logo.shown_height) == ("logo.png", 100, 10, 192, 19)


def _svg(inside: str = "", attributes: str = "") -> str:
    return f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 9 9" {attributes}>\n{inside}\n</svg>'


@pytest.mark.parametrize("svg", [
    _svg("<script>alert(1)</script>"),
    _svg('<rect onclick="alert(1)"/>'),
    _svg(attributes='onload="alert(1)"'),
    _svg('<a href="javascript:alert(1)"><rect/></a>'),
    _svg('<foreignObject><body xmlns="http://www.w3.org/1999/xhtml"/></foreignObject>'),
    _svg('<image href="https://evil.example/x.png"/>'),
    _svg('<use href="https://evil.example/x.svg#a"/>'),
    _svg('<use xlink:href="data:image/svg+xml,x"/>', 'xmlns:xlink="http://www.w3.org/1999/xlink"'),
    _svg('<rect fill="url(https://evil.example/x)"/>'),
    _svg('<rect style="background:url( \'//evil.example/x\')"/>'),
    _svg(r'<rect style="fill:u\72l(https://evil.example/x)"/>'),
    _svg("<style>@import 'https://evil.example/x.css'</style>"),
    _svg('<animate attributeName="href" to="javascript:alert(1)"/>'),
    _svg('<set attributeName="onclick" to="alert(1)"/>'),
    '<!DOCTYPE svg [<!ENTITY a "aaaaaaaaaa"><!ENTITY b "&a;&a;">]>' + _svg("<title>&b;</title>"),
    '<!DOCTYPE svg SYSTEM "file:///etc/passwd">' + _svg(),
    '<?xml-stylesheet href="https://evil.example/x.css"?>' + _svg(),
    '<html xmlns="http://www.w3.org/1999/xhtml"><script>alert(1)</script></html>',
    "<svg><rect/></svg>",
    '<svg xmlns="http://www.w3.org/2000/svg" width="9" height="9"/>',
    '<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 0 9"/>',
    '<g xmlns="http://www.w3.org/2000/svg" viewBox="0 0 9 9"/>',
    _svg("<rect>"),
    "GIF89a", "",
])
def test_a_logo_of_more_than_shapes_is_refused(folder: Path, svg: str) -> None:
    """Expected: one message that names the logo and, where it is in the picture, the line."""
    assert refused(with_logo(folder, svg)).startswith(("ours.svg:1: ", "ours.svg:2: ", "ours.svg:3: "))


def test_a_logo_in_another_encoding_hides_nothing(folder: Path) -> None:
    """Expected: UTF-16 and UTF-7 are refused, whatever is in them."""
    assert "UTF-8" in refused(with_logo(folder, _svg("<script/>").encode("utf-16")))
    declared = '<?xml version="1.0" encoding="{}"?>'
    assert refused(with_logo(folder, declared.format("utf-7") + _svg("+ADw-script+AD4-"))).startswith(
        "ours.svg:1: the logo is in utf-7")
    assert load(with_logo(folder, declared.format("UTF-8") + _svg("<title>é</title>"))).own.logo is not None


@pytest.mark.parametrize(("name", "data", "said"), [
    ("big.svg", _svg("<!--" + "x" * 300_000 + "-->"), "big.svg: the logo is larger than 256 kB"),
    ("big.png", _png(5000, 10), "big.png: the logo has 5000 by 10 pixels"),
    ("no.png", b"GIF89a" + b"\0" * 40, "no.png: this is not a PNG picture"),
    ("cut.png", _png(9, 9)[:20], "cut.png: this is not a PNG picture"),
])
def test_a_logo_that_is_too_large_or_no_picture_is_refused(
    folder: Path, name: str, data: str | bytes, said: str
) -> None:
    assert refused(with_logo(folder, data, name)).startswith(said)


@pytest.mark.parametrize("name", ["../secret.svg", "/etc/passwd", "sub/logo.svg", ".hidden.svg", "logo.gif",
                                  "logo.svg\\0.png", "..", "logo.html", "a b.svg"])
def test_a_logo_lies_beside_its_file(folder: Path, name: str) -> None:
    """Expected: a name with a path, or of another kind, is refused where it is written."""
    write(folder.parent / "secret.svg", _svg())
    write(folder / "look.yaml", f'logo:\n  file: "{name}"\n  alt: A boat\n')
    assert refused(folder).startswith("look.yaml:2: ")


def test_a_logo_that_is_missing_or_a_link_is_refused(folder: Path) -> None:
    """Expected: neither is followed elsewhere."""
    write(folder / "look.yaml", "logo:\n  file: ours.svg\n  alt: A boat\n")
    assert refused(folder).startswith("ours.svg: the logo is missing")
    (folder / "ours.svg").symlink_to(write(folder.parent / "secret.svg", _svg()))
    assert refused(folder).startswith("ours.svg: the logo is a link to another file")


def test_a_logo_says_what_it_shows(folder: Path) -> None:
    """Expected: without alt it is refused, and the message says what to write."""
    write(folder / "look.yaml", "logo:\n  file: logo.svg\n")
    assert 'look.yaml:1: logo has no "alt"; add it: what the logo shows' in refused(folder)


# --- pages and notices ------------------------------------------------------------------------------


def test_markdown_is_what_it_is_known_for(folder: Path) -> None:
    """Expected: emphasis, links, lists, tables, code and headings, a heading of the first level one lower."""
    made = html(folder, "# Again\n\nA *b* **c** [d](../x/ \"t\").\n\n- e\n- f\n\n| g | h |\n|---|---|\n| 1 | 2 |\n\n"
                        "```\ni < j\n```\n\n> k\n")
    for part in ("<h2>Again</h2>", "<em>b</em>", "<strong>c</strong>", '<a href="../x/" title="t">d</a>', "<li>e</li>",
                 "<td>2</td>", "i &lt; j", "<blockquote>"):
        assert part in made
    assert "<h1" not in made


def test_placeholders_are_read_with_what_they_ask_for(folder: Path) -> None:
    """Expected: every documented placeholder, each with its arguments, in the order of the text; each date once."""
    own = page(folder, "# About {community}\n{authority} {date eid-al-fitr 1448} {month-start 9 1448}\n"
                       "{standing eid-al-fitr 1448} {standing 9 1448} {date eid-al-fitr 1448}").own
    written = own.pages["about"]["en"]
    asked = [part for part in (*written.title, *written.body) if isinstance(part, Placeholder)]
    assert {part.kind for part in asked} == set(PLACEHOLDERS)
    assert written.asked == (
        Placeholder("date", "eid-al-fitr", 1448), Placeholder("month-start", 9, 1448),
        Placeholder("standing", "eid-al-fitr", 1448), Placeholder("standing", 9, 1448),
    )


@pytest.mark.parametrize(("text", "line", "said"), [
    ("a\n{dat eid-al-fitr 1448}", 3, 'is no placeholder; did you mean "date"?, or write \\{'),
    ("{date eid-al-fitrr 1448}", 2, 'did you mean "eid-al-fitr"?'),
    ("{date eid-al-fitr}", 2, "does not say of what and in which Hijri year"),
    ("{date eid-al-fitr 1448 now}", 2, "does not say of what and in which Hijri year"),
    ("{date eid-al-fitr 2026}", 2, "2026 is none of the years published, 1447 to 1449"),
    ("{date odd-nights 1448}", 2, "observance"),
    ("{month-start 13 1448}", 2, "there is no month 13"),
    ("{month-start ramadan 1448}", 2, '"ramadan" is no lunar month'),
    ("{community now}", 2, "stands alone"),
    ("{}", 2, "is no placeholder"),
    ("\n\n{{ 7 * 7 }}", 4, "this brace is never closed"),
    ("{% include 'x' %}", 2, "is no placeholder"),
    ("{{community}}", 2, "this brace is never closed"),
    ("{date\neid-al-fitr 1448}", 2, "this brace is never closed"),
    ("```\nif (x) { y }\n```", 3, "is no placeholder"),
])
def test_what_is_no_placeholder_is_refused(folder: Path, text: str, line: int, said: str) -> None:
    """Expected: file, line and how to mend it."""
    write(folder / "pages/about.md", f"# Title\n{text}")
    message = refused(folder)
    assert message.startswith(f"pages/about.md:{line}: ")
    assert said in message


def test_what_falls_more_than_once_a_year_has_no_one_date(folder: Path) -> None:
    """Expected: the nights of a run of nights are refused."""
    several = next(name for name, one in load(folder).observances.items() if one.when.last_nights)
    write(folder / "pages/about.md", f"# Title\n{{date {several} 1448}}")
    assert "falls more than once a year" in refused(folder)


def test_escaped_braces_are_braces(folder: Path) -> None:
    """Expected: in text and in code alike; and a backslash is one, as Markdown has it."""
    made = html(folder, "\\{community\\} \\{\\{ 7 * 7 \\}\\} `\\{% x %\\}` \\\\ {community}")
    assert made == "<p>{community} {{ 7 * 7 }} <code>{% x %}</code> \\ VALUE</p>"


def test_a_value_is_text_and_nothing_else(folder: Path) -> None:
    """Expected: markup, Markdown and placeholders in a value are shown as they are; as an address it is no script."""
    value = "<b>*x*</b> {date} [y](javascript:z) \"'&"
    made = html(folder, "{community} `{community}` **{community}**", lambda _: value)
    shown = "&lt;b&gt;*x*&lt;/b&gt; {date} [y](javascript:z) \"'&amp;"
    assert made == f"<p>{shown} <code>{shown}</code> <strong>{shown}</strong></p>"
    assert "javascript" not in html(folder, "[a]({community})", lambda _: "javascript:alert(1)")
    assert html(folder, '[a](../x/ "{community}")', lambda _: '"onclick="x').count("onclick=") == 1


@pytest.mark.parametrize("markdown", [
    "<script>alert(1)</script>",
    "<img src=x onerror=alert(1)>",
    "a <b onclick='alert(1)'>b</b>",
    "<iframe src='https://evil.example/'></iframe>",
    "<style>body{display:none}</style>",
    "<svg onload=alert(1)>",
    "<!-- --><form action=x><input>",
    "<a href='javascript:alert(1)'>a</a>",
    "<div markdown='1' onclick='x'>*a*</div>",
    "&lt;script&gt;alert(1)&lt;/script&gt;",
    "`<script>alert(1)</script>`",
    "    <script>alert(1)</script>",
    "*a*{: onclick=alert(1) }",
    "<math><mi xlink:href='javascript:alert(1)'>x",
    "<p style='position:fixed'>a</p>",
    "<meta http-equiv=refresh content=0>",
])
def test_html_is_shown_and_never_obeyed(folder: Path, markdown: str) -> None:
    """Expected: no element and no attribute that Markdown itself does not write."""
    from html.parser import HTMLParser

    class Elements(HTMLParser):
        def __init__(self) -> None:
            super().__init__()
            self.found: list[tuple[str, list[tuple[str, str | None]]]] = []

        def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
            self.found.append((tag, attrs))

    parser = Elements()
    parser.feed(html(folder, "\n" + markdown.replace("{", "\\{") + "\n"))
    assert {tag for tag, _ in parser.found} <= {"p", "em", "code", "pre"}
    assert [attributes for _, attributes in parser.found if attributes] == []


@pytest.mark.parametrize("link", [
    "[a](javascript:alert(1))", "[a](JaVaScRiPt:alert(1))", "[a]( javascript:alert(1))", "[a](java\tscript:alert(1))",
    "[a](data:text/html,x)", "[a](vbscript:x)", "[a](file:///etc/passwd)", "[a](&#106;avascript:alert(1))",
    "[a][b]\n\n[b]: javascript:alert(1)", "[a](<java script:alert(1)>)", "<ftp://example.org/>", "[a](blob:x)",
])
def test_a_link_that_is_none_is_refused_or_dead(folder: Path, link: str) -> None:
    """Expected: refused with the file named; what Markdown does not take for a link is text."""
    write(folder / "pages/about.md", f"# Title\n\n{link}\n")
    try:
        said = load(folder).own.pages["about"]["en"].html(lambda _: "")
    except ContentError as fault:
        said = str(fault)
    refusal = f"{folder}/pages/about.md:" in said and "is none that a page may hold" in said
    assert refusal or (said.startswith("<p>") and "href" not in said)


def test_a_script_for_a_link_is_refused_at_its_line(folder: Path) -> None:
    """Expected: the line of the link, and the schemes that are taken."""
    write(folder / "pages/about.md", "# Title\n\ntext\n\n[a](javascript:alert(1))\n")
    assert refused(folder) == (
        'pages/about.md:5: the link "javascript:alert(1)" is none that a page may hold; '
        "link to another page, or by http, https, mailto, webcal"
    )


def test_a_picture_is_refused_at_its_line(folder: Path) -> None:
    write(folder / "pages/about.md", "# Title\n\ntext ![x](https://evil.example/x.png)\n")
    assert refused(folder).startswith("pages/about.md:3: a picture is put in here; ")


@settings(deadline=None)
@given(st.text(alphabet="ab<>&\"'`*_[]()!#\\{}|:/ \n-=+1.", max_size=80))
def test_any_text_becomes_clean_html_or_one_message(tmp_path_factory: pytest.TempPathFactory, text: str) -> None:
    """Expected: only the elements and attributes that are let through, whatever is written."""
    from moonwrit.content.own import _TAGS, read_texts

    folder = tmp_path_factory.mktemp("pages", numbered=True)
    write(folder / "a.md", f"# T\n{text}")
    faults: list[ContentError] = []
    texts = read_texts(folder, EXAMPLE.site, EXAMPLE.observances, faults)
    if faults:
        assert len(faults) == 1
        assert faults[0].line >= 1
        return
    made = texts["a"]["en"].html(lambda _: "v")
    for tag, rest in re.findall(r"<([a-z0-9]+)([^>]*)>", made):
        assert tag in _TAGS
        assert re.fullmatch(r'( (href|title|start)="[^"]*")*', rest)


@pytest.mark.parametrize(("name", "text", "said"), [
    ("pages/about.md", "no title\n", "pages/about.md:1: the text does not begin with its title"),
    ("pages/about.md", "## Second\ntext", "pages/about.md:1: the text does not begin with its title"),
    ("pages/about.md", "# Title\n\n \n", "pages/about.md:1: there is nothing below the title"),
    ("pages/about.md", b"# Title\nx\n\xff\n", "pages/about.md:3: a character is not UTF-8"),
    ("pages/about.md", "# Title\nx\u202ey", "pages/about.md:2: the character U+202E is written here"),
    ("pages/about.md", "# Title\nx\x02y", "pages/about.md:2: the character U+0002 is written here"),
    ("pages/about.md", "# Title\n\ue0007\ue001", "pages/about.md:2: the character U+E000 is written here"),
    ("pages/about.md", "# Title\n" + "x" * 300_000, "pages/about.md: the text is larger than 256 kB"),
    ("pages/About.md", "# T\nx", 'pages/About.md: "About" cannot be the name of a page'),
    ("pages/a--b.md", "# T\nx", 'pages/a--b.md: "a--b" cannot be the name of a page'),
    ("pages/about.de.md", "# T\nx", 'pages/about.de.md: "de" is no language of the site'),
    ("pages/about.html", "# T\nx", "pages/about.html: this is not a Markdown file"),
    ("pages/sub/about.md", "# T\nx", "pages/sub: this is not a Markdown file"),
    ("notices/hall-closed.md", "# T\nx", "notices/hall-closed.md: the name does not begin with a date"),
    ("notices/2026-13-01-x.md", "# T\nx", "notices/2026-13-01-x.md: the name does not begin with a date"),
    ("notices/2026-11-20.md", "# T\nx", "notices/2026-11-20.md: the name does not begin with a date"),
    ("theme/pages/hom.html", "x", 'theme/pages/hom.html: the theme has no template of this name; did you mean "pages/'),
])
def test_a_file_at_fault_is_named(folder: Path, name: str, text: str | bytes, said: str) -> None:
    write(folder / name, text)
    assert refused(folder).startswith(said)


def test_a_page_that_is_a_link_to_another_file_is_refused(folder: Path) -> None:
    """Expected: what lies outside the folder is not published through it."""
    (folder / "pages").mkdir()
    (folder / "pages/about.md").symlink_to(write(folder.parent / "secret.md", "# Secret\nx"))
    assert refused(folder).startswith("pages/about.md: this is not a Markdown file")


def test_each_language_may_have_a_text_of_its_own(folder: Path) -> None:
    """Expected: texts by language; the site's own is needed, and may be named."""
    site = folder / "site.yaml"
    text = re.sub(r"(?m)^languages:.*\n", "", site.read_text(encoding="utf-8"))
    site.write_text(text + "languages: [tr, ar]\n", encoding="utf-8")
    write(folder / "pages/about.tr.md", "# Hakkında\nx")
    assert refused(folder).startswith("pages/about.md: the file is missing; write it in the site's language, en, too")
    write(folder / "pages/about.md", "# About\nx")
    write(folder / "notices/2026-11-20-b.en.md", "# B\nx")
    write(folder / "notices/2026-12-01-a.md", "# A\nx")
    own = load(folder).own
    assert {code: text.title for code, text in own.pages["about"].items()} == {"en": ("About",), "tr": ("Hakkında",)}
    assert [*own.notices] == [(date(2026, 12, 1), "2026-12-01-a"), (date(2026, 11, 20), "2026-11-20-b")]
    write(folder / "pages/about.en.md", "# About\nx")
    assert "there are two files in en" in refused(folder)
