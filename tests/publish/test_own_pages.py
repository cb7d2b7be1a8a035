"""What a community brings of its own, as it is published: dates put in, languages, notices, colours, templates."""

from __future__ import annotations

import json
import re
import shutil
import xml.etree.ElementTree as ET
from collections.abc import Callable, Mapping, Sequence
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner
from page_values import ROOT

from demonstration import one_language
from moonwrit.almanac import Almanac
from moonwrit.building import assembled, content_of, held
from moonwrit.cli import main
from moonwrit.errors import ContentError
from moonwrit.journal import Ledger
from moonwrit.publish.own import RECENT_DAYS
from moonwrit.publish.site import publish

TODAY = date(2026, 12, 1)
ATOM = "{http://www.w3.org/2005/Atom}"
NAME = "Harbours & <i onclick=\"x\">*Friends*</i> {date}"
ABOUT = """\
# About {community}

Kept by {authority}. Ramadan: {month-start 9 1448} ({standing 9 1448}); Eid: {date eid-al-fitr 1448}
({standing eid-al-fitr 1448}); last year {date eid-al-fitr 1447} ({standing eid-al-fitr 1447}), and its month
{standing 10 1447}. See [the policy](../../policy/), <b onclick="alert(1)">bold</b>, \\{\\{ 7 * 7 \\}\\} and
\\{% endblock %\\}.
"""


def write(file: Path, text: str) -> Path:
    file.parent.mkdir(parents=True, exist_ok=True)
    file.write_text(text, encoding="utf-8")
    return file


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demonstration in three languages with texts, colours and notices of its own, and a name of markup."""
    folder = tmp_path_factory.mktemp("own") / "content"
    shutil.copytree(ROOT / "content", folder)
    one_language(folder)
    for name in ("pages", "notices"):
        shutil.rmtree(folder / name)
    site = (folder / "site.yaml").read_text(encoding="utf-8")
    was = "community: Three Harbours Council"
    assert was in site
    site = re.sub(r"(?m)^languages:.*\n", "", site.replace(was, f"community: '{NAME}'"))
    write(folder / "site.yaml", site + "languages: [tr, ar]\n")
    write(folder / "look.yaml", (
        "colours: {link: '#004000', dark: {link: '#a0ffa0', paper: '#000'}}\n"
        "logo: {file: logo.svg, alt: '\"><script>alert(1)</script>'}\n"
        "footer: {en: '<b>Foot</b>', tr: Ayak}\n"
    ))
    write(folder / "pages/about.md", ABOUT)
    write(folder / "pages/about.tr.md", "# Hakkında\n\nBayram: {date eid-al-fitr 1448}.")
    for days in (-1, 0, RECENT_DAYS - 1, RECENT_DAYS):
        on = TODAY - timedelta(days=days)
        write(folder / f"notices/{on}-n.md", f"# Notice of {days} & more\n\nEid: {{date eid-al-fitr 1448}}\nand "
                                             "[more](../../subscribe/).\n\nSecond <script>alert(2)</script>.")
    return folder


@pytest.fixture(scope="module")
def known(folder: Path) -> tuple[tuple[Almanac, ...], Ledger]:
    content = content_of(folder)
    almanacs = assembled(content, TODAY)
    return almanacs, held(content, folder, almanacs, TODAY)


@pytest.fixture(scope="module")
def site(folder: Path, known: tuple[Sequence[Almanac], Ledger], tmp_path_factory: pytest.TempPathFactory) -> Path:
    output = tmp_path_factory.mktemp("built") / "site"
    publish(*known, output, own=content_of(folder).own)
    return output


def text_of(site: Path, path: str) -> str:
    return (site / path).read_text(encoding="utf-8")


def main_of(page: str) -> str:
    """The content of a page, each run of spaces one."""
    match = re.search(r"<main.*</main>", page, re.DOTALL)
    assert match
    return " ".join(match[0].split())


def test_dates_are_put_in_as_the_calendar_has_them(site: Path) -> None:
    """Expected: the dates and standings of basis.json, written out; the record of 1447 is settled or amended."""
    months = {(m["year"], m["month"]): m for m in json.loads(text_of(site, "feeds/basis.json"))["months"]}

    def long(iso: str) -> str:
        day = date.fromisoformat(iso)
        return f"{day:%A}, {day.day} {day:%B %Y}"

    eid, ramadan, last = (months[key] for key in ((1448, 10), (1448, 9), (1447, 10)))
    assert (
        f"Ramadan: {long(ramadan['starts'])} ({ramadan['standing']}); Eid: {long(eid['starts'])} ({eid['standing']}); "
        f"last year {long(last['starts'])} ({last['standing']}), and its month {last['standing']}."
    ) in main_of(text_of(site, "pages/about/index.html"))
    assert (eid["standing"], last["standing"]) == ("expected", "settled")


def test_every_date_named_leads_to_its_reason(site: Path) -> None:
    """Expected: below the text each date once, with standing and margin, linked to the page of its month."""
    shown = main_of(text_of(site, "pages/about/index.html"))
    dates = shown[shown.index("Dates named here"):]
    assert re.findall(r'<li><a href="../../([^"]+)">', dates) == ["1448/ramadan/", "1448/shawwal/", "1447/shawwal/",
                                                                   "1447/shawwal/"]
    assert dates.count('class="standing') == dates.count('class="closeness') == 4


def test_values_and_markup_are_shown_and_never_obeyed(site: Path) -> None:
    """Expected: the community's name, HTML and template words as they were written, in the title too."""
    page = text_of(site, "pages/about/index.html")
    escaped = "Harbours &amp; &lt;i onclick=&#34;x&#34;&gt;*Friends*&lt;/i&gt; {date}"
    assert f"<h1>About {escaped}</h1>" in page
    assert '&lt;b onclick="alert(1)"&gt;bold&lt;/b&gt;, {{ 7 * 7 }} and {% endblock %}' in main_of(page)
    for path in site.rglob("*.html"):
        text = path.read_text(encoding="utf-8")
        assert not re.search(r"<(b|i|script)\b(?! async)", text), path
        assert not re.search(r"<[^>]* on(click|load|error)=", re.sub(r'"[^"]*"', '""', text)), path


