"""What the files of a site are put together from: pieces, each made from values alone.

A piece whose values are those of the last build is taken from the site that build left; the others are made, in several
processes where there are many. Either way the bytes are equal.
"""

from __future__ import annotations

import json
import os
import signal
import sys
import warnings
import zlib
from collections.abc import Callable, Container, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from hashlib import blake2b
from multiprocessing import get_context
from multiprocessing.connection import Connection, wait
from pathlib import Path
from threading import current_thread, main_thread
from typing import Any

from moonwrit import cache
from moonwrit.digests import SIZE, Digests
from moonwrit.publish.writing import ChangedMeanwhileError, Stamp, stamp
from moonwrit.resources import program_files

_WORTH_IT = 200
"""So many pieces are made sooner by several processes than by one."""
_SHARES = 12
"""Runs of pieces for each process, so that all end at about the same time."""
_SITES = 100
"""Sites of which a note is kept: up to 2 MB each."""


@dataclass(frozen=True, slots=True)
class Piece:
    """``key`` is the digest of all that ``make`` makes it from."""

    key: bytes
    make: Callable[[], bytes]


Parts = tuple[Piece, ...]
"""What a file is made of, one after the other."""
Files = Mapping[str, Parts]
"""Path -> its parts."""


class Pieces:
    """Makes pieces of a function and what it is given: frozen values that ``digests`` knows."""

    def __init__(self) -> None:
        self._digests = Digests()

    def of(self, make: Callable[..., bytes], *given: Any) -> Piece:
        return Piece(self._digests.of(make, given), lambda: make(*given))


def plain(content: bytes) -> Piece:
    """A piece that is there already."""
    return Piece(blake2b(content, digest_size=SIZE).digest(), lambda: content)


def made(files: Files, before: Before, processes: int) -> dict[bytes, bytes]:
    """Every piece by its key: from ``before`` where it is there, the others made. Raises what their making raises."""
    wanted = {piece.key: piece for parts in files.values() for piece in parts}
    found = before.pieces(wanted)
    missing = [piece for key, piece in wanted.items() if key not in found]
    if processes > 1 and len(missing) >= _WORTH_IT and sys.platform == "linux":
        found.update(_by_many(missing, processes))
    # Those left over have failed in another process: here they fail where it can be seen.
    found.update((piece.key, piece.make()) for piece in missing if piece.key not in found)
    return found


def joined(files: Files, pieces: Mapping[bytes, bytes]) -> dict[str, bytes]:
    """Path -> content."""
    return {path: b"".join([pieces[piece.key] for piece in parts]) for path, parts in files.items()}


# --- many processes -------------------------------------------------------------------------------


def _by_many(missing: Sequence[Piece], processes: int) -> Iterator[tuple[bytes, bytes]]:
    """What could be made of ``missing``. Each process is a copy of this one (fork), with all that pieces are made from;
    it ends when nobody reads what it sends."""
    size = max(1, len(missing) // (processes * _SHARES))
    runs = [missing[start:start + size] for start in range(0, len(missing), size)]
    context = get_context("fork")
    ends = [context.Pipe(duplex=False) for _ in range(processes)]
    readers = {reader for reader, _ in ends}
    workers = []
    try:
        with _uninterrupted(), warnings.catch_warnings():
            # The threads of linear algebra are at rest, and the copy asks nothing of them that they hold.
            warnings.simplefilter("ignore", DeprecationWarning)
            for number, (_, writer) in enumerate(ends):
                worker = context.Process(target=_work, args=(runs[number::processes], writer, readers), daemon=True)
                worker.start()
                writer.close()
                workers.append(worker)
        while readers:
            for reader in wait(list(readers)):
                assert isinstance(reader, Connection)
                try:
                    yield from reader.recv()
                except (EOFError, OSError):
                    readers.discard(reader)
                    reader.close()
    finally:
        for reader in readers:
            reader.close()
        for worker in workers:
            worker.terminate()
            worker.join()


@contextmanager
def _uninterrupted() -> Iterator[None]:
    """An interruption is heard afterwards: within a fork Python would print it and go on."""
    if current_thread() is not main_thread():  # which alone hears of it
        yield
        return
    heard = []
    before = signal.signal(signal.SIGINT, lambda *_: heard.append(True))
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)
    if heard:
        signal.raise_signal(signal.SIGINT)


