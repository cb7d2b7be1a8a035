"""Message catalogues: the texts of templates and code in each language, in ``themes/moonwrit/locale/<code>.po``.

A translator edits the ``.po`` file; ``make catalogues`` brings new texts into it, and ``moonwrit check`` says how many
are missing in a language of the site. What a translation says is text, and never markup; one with other places for
values than its original is refused, and so is a file that is no catalogue.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from functools import cache
from gettext import GNUTranslations, NullTranslations, c2py
from io import BytesIO
from pathlib import Path

from babel.messages.catalog import Catalog
from babel.messages.mofile import write_mo
from babel.messages.pofile import PoFileError, read_po

from moonwrit.errors import ContentError
from moonwrit.files import utf8
from moonwrit.resources import themes_folder

SOURCE = "en"
"""The language in which the texts are written."""
MAX_BYTES = 2 * 1024 * 1024
MAX_FORMS = 6
"""Of plurals: Arabic has so many, and no language more."""
_PLACE = re.compile(r"%(?:\(\w*\).?|.|$)", re.DOTALL)
_ISOLATES = re.compile("[\u2066-\u2068]")
_JOINED, _FORMS = re.compile(r'"\s*"'), re.compile(r"nplurals\s*=\s*(\d+)")
_CHARSET = re.compile(r"(?i)Content-Type:[^\n]*?charset=([^\s;\"\\]*)")
_REFUSED = re.compile(r"[\x00-\x09\x0b-\x1f\x7f-\x9f\u2028-\u202e\ufeff\ufffe\uffff]")


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
            return read(file)
    return None


def read(file: Path) -> Catalog:
    """The catalogue in ``file``. Raises ContentError."""
    with file.open("rb") as stream:
        data = stream.read(MAX_BYTES + 1)
    if len(data) > MAX_BYTES:
        raise ContentError(file, 0, f"the catalogue is larger than {MAX_BYTES // 1024 // 1024} MB", "shorten it")
    head = _JOINED.sub("", utf8(data, file))
    try:
        if any(int(number) > MAX_FORMS for number in _FORMS.findall(head)):
            raise ValueError(f"more than {MAX_FORMS} plural forms")
        if others := {name for name in _CHARSET.findall(head) if name.lower() != "utf-8"}:
            raise ValueError(f"its charset is {min(others)}, not utf-8")
        catalogue = read_po(BytesIO(data), locale=file.stem.replace("-", "_"), charset="utf-8", abort_invalid=True)
        form_of = c2py(catalogue.plural_expr)
        forms = [form_of(number) for number in range(1000)]
    except PoFileError as fault:
        mend = "look at the quotes here"
        raise ContentError(file, fault.lineno + 1, f"this is no catalogue ({fault})", mend) from None
    except (ValueError, LookupError, ArithmeticError, AttributeError, RecursionError) as fault:
        what = f"this is no catalogue ({' '.join(str(fault).split())[:100]})"
        raise ContentError(file, 0, what, "mend its head: take that of another catalogue") from None
    if min(forms) < 0 or max(forms) >= catalogue.num_plurals:
        raise ContentError(file, 0, "Plural-Forms names a form that there is not", "take that of gettext's manual")
    for line, what, mend in _faults(catalogue):
        raise ContentError(file, line, what, mend)
    return catalogue


def _faults(catalogue: Catalog) -> Iterator[tuple[int, str, str]]:
    for message in catalogue:
        if not message.id:
            continue
        originals, texts = (
            [one] if isinstance(one, str) else list(one or ()) for one in (message.id, message.string)
        )
        places = {place for text in originals for place in _PLACE.findall(text)}
        for text in texts:
            if refused := _REFUSED.search(text):
                yield message.lineno or 0, f"the character U+{ord(refused[0]):04X} is written here", "remove it"
            if text.count("\u2069") != len(_ISOLATES.findall(text)):
                yield message.lineno or 0, "the writing is turned and not turned back", "end each isolate with U+2069"
            if "\n" in text and not any("\n" in one for one in originals):
                yield message.lineno or 0, "the translation has several lines", "write it in one, without \\n"
            for place in set(_PLACE.findall(text)) - places:
                known = f"those of the original: {', '.join(sorted(places)) or 'none'}"
                yield message.lineno or 0, f'the place "{place}" is not in the original', f"write {known}"


__all__ = ["SOURCE", "folder", "read", "translations", "untranslated"]
