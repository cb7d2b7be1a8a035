"""What is slow to compute, kept on disk between runs: safe to delete, to share between processes, and never needed.

``MOONWRIT_CACHE`` names the folder, or is ``off``. Otherwise it is ``moonwrit`` in the user's cache folder (XDG Base
Directory Specification 0.8).
"""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from contextlib import suppress
from hashlib import sha256
from pathlib import Path
from threading import get_ident

_DIGEST = 32


def kept(kind: str, key: object, make: Callable[[], bytes]) -> bytes:
    """What ``make`` gives, from disk where it was kept before.

    ``kind`` is a folder; ``key`` prints all that the result depends on. A file that does not hold what was written is
    made anew, with a note on standard error; a folder that cannot be written is done without.
    """
    where = _folder()
    if where is None:
        return make()
    file = where / kind / sha256(repr(key).encode()).hexdigest()
    found = _read(file)
    if found is None:
        found = make()
        with suppress(OSError):
            _write(file, found)
    return found


def _folder() -> Path | None:
    chosen = os.environ.get("MOONWRIT_CACHE")
    if chosen:
        return None if chosen == "off" else Path(chosen)
    base = os.environ.get("XDG_CACHE_HOME", "")
    try:
        # A relative path is to be ignored, the specification says.
        return (Path(base) if os.path.isabs(base) else Path.home() / ".cache") / "moonwrit"
    except RuntimeError:  # no home
        return None


def _read(file: Path) -> bytes | None:
    try:
        text = file.read_bytes()
    except OSError:
        return None
    digest, found = text[:_DIGEST], text[_DIGEST:]
    if sha256(found).digest() == digest:
        return found
    print(f"moonwrit: {file} is damaged and is made anew", file=sys.stderr)
    return None


def _write(file: Path, content: bytes) -> None:
    """Written aside and renamed, so that another process sees the whole file or none."""
    file.parent.mkdir(parents=True, exist_ok=True)
    aside = file.with_name(f".{file.name}.{os.getpid()}.{get_ident()}")
    try:
        aside.write_bytes(sha256(content).digest() + content)
        os.replace(aside, file)
    finally:
        aside.unlink(missing_ok=True)


__all__ = ["kept"]
