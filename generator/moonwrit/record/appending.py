"""Adding an entry to a file of the record: at its end, everything that stands there kept as it is."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, TypeVar

import yaml
from pydantic import TypeAdapter

from moonwrit.content import Content
from moonwrit.content.faults import validated
from moonwrit.content.record import Decision, Report
from moonwrit.content.yaml import Document, parse
from moonwrit.errors import RequestError, did_you_mean
from moonwrit.files import put

_HEADS = {
    "reports.yaml": "# Reports of observers, one entry each; entries are only ever added.\n",
    "decisions.yaml": "# Decisions on month starts. A later one supersedes an earlier one, which stays here.\n",
}


Entry = TypeVar("Entry", bound=Report | Decision)


def tried(file: Path, shape: type[Entry], entry: Mapping[str, Any], content: Content) -> tuple[Entry, Document]:
    """The entry as it would be read back, and ``file`` with it at its end.

    Raises ContentError, with the line on which the fault would stand, where the entry is not sound in itself or the
    file is not one to whose end an entry can be added.
    """
    document = parse(_with(file, entry).encode(), file)
    entries: list[Entry] = validated(document, TypeAdapter(list[shape]))  # type: ignore[valid-type]
    made = entries[-1]
    if isinstance(made, Report) and made.place not in content.places:
        raise document.error(
            (len(entries) - 1, "place"), f'place "{made.place}" is not defined',
            did_you_mean(made.place, content.places),
        )
    return made, document


def append(file: Path, entry: Mapping[str, Any]) -> None:
    """Add ``entry`` as the last item of the list in ``file``, which is made where it is not there yet.

    The file is replaced in one step. Raises RequestError where it cannot be written.
    """
    text = _with(file, entry)
    try:
        put(file, text.encode())
    except OSError as fault:
        raise RequestError(f"{file} cannot be written ({fault})", "free space, or mend its permissions") from None


def _with(file: Path, entry: Mapping[str, Any]) -> str:
    """The text of ``file`` with the entry at its end."""
    before = file.read_text(encoding="utf-8") if file.exists() else _HEADS.get(file.name, "")
    if before and not before.endswith("\n"):
        before += "\n"
    values = {key: list(value) if isinstance(value, tuple) else value for key, value in entry.items()}
    text = yaml.safe_dump([values], sort_keys=False, allow_unicode=True, width=100)
    return before + ("\n" if before else "") + text
