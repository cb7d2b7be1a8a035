"""A new content folder to start from: the demonstration without its record, and schemas for editors."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

from moonwrit.content import schemas
from moonwrit.resources import starter_folder

_FOLDER = "schema"


def begin(folder: Path) -> None:
    """Write the files into ``folder``, which is empty or not there. Raises OSError."""
    # The demonstration's record and journal are its own: a new community begins without.
    shutil.copytree(starter_folder(), folder, dirs_exist_ok=True, ignore=shutil.ignore_patterns("record"))
    (folder / _FOLDER).mkdir(exist_ok=True)
    for name, schema in schemas().items():
        beside = f"{Path(name).stem}.schema.json"
        text = json.dumps(schema, ensure_ascii=False, indent=1) + "\n"
        (folder / _FOLDER / beside).write_text(text, encoding="utf-8", newline="\n")
        file = folder / name
        if file.is_file():
            # Editors that know YAML find the schema by this line.
            line = f"# yaml-language-server: $schema={_FOLDER}/{beside}\n"
            file.write_text(line + file.read_text(encoding="utf-8"), encoding="utf-8", newline="\n")


__all__ = ["begin"]
