"""Putting a built site in place: written aside, then swapped in by two renames.

The folder is ours where it holds the marker. Nothing else is ever overwritten. At every moment either the old or
the new site stands whole, in its place or beside it; the next run puts right what an interruption left.
"""

from __future__ import annotations

import os
import shutil
from collections.abc import Mapping
from pathlib import Path, PurePosixPath

from moonwrit.errors import RequestError

MARKER = ".moonwrit"
_MARKER_TEXT = "This folder was built by moonwrit and is replaced whole at every build.\n"
_KEPT = ".gitkeep"


def put_in_place(files: Mapping[str, bytes], output: Path, marker: str = _MARKER_TEXT) -> None:
    """Make ``output`` hold exactly ``files`` (relative path with slashes -> content), and the text of the ``marker``.

    A ``.gitkeep`` that was there stays. Raises RequestError where the folder is not ours, where a path would leave
    it, or where it cannot be written; the old site is then untouched.
    """
    output = output.absolute()
    new, old = (output.with_name(f".{output.name}.{word}") for word in ("new", "old"))
    for path in files:
        parts = PurePosixPath(path).parts
        if not parts or path.startswith("/") or ".." in parts or "\\" in path or "\0" in path:
            raise RequestError(f'the page "{path}" would lie outside the output folder', "give it another name")
    try:
        _recover(output, old)
        _refuse_what_is_not_ours(output)
        shutil.rmtree(new, ignore_errors=True)
        _write(files, new, marker, keep=(output / _KEPT).exists())
        if output.exists():
            os.replace(output, old)
        os.replace(new, output)
        shutil.rmtree(old, ignore_errors=True)
    except OSError as fault:
        _recover(output, old)
        shutil.rmtree(new, ignore_errors=True)
        raise RequestError(
            f"{output} cannot be written ({fault.strerror or fault})",
            "free space, or name a folder that can be written and renamed with --output",
        ) from None


def _recover(output: Path, old: Path) -> None:
    """After an interruption between the two renames only the old site is left, aside: put it back."""
    if old.exists():
        if output.exists():
            shutil.rmtree(old, ignore_errors=True)
        else:
            os.replace(old, output)


def _refuse_what_is_not_ours(output: Path) -> None:
    if not output.exists():
        return
    if not output.is_dir() or output.is_symlink():
        raise RequestError(f"{output} is not a folder", "name another with --output")
    there = {entry.name for entry in output.iterdir()} - {_KEPT}
    if there and MARKER not in there:
        raise RequestError(
            f"{output} holds files that moonwrit did not write", "name an empty or a new folder with --output"
        )


def _write(files: Mapping[str, bytes], new: Path, marker: str, *, keep: bool) -> None:
    new.mkdir(parents=True)
    (new / MARKER).write_text(marker, encoding="utf-8")
    if keep:
        (new / _KEPT).touch()
    for path in sorted(files):
        target = new / path
        target.parent.mkdir(parents=True, exist_ok=True)
        target.write_bytes(files[path])