def _work(runs: Sequence[Sequence[Piece]], writer: Connection, readers: set[Connection]) -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # the process that was asked tells the others
    for reader in readers:
        reader.close()
    for run in runs:
        found = []
        for piece in run:
            try:
                found.append((piece.key, piece.make()))
            except Exception:  # made again, and reported, by the process that was asked
                continue
        try:
            writer.send(found)
        except OSError:
            break
    writer.close()
    os._exit(0)


# --- the last build -------------------------------------------------------------------------------


class Before(Mapping[str, bytes]):
    """The site that the last build left in a folder, by the note that it left in the cache: of each file its stamp (see
    ``writing``) and the parts that it was made of. A file with another stamp now is not what was built."""

    def __init__(self, output: Path | None, theme: Path | None) -> None:
        self._output = output
        self._program = _program_digest(theme)
        self._files: dict[str, tuple[Stamp, list[tuple[bytes, int]]]] = {}
        if output is None:
            return
        try:
            note = cache.recalled("sites", os.path.abspath(output))
            program, files = json.loads(zlib.decompress(note)) if note else ("", {})
            if program == self._program:
                self._files = {
                    path: ((ino, size, at), [(bytes.fromhex(key), length) for key, length in parts])
                    for path, ((ino, size, at), parts) in files.items()
                }
        except (ValueError, TypeError, AttributeError, zlib.error):
            self._files = {}

    def kept(self, files: Files) -> dict[str, Stamp]:
        """Those files that stand as they would be made, with their stamps."""
        out = {}
        for path, parts in files.items():
            known = self._files.get(path)
            if known and [key for key, _ in known[1]] == [piece.key for piece in parts] and self._stands(path):
                out[path] = known[0]
        return out

    def pieces(self, wanted: Container[bytes]) -> dict[bytes, bytes]:
        """Those of the pieces wanted that are in the files which stand."""
        found: dict[bytes, bytes] = {}
        for path, (_, parts) in self._files.items():
            if not any(key in wanted and key not in found for key, _ in parts):
                continue
            if (content := self._content(path)) is not None:
                at = 0
                for key, length in parts:
                    if key in wanted:
                        found[key] = content[at:at + length]
                    at += length
        return found

    def __getitem__(self, path: str) -> bytes:
        """Raises ChangedMeanwhileError where the file is not, or no longer, what was built."""
        if path not in self._files:
            raise KeyError(path)
        if (content := self._content(path)) is None:
            raise ChangedMeanwhileError(path)
        return content

    def __iter__(self) -> Iterator[str]:
        return iter(self._files)

    def __len__(self) -> int:
        return len(self._files)

    def _stands(self, path: str) -> bool:
        assert self._output is not None
        return stamp(os.path.join(self._output, path)) == self._files[path][0]

    def _content(self, path: str) -> bytes | None:
        """What stands, if it is what was built: another build may put its own there at any moment."""
        assert self._output is not None
        try:
            with open(self._output / path, "rb") as file:
                return file.read() if stamp(file.fileno()) == self._files[path][0] else None
        except OSError:
            return None

    def note(self, output: Path, files: Files, made: Mapping[bytes, bytes], stamps: Mapping[str, Stamp]) -> None:
        """Note what each file that now stands in the folder was made of."""
        lengths = {key: length for _, parts in self._files.values() for key, length in parts}
        lengths |= {key: len(content) for key, content in made.items()}
        noted = {
            path: (stamps[path], [(piece.key.hex(), lengths[piece.key]) for piece in parts])
            for path, parts in files.items()
        }
        text = json.dumps([self._program, noted], separators=(",", ":"))
        cache.keep("sites", os.path.abspath(output), zlib.compress(text.encode(), 1), most=_SITES)


def forget(output: Path) -> None:
    """Drop the note of a folder that goes away."""
    cache.drop("sites", os.path.abspath(output))


def _program_digest(theme: Path | None) -> str:
    """Of all that pages are made by: the program, its themes, a community's own, Python and the packages installed."""
    found = blake2b(sys.version.encode(), digest_size=SIZE)
    for file in program_files(theme):
        found.update(f"{file}\0".encode() + file.read_bytes())
    for folder in map(Path, sys.path):
        found.update(" ".join(sorted(one.name for one in folder.glob("*.dist-info"))).encode())
    return found.hexdigest()


__all__ = ["Before", "Files", "Parts", "Piece", "Pieces", "forget", "joined", "made", "plain"]
