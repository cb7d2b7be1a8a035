"""The message catalogues: complete, with the same places for values as the texts that they translate."""

from __future__ import annotations

import ast
import importlib.util
import re
import shutil
import sys
from pathlib import Path
from types import ModuleType

import pytest
from babel.messages.pofile import read_po
from click.testing import CliRunner
from page_values import ROOT

from moonwrit.cli import main
from moonwrit.publish import catalogue

CODES = ("ar", "fr", "id", "tr", "ur")
TRANSLATES = ("_", "gettext", "ngettext", "Note")
PLACE = re.compile(r"%\((\w+)\)s|(%%)")


@pytest.fixture(scope="module")
def maker() -> ModuleType:
    """The program behind ``make catalogues``."""
    spec = importlib.util.spec_from_file_location("catalogues", ROOT / "themes/catalogues.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules["catalogues"] = module
    spec.loader.exec_module(module)
    return module


@pytest.mark.filterwarnings("ignore::SyntaxWarning")
def test_the_texts_to_translate_are_those_of_theme_and_code(maker: ModuleType) -> None:
    """messages.pot is what ``make catalogues`` would write now."""
    assert (catalogue.folder() / "messages.pot").read_bytes() == maker.as_bytes(maker.template())


def test_no_text_to_translate_stands_inside_a_formatted_one() -> None:
    """Expected: none, for under Python 3.11 extraction does not find it there, and under later ones it does."""
    hidden = [
        f"{file.name}:{call.lineno}"
        for file in sorted((ROOT / "generator").rglob("*.py"))
        for outer in ast.walk(ast.parse(file.read_bytes())) if isinstance(outer, ast.JoinedStr)
        for call in ast.walk(outer) if isinstance(call, ast.Call)
        if (call.func.attr if isinstance(call.func, ast.Attribute) else getattr(call.func, "id", "")) in TRANSLATES
        and isinstance(call.args[0], ast.Constant)
    ]
    assert hidden == []


@pytest.mark.parametrize("code", CODES)
def test_a_catalogue_is_complete_and_keeps_the_places_of_values(code: str) -> None:
    assert catalogue.untranslated(code) == []
    with (catalogue.folder() / f"{code}.po").open("rb") as file:
        found = read_po(file, locale=code)
    for message in found:
        if not message.id:
            continue
        originals = [message.id] if isinstance(message.id, str) else list(message.id)
        texts = [message.string] if isinstance(message.string, str) else list(message.string or ())
        assert not list(message.check(found)), message.id
        if isinstance(message.id, str):
            assert sorted(PLACE.findall(texts[0])) == sorted(PLACE.findall(originals[0])), message.id
        else:
            # A form for one or two may say the number in a word.
            places = set(PLACE.findall(originals[1]))
            assert all(places - {("n", "")} <= set(PLACE.findall(text)) <= places for text in texts), message.id
        for text in texts:
            assert not re.search(r"[<>]", text) or re.search(r"[<>]", originals[0]), text
            assert text == text.strip() or originals[0] != originals[0].strip(), repr(text)


def test_check_says_what_a_language_lacks(tmp_path: Path) -> None:
    """A language without a catalogue: the texts stand in English, and check says so."""
    content = tmp_path / "content"
    shutil.copytree(ROOT / "content", content)
    site = (content / "site.yaml").read_text(encoding="utf-8")
    site = re.sub(r"(?m)^languages:.*\n", "", site) + "\nlanguages: [de]\n"
    (content / "site.yaml").write_text(site, encoding="utf-8")
    done = CliRunner().invoke(main, ["check", "--content", str(content)])
    assert done.exit_code == 0, done.output
    texts = len(catalogue.untranslated("de"))
    assert texts > 400
    assert f"de: {texts} texts are not translated and stand in English" in done.output


def test_a_language_falls_back_on_its_own_without_the_country() -> None:
    french = catalogue.translations("fr").gettext("settled")
    assert french != "settled"
    assert catalogue.translations("fr-CA").gettext("settled") == french
    assert catalogue.translations("en-AU").gettext("settled") == "settled"
