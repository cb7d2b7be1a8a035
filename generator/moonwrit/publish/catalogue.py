"""Message catalogues: the texts of templates and code in each language, in ``themes/moonwrit/locale/<code>.po``.

A translator edits the ``.po`` file; ``make catalogues`` brings new texts into it, and ``moonwrit check`` says how many
are missing in a language of the site.
"""

from __future__ import annotations

from functools import cache
from gettext import GNUTranslations, NullTranslations
from io import BytesIO
from pathlib import Path

from babel.messages.catalog import Catalog
from babel.messages.mofile import write_mo
from babel.messages.pofile import read_po

from moonwrit.resources import themes_folder

SOURCE = "en"
"""The language in which the texts are written."""


def folder() -> Path:
    return themes_folder() / "moonwrit" / "locale"


@cache
def translations(code: str) -> NullTranslations:
    """The catalogue of a language (``fr-CA``, or else ``fr``); texts as they are written where there is none."""
    catalogue = _read(code)
    if catalogue is None:
        return NullTranslations()
    out = BytesIO()
    write_mo(out, catalogue)
    out.seek(0)
    return GNUTranslations(out)


def untranslated(code: str) -> list[str]:
    """The texts that a language lacks, in the order of the templates; those marked fuzzy count as lacking."""
    if code.partition("-")[0] == SOURCE:
        return []
    catalogue = _read(code)
    with (folder() / "messages.pot").open("rb") as file:
        wanted = [message for message in read_po(file) if message.id]
    texts = [message.id if isinstance(message.id, str) else message.id[0] for message in wanted]
    if catalogue is None:
        return texts
    return [text for text in texts if (found := catalogue.get(text)) is None or not _is_whole(found)]


def _is_whole(message: object) -> bool:
    string, fuzzy = getattr(message, "string", ""), getattr(message, "fuzzy", False)
    return not fuzzy and (bool(string) if isinstance(string, str) else all(string))


def _read(code: str) -> Catalog | None:
    for name in (code, code.partition("-")[0]):
        file = folder() / f"{name}.po"
        if file.is_file():
            with file.open("rb") as stream:
                return read_po(stream, locale=name.replace("-", "_"), abort_invalid=True)
    return None


__all__ = ["SOURCE", "folder", "translations", "untranslated"]