def test_each_language_shows_its_own_text_or_says_which_it_is(site: Path) -> None:
    """Expected: Turkish where it is written; where not, the default text marked as being in English."""
    turkish = text_of(site, "tr/pages/about/index.html")
    assert "<h1>Hakkında</h1>" in turkish
    assert "<article>" in turkish
    assert "Bayram: 11 Mart 2027 Perşembe." in turkish
    assert "<p>Ayak</p>" in turkish
    arabic = text_of(site, "ar/pages/about/index.html")
    assert '<article lang="en" dir="ltr">' in arabic
    assert re.search(r'<a href="\./?[^"]*" lang="en">About', text_of(site, "ar/pages/about/index.html").replace(
        'href="../../pages/about/"', 'href="./"'))
    assert "<p>&lt;b&gt;Foot&lt;/b&gt;</p>" in arabic


def test_notices_stand_on_the_home_page_while_they_are_recent(site: Path) -> None:
    """Expected: one of today and one of 59 days ago; one of 60 days ago is on the notices page alone, and one of
    tomorrow nowhere."""
    def titles(path: str) -> list[str]:
        return re.findall(r"Notice of (-?\d+) &amp; more", text_of(site, path))

    assert titles("index.html") == ["0", "59"]
    assert titles("notices/index.html") == ["0", "59", "60"]
    assert sorted(path.name for path in (site / "notices").iterdir() if path.is_dir()) == [
        "2026-10-02-n", "2026-10-03-n", "2026-12-01-n"]


