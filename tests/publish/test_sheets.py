"""PDF sheets, read back by another library."""

from __future__ import annotations

import io
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
from page_values import ROOT
from pypdf import PdfReader

from demonstration import one_language
from moonwrit.errors import RequestError
from moonwrit.publish import sheets

POINTS = {"a4": (595.3, 841.9), "letter": (612.0, 792.0)}


@pytest.fixture(scope="module", params=["a4", "letter"])
def built(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> tuple[str, Path]:
    """A paper, and the site of one year with sheets of it."""
    content = tmp_path_factory.mktemp("sheets") / "content"
    shutil.copytree(ROOT / "content", content, ignore=shutil.ignore_patterns("record"))
    one_language(content)
    site = content / "site.yaml"
    one_year = site.read_text(encoding="utf-8").replace("{from: 1447, to: 1449}", "{from: 1448, to: 1448}")
    site.write_text(one_year, encoding="utf-8")
    command = [sys.executable, "-m", "moonwrit.cli", "publish", "--content", str(content), "--as-of", "2026-12-01"]
    output = content.parent / "site"
    subprocess.run([*command, "--output", str(output), "--pdf", request.param], check=True, capture_output=True)
    return request.param, output


@pytest.mark.judge("pango")
def test_a_sheet_is_one_page_of_its_paper_with_the_text_of_its_page(built: tuple[str, Path]) -> None:
    """Year, civil year, month and evening; each is linked from its page."""
    paper, site = built
    for folder, text in (
        ("1448", "Jumada al-Thani"), ("1448/ramadan", "Ramadan 1448"), ("civil/2027", "February 2027"),
        ("evenings/2027-02-07", "Never point optics at or near the Sun"),
    ):
        reader = PdfReader(site / folder / "sheet.pdf")
        assert len(reader.pages) == 1, folder
        box = reader.pages[0].mediabox
        assert (float(box.width), float(box.height)) == pytest.approx(POINTS[paper], abs=0.5)
        assert text in " ".join(reader.pages[0].extract_text().split()), folder
        assert 'href="sheet.pdf"' in (site / folder / "index.html").read_text(encoding="utf-8").replace(
            f"../{'../' * folder.count('/')}{folder}/", "")


@pytest.mark.judge("pango")
def test_what_is_drawn_has_its_style_and_its_labels(built: tuple[str, Path]) -> None:
    """The horizon's labels are in the evening's sheet, and nothing asks for a colour by a name that is not there."""
    _, site = built
    text = PdfReader(site / "evenings/2027-02-07/sheet.pdf").pages[0].extract_text()
    assert "best time" in text
    assert "azimuth; 270° is due west" in text
    assert "var(" not in sheets._drawn()


@pytest.mark.judge("pango")
def test_a_sheet_is_the_same_bytes_again_and_asks_nothing_from_elsewhere() -> None:
    head = b'<!doctype html><html lang="en"><head><title>T</title><link rel="stylesheet" href="../style.css"></head>'
    files = {"a/index.html": head + b"<body><p>Text</p></body></html>", "style.css": b"p { color: #000 }"}
    made = sheets.sheet("a/index.html", files, "a4")
    assert made == sheets.sheet("a/index.html", files, "a4")
    assert len(PdfReader(io.BytesIO(made)).pages) == 1
    for elsewhere in (b"https://elsewhere.example/x.png", b"file:///etc/hostname", b"../../etc/hostname"):
        page = head + b'<body><img alt="" src="' + elsewhere + b'"></body></html>'
        with pytest.raises(RequestError, match="is not part of the site"):
            sheets.sheet("a/index.html", {**files, "a/index.html": page}, "a4")


def test_without_the_extra_there_is_one_message(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "weasyprint", None)
    sheets._weasyprint.cache_clear()
    with pytest.raises(RequestError, match=r"moonwrit\[pdf\]"):
        sheets.sheet("index.html", {"index.html": b""}, "a4")
    sheets._weasyprint.cache_clear()
