"""Putting a built site in place: written aside, then swapped in by two renames.

The folder is ours where it holds the marker. Nothing else is ever overwritten. At every moment either the old or
the new site stands whole, in its place or beside it; the next run puts right what an interruption left. Of two
builds into one folder the second waits for the first.
"""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path, PurePosixPath
from types import MappingProxyType
from typing import Any

from moonwrit.errors import RequestError

MARKER = ".moonwrit"
_MARKER_TEXT = "This folder was built by moonwrit and is replaced whole at every build.\n"
_KEPT = ".gitkeep"
_NONE: Mapping[str, Any] = MappingProxyType({})


Stamp = tuple[int, int, int]
"""What tells a file from one that was written later under its name: inode, size, and time of change in nanoseconds."""


class ChangedMeanwhileError(Exception):
    """A file that was to be kept is no longer the same: another build was put in place first."""


def stamp(file: str | int) -> Stamp | None:
    """Of a path, or of an open file; None where there is no such file."""
    try:
        found = os.fstat(file) if isinstance(file, int) else os.lstat(file)
    except OSError:
        return None
    return found.st_ino, found.st_size, found.st_mtime_ns


def put_in_place(
    files: Mapping[str, bytes], output: Path, marker: str = _MARKER_TEXT, kept: Mapping[str, Stamp] = _NONE
) -> dict[str, Stamp]:
    """Make ``output`` hold exactly ``files`` (relative path with slashes -> content), what is ``kept`` of the old site,
    and the text of the ``marker``. Returns the stamp of each file.

    A ``.gitkeep`` that was there stays. Raises RequestError where the folder is not ours, where a path would leave
    it, or where it cannot be written, and ChangedMeanwhileError; the old site is then untouched.
    """
    for path in (*files, *kept):
        parts = PurePosixPath(path).parts
        if not parts or path.startswith("/") or ".." in parts or "\\" in path or "\0" in path:
            raise RequestError(f'the page "{path}" would lie outside the output folder', "give it another name")
    output = Path(os.path.abspath(output))
    try:
        output.parent.mkdir(parents=True, exist_ok=True)
        with _alone_in(output.parent):
            return _swap(files, output, marker, kept)
    except OSError as fault:
        raise RequestError(
            f"{output} cannot be written ({fault.strerror or fault})",
            "free space, or name a folder that can be written and renamed with --output",
        ) from None


@contextmanager
def _alone_in(folder: Path) -> Iterator[None]:
    """Wait until no other build writes in ``folder``. The lock ends with the process, however that ends."""
    if sys.platform == "win32":  # which cannot lock a folder
        yield
        return
    import fcntl

    opened = os.open(folder, os.O_RDONLY)
    try:
        with suppress(OSError):  # some network file systems have no locks
            fcntl.flock(opened, fcntl.LOCK_EX)
        yield
    finally:
        os.close(opened)


def _swap(
    files: Mapping[str, bytes], output: Path, marker: str, kept: Mapping[str, Stamp]
) -> dict[str, Stamp]:
    new, old = (output.parent / f".{output.name}.moonwrit-{word}" for word in ("new", "old"))
    _settle(output, new, old)
    _refuse_what_is_not_ours(output)
    try:
        _write(files, new, marker, keep=(output / _KEPT).exists())
        _keep(kept, output, new)
        # Before the swap: afterwards another build may be in its place.
        stamps = {path: found for path in (*files, *kept) if (found := stamp(os.path.join(new, path))) is not None}
        if output.exists():
            os.replace(output, old)
        os.replace(new, output)
        return stamps
    finally:
        _settle(output, new, old)


def _settle(output: Path, new: Path, old: Path) -> None:
    """Leave nothing aside. After an interruption between the two renames only the old site is left: put it back."""
    if old.exists() and not output.exists():
        os.replace(old, output)
    for aside in (new, old):
        shutil.rmtree(aside, ignore_errors=True)
        if aside.is_dir():  # its folders were made read-only
            for folder, _, _ in os.walk(aside):
                with suppress(OSError):
                    os.chmod(folder, 0o700)
            shutil.rmtree(aside, ignore_errors=True)


def _refuse_what_is_not_ours(output: Path) -> None:
    if output.is_symlink():
        raise RequestError(f"{output} is a link", "name the folder itself with --output")
    if not output.exists():
        return
    if not output.is_dir():
        raise RequestError(f"{output} is not a folder", "name another with --output")
    there = {entry.name for entry in output.iterdir()} - {_KEPT}
    if there and MARKER not in there:
        raise RequestError(
            f"{output} holds files that moonwrit did not write", "name an empty or a new folder with --output"
        )


def _write(files: Mapping[str, bytes], new: Path, marker: str, *, keep: bool) -> None:
    new.mkdir()
    (new / MARKER).write_text(marker, encoding="utf-8")
    if keep:
        (new / _KEPT).touch()
    for target, path in _targets(files, new):
        with open(target, "wb") as file:
            file.write(files[path])


def _keep(kept: Mapping[str, Stamp], output: Path, new: Path) -> None:
    """The same file in the old site and the new one, until the old one is removed; a copy, as old as the file, where
    that cannot be, or where others may read and write the file than what is written now."""
    access = _access(os.path.join(new, MARKER))
    for target, path in _targets(kept, new):
        source = os.path.join(output, path)
        if stamp(source) != kept[path]:
            raise ChangedMeanwhileError(path)
        if _access(source) == access:
            with suppress(OSError):
                os.link(source, target)
                continue
        shutil.copyfile(source, target)
        os.utime(target, ns=(kept[path][2], kept[path][2]))


def _access(file: str) -> tuple[int, int, int]:
    found = os.lstat(file)
    return found.st_mode, found.st_uid, found.st_gid


def _targets(paths: Iterable[str], new: Path) -> Iterator[tuple[str, str]]:
    """Where each path comes to lie, in a folder that is there."""
    there = set()
    for path in sorted(paths):
        target = os.path.join(new, path)
        folder = os.path.dirname(target)
        if folder not in there:
            os.makedirs(folder, exist_ok=True)
            there.add(folder)
        yield target, path