def test_notices_are_in_the_feeds(site: Path) -> None:
    """Expected: title, plain text and clean HTML with whole links; the beginning of its day at the first place, which
    in December is eleven hours before that of UTC."""
    address = "https://calendar.three-harbours.example/notices/2026-12-01-n/"
    items = {one["url"]: one for one in json.loads(text_of(site, "feeds/notices.json"))["items"]}
    item = items[address]
    assert item["title"] == "Notice of 0 & more"
    assert item["content_text"] == ("Eid: Thursday, 11 March 2027 and more.\nSecond <script>alert(2)</script>.")
    assert item["date_published"] == "2026-11-30T13:00:00Z"
    assert '<a href="https://calendar.three-harbours.example/subscribe/">more</a>' in item["content_html"]
    assert "<script" not in item["content_html"]
    entries = {entry.findtext(f"{ATOM}title"): entry for entry in
               ET.fromstring(text_of(site, "feeds/notices.atom")).iter(f"{ATOM}entry")}
    content = entries["Notice of 0 & more"].find(f"{ATOM}content")
    assert content is not None
    assert (content.get("type"), content.text) == ("html", item["content_html"])
    assert len([url for url in items if "/notices/" in url]) == 3


def test_the_look_is_on_every_page(site: Path) -> None:
    """Expected: a sheet of the chosen colours alone, for screens, after the theme's; the logo and what it shows."""
    assert text_of(site, "look.css") == (
        "@media screen and (prefers-color-scheme: light) {\n  :root {\n    --sea: #004000;\n  }\n}\n"
        "@media screen and (prefers-color-scheme: dark) {\n  :root {\n    --paper: #000;\n    --sea: #a0ffa0;\n  }\n}\n"
    )
    pages = list(site.rglob("*.html"))
    for path in pages:
        text = path.read_text(encoding="utf-8")
        assert -1 < text.find('style.css">') < text.find('look.css">'), path
        if path.parts[-2] != "embed":
            logo = r'<img class="logo" src="[./]*logo\.svg" alt="&#34;&gt;&lt;script&gt;alert\(1\)'
            assert re.search(logo, text), path
    assert len(pages) > 300
    assert (site / "logo.svg").read_bytes() == (ROOT / "content/logo.svg").read_bytes()


@pytest.mark.judge("axe")
def test_pages_in_colours_of_ones_own_are_accessible(site: Path, node: Callable[..., Any], chromium: str) -> None:
    """Expected: no violation that axe-core knows of, wide and narrow, light and dark."""
    pages = ["index.html", "ar/pages/about/", "notices/2026-12-01-n/", "1448/ramadan/"]
    found = node(Path(__file__).with_name("look.js"), chromium, site, *pages)
    assert len(found) == 4 * len(pages)
    assert [look for look in found if look["violations"] or look["faults"] or look["wider"] > 0] == []


@pytest.mark.judge("playwright")
def test_the_chosen_colours_are_those_that_a_browser_shows(
    site: Path, node: Callable[..., Any], chromium: str, tmp_path: Path
) -> None:
    """Expected: links in the colour for light pages, for dark ones, and black in print."""
    script = write(tmp_path / "colours.js", """
        const { chromium } = require("playwright-core");
        const [executablePath, page] = process.argv.slice(2);
        (async () => {
          const browser = await chromium.launch({ executablePath, args: ["--no-sandbox"] });
          const tab = await browser.newPage();
          await tab.goto("file://" + page);
          const out = [];
          for (const media of [{ colorScheme: "light" }, { colorScheme: "dark" }, { media: "print" }]) {
            await tab.emulateMedia(media);
            out.push(await tab.evaluate("getComputedStyle(document.documentElement).getPropertyValue('--sea')"));
          }
          console.log(JSON.stringify(out));
          await browser.close();
        })();
    """)
    page = site / "index.html"
    # Opened as a file, a page has no origin that its policy could mean by 'self'.
    text = re.sub(r"<meta http-equiv[^>]*>", "", page.read_text(encoding="utf-8"))
    opened = write(page.with_name("opened.html"), text)
    try:
        assert node(script, chromium, opened) == ["#004000", "#a0ffa0", "#000"]
    finally:
        opened.unlink()


# --- templates of one's own -------------------------------------------------------------------------


