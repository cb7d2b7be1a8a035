"""The pages of the demonstration site, before the judges that decide what a page is: checker, browser, reader."""

from __future__ import annotations

import filecmp
import re
import shutil
from collections.abc import Callable, Iterator
from html.parser import HTMLParser
from pathlib import Path
from typing import Any
from urllib.parse import unquote, urldefrag, urljoin, urlsplit

import pytest
from page_values import ROOT, build

HERE = "https://site.example/"

# One page of each kind, chosen for what stands on it: reports, amendments, decisions, a long table.
KINDS = (
    "index.html", "1448/", "1447/jumada-al-ula/", "observances/", "observances/ramadan/", "evenings/2025-10-22/",
    "policy/", "differences/", "changes/", "subscribe/", "reading/", "404.html", "embed/", "embed/en.html",
    "civil/2027/", "places/", "fasting/1448/", "pages/about/", "notices/",
)
FRAMED = re.compile(r"embed/(?!index)\w+\.html")
"""The pages that other sites show in a frame, one for each language: the only ones with a script."""


LANGUAGE = re.compile(r"(?:embed/)?(ar|tr|ur|id|fr)(?:/|\.html)")
"""The language of an address that is not of the default one."""


@pytest.fixture(scope="session")
def demonstration(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return build(ROOT / "content", tmp_path_factory.mktemp("demonstration") / "site")


class Parsed(HTMLParser):
    """What a page holds: its elements with their attributes, and its text."""

    def __init__(self, page: Path) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str]]] = []
        self.text = ""
        self.feed(page.read_text(encoding="utf-8"))

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, {name: value or "" for name, value in attrs}))

    def handle_data(self, data: str) -> None:
        self.text += data

    def links(self) -> Iterator[str]:
        for _, attributes in self.elements:
            yield from (attributes[name] for name in ("href", "src", "action", "data", "poster") if name in attributes)


@pytest.fixture(scope="session")
def parsed(demonstration: Path) -> dict[str, Parsed]:
    """Address -> page, for every page of the demonstration."""
    return {
        path.relative_to(demonstration).as_posix().removesuffix("index.html"): Parsed(path)
        for path in sorted(demonstration.rglob("*.html"))
    }


def test_every_kind_of_page_is_looked_at(demonstration: Path) -> None:
    """Expected: as many kinds of pages as there are templates, all of them built."""
    assert len(KINDS) == len(list((ROOT / "themes/moonwrit/pages").glob("*.html")))
    for kind in KINDS:
        assert (demonstration / kind / ("index.html" if kind.endswith("/") else "")).is_file(), kind


@pytest.mark.judge("vnu")
def test_all_pages_are_valid(demonstration: Path, vnu: Callable[[Path], list[dict[str, Any]]]) -> None:
    """Expected: no error from the Nu Html Checker, and no warning but one.

    It takes each file for a site of its own, to which the style sheet, logo or script beside it would be another host.
    """
    own = re.compile(
        r"\.(css” blocked by “style|js” blocked by “script|html” blocked by “frame|svg” blocked by “img)-src”")
    said = [message for message in vnu(demonstration) if not own.search(message["message"])]
    assert [f"{one['url']}:{one.get('lastLine')}: {one['message']}" for one in said] == []


@pytest.mark.judge("axe")
def test_pages_are_accessible_and_fit_light_and_dark_wide_and_narrow(
    demonstration: Path, node: Callable[..., Any], chromium: str
) -> None:
    """Expected: with all details open, no violation that axe-core knows of, nothing that the browser complains of or
    has to ask another host for, and no page wider than a window of 1280 or 320 pixels."""
    found = node(Path(__file__).with_name("look.js"), chromium, demonstration, *KINDS)
    assert len(found) == 4 * len(KINDS)
    assert min(look["passes"] for look in found) > 20
    bad = [look for look in found if look["violations"] or look["faults"] or look["wider"] > 0]
    assert bad == []


