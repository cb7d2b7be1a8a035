"""Brings the catalogues in ``moonwrit/locale`` up to the texts of templates and code: ``make catalogues``.

``messages.pot`` holds every text; each ``.po`` file keeps its translations, gets what is new, and loses what is gone.
"""

from __future__ import annotations

import sys
from io import BytesIO
from pathlib import Path

from babel.messages.catalog import Catalog
from babel.messages.extract import extract_from_dir
from babel.messages.pofile import read_po, write_po

from moonwrit.concordance import TITLES
from moonwrit.policy.names import CRITERIA, published_names
from moonwrit.policy.published import NamedPlace, published
from moonwrit.publish.catalogue import untranslated
from moonwrit.sky.criteria import criterion

THEME = Path(__file__).resolve().parent / "moonwrit"
CODE = Path(__file__).resolve().parent.parent / "generator" / "moonwrit"
_KEYWORDS = {"_": None, "gettext": None, "ngettext": (1, 2), "Note": (1,)}
_HEAD = "# Texts of Moonwrit's pages, feeds and pictures. Keep %(names)s as they are; dates and numbers come ready."
_DATED = tuple(f'"{name}'.encode() for name in (
    "POT-Creation-Date", "PO-Revision-Date", "Generated-By", "Report-Msgid", "Last-Translator", "Language-Team",
))
_OPTIONS = {"**.html": {"silent": "false"}, "**.txt": {"silent": "false"}}


def _catalogue(code: str | None = None) -> Catalog:
    return Catalog(code, project="Moonwrit", version="0.1", header_comment=_HEAD, charset="utf-8", fuzzy=False)


def template() -> Catalog:
    """Every text to translate, with the places where it stands; without dates, so that equal texts are equal bytes."""
    out = _catalogue()
    found = []
    for folder, methods in ((CODE, [("**.py", "python")]), (THEME, [("**.html", "jinja2"), ("**.txt", "jinja2")])):
        label = "generator/moonwrit" if folder is CODE else "themes/moonwrit"
        for file, _line, message, _comments, context in extract_from_dir(
            str(folder), methods, _OPTIONS if folder is THEME else None, keywords=_KEYWORDS
        ):
            found.append((f"{label}/{file.replace(chr(92), '/')}", message, context))
    found += [("generator/moonwrit/sky/criteria.py", text, None) for text in _of_policies()]
    found += [("generator/moonwrit/concordance.py", text, None) for text in TITLES.values()]
    for place, message, _context in sorted(found, key=lambda one: (one[0].startswith("themes"), one[0])):
        out.add(message, locations=[(place, None)])  # type: ignore[list-item]
    return out


def _of_policies() -> list[str]:
    """Titles, formulas, frames and grades of criteria, and notes of published policies, which the sky and the policies
    hold as plain texts."""
    texts: list[str] = []
    for name in CRITERIA:
        test = criterion(name)
        texts += [test.title, test.formula, test.frame, *(grade.meaning for grade in test.grades)]
    here = NamedPlace("", 0.0, 0.0, 0.0, None)
    texts += [published(name, here).note for name in published_names()]
    return [text for text in dict.fromkeys(texts) if text]


def as_bytes(catalogue: Catalog) -> bytes:
    out = BytesIO()
    write_po(out, catalogue, width=100, omit_header=False, sort_output=False, ignore_obsolete=True)
    lines = out.getvalue().split(b"\n")
    return b"\n".join(line for line in lines if not line.startswith(_DATED))


def main(*new: str) -> None:
    """``new``: codes of languages to begin."""
    texts = template()
    for code in new:
        (THEME / f"locale/{code}.po").write_bytes(as_bytes(_catalogue(code)))
    (THEME / "locale/messages.pot").write_bytes(as_bytes(texts))
    for file in sorted((THEME / "locale").glob("*.po")):
        with file.open("rb") as stream:
            catalogue = read_po(stream, locale=file.stem)
        catalogue.update(texts, no_fuzzy_matching=True)
        file.write_bytes(as_bytes(catalogue))
        print(f"{file.name}: {len(texts)} texts, {len(untranslated(file.stem))} to translate")


if __name__ == "__main__":
    main(*sys.argv[1:])
