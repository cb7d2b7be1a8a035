"""Files as the project reads and writes them."""

from __future__ import annotations

import json
import os
from pathlib import Path

from moonwrit.errors import ContentError


def utf8(data: bytes, file: Path) -> str:
    """The text of a content file, with plain line ends. Raises ContentError, with the line of what is not UTF-8."""
    try:
        return data.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as fault:
        line = data.count(b"\n", 0, fault.start) + 1
        raise ContentError(file, line, "a character is not UTF-8", "save the file as UTF-8") from None


def put(file: Path, content: bytes) -> None:
    """The file whole and on the disk, or as it was; its folder is made where it is missing. Raises OSError."""
    file.parent.mkdir(exist_ok=True)
    aside = file.with_name(f".{file.name}.new")
    with aside.open("wb") as stream:
        stream.write(content)
        stream.flush()
        os.fsync(stream.fileno())
    os.replace(aside, file)


def json_bytes(value: object) -> bytes:
    """Readable JSON in UTF-8, a line feed at its end."""
    return (json.dumps(value, ensure_ascii=False, indent=1, allow_nan=False) + "\n").encode()


__all__ = ["json_bytes", "put", "utf8"]
