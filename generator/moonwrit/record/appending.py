"""Adding an entry to a file of the record: at its end, everything that stands there kept as it is."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any, TypeVar

import yaml
from pydantic import TypeAdapter

from moonwrit.content import Content
from moonwrit.content.faults import validated
from moonwrit.content.record import Decision, Report
from moonwrit.content.yaml import parse
from moonwrit.errors import RequestError, did_you_mean

_HEADS = {
    "reports.yaml": "# Reports of observers, one entry each; entries are only ever added.\n",
    "decisions.yaml": "# Decisions on month starts. A later one supersedes an earlier one, which stays here.\n",
}


Entry = TypeVar("Entry", bound=Report | Decision)


def tried(file: Path, shape: type[Entry], entry: Mapping[str, Any], content: Content) -> Entry:
    """The entry as it would be read back. Raises ContentError where it is not sound in itself.

    ``file`` gives the name and, for errors, the line on which the entry would stand.
    """
    text = _text(entry)
    document = parse(text.encode(), file)
    made: list[Entry] = validated(document, TypeAdapter(list[shape]))  # type: ignore[valid-type]
    if isinstance(made[0], Report) and made[0].place not in content.places:
        raise document.error(
            (0, "place"), f'place "{made[0].place}" is not defined', did_you_mean(made[0].place, content.places)
        )
    return made[0]


def append(file: Path, entry: Mapping[str, Any]) -> None:
    """Add ``entry`` as the last item of the list in ``file``, which is made where it is not there yet.

    The file is replaced in one step. Raises RequestError where it cannot be written.
    """
    text = _text(entry)
    try:
        file.parent.mkdir(parents=True, exist_ok=True)
        before = file.read_text(encoding="utf-8") if file.exists() else _HEADS.get(file.name, "")
        if before and not before.endswith("\n"):
            before += "\n"
        aside = file.with_name(f".{file.name}.new")
        aside.write_text(before + ("\n" if before else "") + text, encoding="utf-8")
        os.replace(aside, file)
    except (OSError, UnicodeDecodeError) as fault:
        raise RequestError(f"{file} cannot be written ({fault})", "free space, or mend its permissions") from None


def _text(entry: Mapping[str, Any]) -> str:
    values = {key: list(value) if isinstance(value, tuple) else value for key, value in entry.items()}
    return yaml.safe_dump([values], sort_keys=False, allow_unicode=True, width=100)