@pytest.fixture
def themed(folder: Path, known: tuple[Sequence[Almanac], Ledger], tmp_path: Path) -> Callable[..., Any]:
    """Publishes with these templates in the place of the theme's: the site, or the one message."""

    def made(templates: Mapping[str, str]) -> Path | str:
        shutil.copytree(folder, tmp_path / "content")
        for name, text in templates.items():
            write(tmp_path / "content/theme" / name, text)
        output = tmp_path / "site"
        try:
            publish(*known, output, own=content_of(tmp_path / "content").own)
        except ContentError as fault:
            assert not output.exists(), "something was written"
            return str(fault).replace(f"{tmp_path}/content/", "")
        return output

    return made


def test_a_template_of_ones_own_takes_the_place_of_the_themes(themed: Callable[..., Any]) -> None:
    """Expected: it can extend what it replaces, include a part of its own, and is escaped as the theme's are; all
    other templates stay."""
    site = themed({
        "pages/missing.html": "{% extends 'moonwrit/pages/missing.html' %}{% block main %}{{ super() }}"
                              "{% include 'parts/tide.html' %}{% endblock %}",
        "parts/tide.html": "<p>The tide: {{ community }}</p>",
        "messages/month-short.txt": "Ours: {{ words.month_title(month, L) }}",
        "style.css": "/* ours */ :root { --paper: #fff; }",
        "icon.svg": "<svg/>",
    })
    missing = text_of(site, "404.html")
    assert "There is nothing at this address." in missing
    assert "<p>The tide: Harbours &amp; &lt;i onclick" in missing
    assert text_of(site, "messages/1448-06/en.txt") == "Ours: Jumada al-Thani 1448"
    assert text_of(site, "style.css").startswith("/* ours */")
    assert ".seal" in text_of(site, "style.css")
    assert text_of(site, "icon.svg") == "<svg/>"
    assert "What comes next" in text_of(site, "index.html")


@pytest.mark.parametrize(("templates", "said"), [
    ({"pages/home.html": "a\n{% if %}"}, "theme/pages/home.html:2: the template fails (Expected an expression"),
    ({"pages/home.html": "a\n\n{{ nothing.here }}"},
     "theme/pages/home.html:3: the template fails ('nothing' is undefined)"),
    ({"pages/home.html": "{{ 1 / 0 }}"}, "theme/pages/home.html:1: the template fails (division by zero)"),
    ({"pages/home.html": "\n{% include 'parts/tide.html' %}"},
     'theme/pages/home.html:2: the template fails (there is no template "parts/tide.html")'),
    ({"pages/home.html": "{% extends 'pages/home.html' %}"}, "theme/pages/home.html:1: the template fails ("),
    ({"parts/frame.html": "<p>\n{{ page.nothing }}"}, "theme/parts/frame.html:2: the template fails ("),
    ({"parts/frame.html": "{{ '%d' % community }}"}, "theme/parts/frame.html:1: the template fails ("),
    ({"pages/home.html": "{% include '../../site.yaml' %}"}, "theme/pages/home.html:1: the template fails ("),
    ({"sitemap.xml": "\n{{ x }}"}, "theme/sitemap.xml:2: the template fails ('x' is undefined)"),
    ({"embed/dates.js": "{{ x }}"}, "theme/embed/dates.js:1: the template fails ('x' is undefined)"),
])
def test_a_template_that_fails_is_one_message_and_nothing_is_written(
    themed: Callable[..., Any], templates: dict[str, str], said: str
) -> None:
    """Expected: the community's file and line, and how to mend it."""
    message = themed(templates)
    assert message.startswith(said), message
    assert message.endswith("; mend it, or remove the file to have the theme's own")


def test_check_reads_templates_too(folder: Path, tmp_path: Path) -> None:
    """Expected: the same message from moonwrit check, and none once it is mended."""
    shutil.copytree(folder, tmp_path / "content")
    template = write(tmp_path / "content/theme/pages/year.html", "\n{% endif %}")
    done = CliRunner().invoke(main, ["check", "--content", str(tmp_path / "content")])
    assert done.exit_code == 1
    assert f"{template}:2: the template fails (" in done.stderr
    template.write_text("{{ page.title }}", encoding="utf-8")
    assert CliRunner().invoke(main, ["check", "--content", str(tmp_path / "content")]).exit_code == 0
