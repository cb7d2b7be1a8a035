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
    """What ``make`` gives, from disk where it was kept before."""
    found = recalled(kind, key)
    if found is None:
        found = make()
        keep(kind, key, found)
    return found


def recalled(kind: str, key: object) -> bytes | None:
    """What was kept last, or None; with a note on standard error where the file does not hold what was written.

    ``kind`` is a folder; ``key`` prints all that the result depends on.
    """
    file = _file(kind, key)
    return None if file is None else _read(file)


def keep(kind: str, key: object, content: bytes, most: int | None = None) -> None:
    """Keep it; of its kind no more than ``most``, those kept last. A folder that cannot be written is done without."""
    file = _file(kind, key)
    if file is None:
        return
    with suppress(OSError):
        _write(file, content)
        if most is not None:
            there = sorted(file.parent.iterdir(), key=lambda one: one.stat().st_mtime, reverse=True)
            for old in there[most:]:
                old.unlink(missing_ok=True)


def drop(kind: str, key: object) -> None:
    """What nobody will ask for again."""
    file = _file(kind, key)
    if file is not None:
        with suppress(OSError):
            file.unlink()


def _file(kind: str, key: object) -> Path | None:
    where = _folder()
    return None if where is None else where / kind / sha256(repr(key).encode()).hexdigest()


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


__all__ = ["drop", "keep", "kept", "recalled"]