@pytest.mark.judge("axe")
@pytest.mark.parametrize("code", ["ar", "tr", "ur", "id", "fr"])
def test_pages_are_accessible_in_every_language(
    demonstration: Path, node: Callable[..., Any], chromium: str, code: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Expected: the same of every kind of page in each other language, light and wide, dark and narrow."""
    monkeypatch.setenv("LOOKS", "crossed")
    pages = [kind.replace("en.html", f"{code}.html") if kind.endswith("en.html") else f"{code}/{kind}"
             for kind in KINDS if kind != "404.html"]
    found = node(Path(__file__).with_name("look.js"), chromium, demonstration, *pages)
    assert len(found) == 2 * len(pages)
    assert [look for look in found if look["violations"] or look["faults"] or look["wider"] > 0] == []


def test_every_internal_link_and_fragment_leads_somewhere(demonstration: Path, parsed: dict[str, Parsed]) -> None:
    """Expected: each relative address is a file of the site, each fragment the one element with that id."""
    followed = 0
    for address, page in parsed.items():
        ids = [attributes["id"] for _, attributes in page.elements if "id" in attributes]
        assert len(ids) == len(set(ids)), f"{address} has an id twice"
        for link in page.links():
            if urlsplit(link).scheme not in ("", "https") or not urljoin(HERE + address, link).startswith(HERE):
                continue
            target, fragment = urldefrag(urljoin(HERE + address, link))
            path = unquote(target.removeprefix(HERE))
            file = demonstration / path / ("index.html" if path == "" or path.endswith("/") else "")
            assert file.is_file(), f"{address}: {link} leads nowhere"
            if fragment:
                there = {attributes.get("id") for _, attributes in parsed[path.removesuffix("index.html")].elements}
                assert fragment in there, f"{address}: {link} names no element"
            followed += 1
    assert followed > 10 * len(parsed)


def test_every_page_can_be_reached_from_the_first(parsed: dict[str, Parsed]) -> None:
    """Expected: following links from the home page leads to all pages but the one for missing addresses."""
    reached, waiting = set(), [""]
    while waiting:
        address = waiting.pop()
        if address in reached or address not in parsed:
            continue
        reached.add(address)
        for link in parsed[address].links():
            target = urldefrag(urljoin(HERE + address, link)).url
            waiting.append(target.removeprefix(HERE).removesuffix("index.html"))
    assert set(parsed) - reached == {"404.html"}


def test_pages_send_nothing_elsewhere_and_run_nothing(demonstration: Path, parsed: dict[str, Parsed]) -> None:
    """Expected: a content security policy that allows what is the site's own and no more, nothing loaded from another
    host, and no script but in the frame for others, so that pages are the same without one."""
    for address, page in parsed.items():
        policies = [a["content"] for tag, a in page.elements if a.get("http-equiv") == "Content-Security-Policy"]
        assert len(policies) == 1, address
        directives = dict(part.split(maxsplit=1) for part in policies[0].split("; "))
        assert directives["default-src"] == "'none'"
        assert set(directives.values()) == {"'none'", "'self'"}
        assert ("script-src" in directives) == bool(FRAMED.fullmatch(address))
        for tag, attributes in page.elements:
            assert tag not in ("object", "embed", "base", "form", "noscript"), f"{address}: {tag}"
            assert tag != "script" or FRAMED.fullmatch(address), address
            assert tag != "iframe" or address.endswith("embed/"), address
            assert not [name for name in attributes if name.startswith("on")], f"{address}: {tag}"
            if tag == "a" or attributes.get("rel") in ("canonical", "alternate") or "itemprop" in attributes:
                continue
            loaded = [attributes.get("src", ""), attributes.get("href", "")]
            assert not [link for link in loaded if urlsplit(link).netloc or urlsplit(link).scheme], f"{address}: {tag}"
        for link in page.links():
            assert urlsplit(link).scheme in ("", "https", "http", "mailto", "webcal"), f"{address}: {link}"
    assert not re.search(r"@import|url\(", (demonstration / "style.css").read_text(encoding="utf-8"))


def test_every_page_says_its_language_and_has_a_title_of_its_own(parsed: dict[str, Parsed]) -> None:
    """Expected: lang and dir on every page, one first heading, and no two pages with one title."""
    for address, page in parsed.items():
        (root,) = [attributes for tag, attributes in page.elements if tag == "html"]
        code = found[1] if (found := LANGUAGE.match(address)) else "en"
        assert (root["lang"], root["dir"]) == (code, "rtl" if code in ("ar", "ur") else "ltr"), address
        assert [tag for tag, _ in page.elements].count("h1") == 1, address
    titles = [
        (found[1] if (found := LANGUAGE.match(address)) else "en", page.text.strip().splitlines()[0])
        for address, page in parsed.items() if not FRAMED.fullmatch(address)
    ]
    assert all("Three Harbours" in title for _, title in titles)
    assert len(set(titles)) == len(titles)


# --- content that means mischief, or only contains an ampersand -------------------------------------

MARKUP = "<b onclick=\"alert('1')\">&amp; {{ 7 * 7 }} {% endif %}</b><script>alert(2)</script>"


@pytest.fixture(scope="session")
def marked_up(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A site in which every text that a community writes holds markup."""
    content = tmp_path_factory.mktemp("marked-up") / "content"
    shutil.copytree(ROOT / "content", content)
    quoted = "'" + MARKUP.replace("'", "''") + "'"

    def text(file: str, *changes: tuple[str, str]) -> None:
        was = (content / file).read_text(encoding="utf-8")
        for old, new in changes:
            assert old in was, f"{file} no longer holds {old}"
            was = was.replace(old, new)
        (content / file).write_text(was, encoding="utf-8")

    text("site.yaml", ("community: Three Harbours Council", f"community: {quoted}"),
         ("name: Three Harbours calendar", f"name: {quoted}"),
         ("authority: Calendar Committee of the Three Harbours Council", f"authority: {quoted}"),
         ("contact: calendar@three-harbours.example", f"contact: {quoted}"))
    text("places.yaml", ("name: Wattle Harbour", f"name: {quoted}"))
    text("regions.yaml", ("name: Three Harbours", f"name: {quoted}"))
    text("policies.yaml", ("name: Harbour sighting", f"name: {quoted}"), ("name: Umm al-Qura", f"name: {quoted}"),
         ("summary: The calculated calendar of Makkah, for comparison.", f"summary: {quoted}"))
    text("observances.yaml", ("en: Eid al-Fitr", f"en: {quoted}"),
         ("about: The month of fasting, from its first day to its last.", f"about: {quoted}"))
    text("record/reports.yaml",
         ("note: Seen for four minutes, low and thin, horns to the right.", f"note: {quoted}"),
         ("- A. Observer", f"- {quoted}\n  names_public: true"))
    decisions = (content / "record/decisions.yaml").read_text(encoding="utf-8")
    decisions = decisions.replace("by: Calendar Committee of the Three Harbours Council", f"by: {quoted}")
    decisions = decisions.replace("en: No report of a sighting by ten past eight.", f"en: {quoted}")
    (content / "record/decisions.yaml").write_text(decisions, encoding="utf-8")
    return build(content, content.parent / "site")


def test_markup_in_the_content_is_shown_and_never_obeyed(marked_up: Path, demonstration: Path) -> None:
    """Expected: the text as it was written, wherever it is shown, and no element that the templates did not write."""
    shown = 0
    for path in sorted(marked_up.rglob("*.html")):
        page = Parsed(path)
        shown += page.text.count(MARKUP)
        for tag, attributes in page.elements:
            assert tag != "b", path
            assert tag != "script" or FRAMED.fullmatch(path.relative_to(marked_up).as_posix()), path
            assert "onclick" not in attributes, path
        before = Parsed(demonstration / path.relative_to(marked_up))
        # Maps leave out names for which there is no room.
        tags, tags_before = ([tag for tag, _ in one.elements if tag != "text"] for one in (page, before))
        assert tags == tags_before, path
    assert shown > len(list(marked_up.rglob("*.html")))


@pytest.mark.judge("vnu")
def test_pages_with_markup_in_the_content_are_valid(
    marked_up: Path, vnu: Callable[[Path], list[dict[str, Any]]]
) -> None:
    """Expected: no error, so that nothing has broken out of an attribute, a title or a picture either."""
    assert [message for message in vnu(marked_up) if message["type"] == "error"] == []


def _same(one: Path, other: Path) -> list[str]:
    """Paths that are missing on one side or whose bytes are not the same."""
    paths = [{p.relative_to(side).as_posix() for p in side.rglob("*") if p.is_file()} for side in (one, other)]
    _, differing, odd = filecmp.cmpfiles(one, other, paths[0] & paths[1], shallow=False)
    return sorted((paths[0] ^ paths[1]) | set(differing) | set(odd))


def test_a_second_build_elsewhere_gives_the_same_bytes(demonstration: Path, tmp_path: Path) -> None:
    """Expected: no byte depends on the order of hashes, the machine's time zone or its language."""
    shutil.copytree(ROOT / "content", tmp_path / "content")
    other = build(tmp_path / "content", tmp_path / "other/site", PYTHONHASHSEED="4711", TZ="America/St_Johns",
                  LC_ALL="tr_TR.UTF-8", LANG="ar", PYTHONUTF8="0", COLUMNS="40")
    assert len(list(demonstration.rglob("*.html"))) > 50
    assert _same(demonstration, other) == []
