"""What can go wrong, one class per exit code. Every message says where, what, and how to mend it."""

from __future__ import annotations

import re
from collections.abc import Iterable
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from pathlib import Path

# What would begin a line, command a terminal, turn the writing, or not be writable: names of files may hold all of it.
_UNSAID = r"[\x00-\x1f\x7f-\x9f\u2028-\u202e\u2066-\u2069\ud800-\udfff]"


class MoonwritError(Exception):
    """Base of every error that a user can mend. ``exit_code`` is what the command returns."""

    exit_code = 1

    def __init__(self, what: str, mend: str = "") -> None:
        super().__init__(what)
        self.what = what
        self.mend = mend

    def __str__(self) -> str:
        return f"{self.what}; {self.mend}" if self.mend else self.what


class RequestError(MoonwritError):
    """The request cannot be met: a year outside the ephemeris, an unknown policy, an output folder not ours."""


class ContentError(MoonwritError):
    """A content file is at fault. Prints as ``file:line: what; how to mend it``.

    ``line`` counts from 1; 0 means the file as a whole.
    """

    def __init__(self, file: Path | str, line: int, what: str, mend: str = "") -> None:
        super().__init__(what, mend)
        self.file = file
        self.line = line

    def __str__(self) -> str:
        where = f"{self.file}:{self.line}" if self.line else f"{self.file}"
        return re.sub(_UNSAID, "\ufffd", f"{where}: {super().__str__()}")


class UsageError(MoonwritError):
    """The command's words are wrong (exit code 2)."""

    exit_code = 2


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """A hint naming the nearest known spelling, or else all that is known."""
    import difflib

    names = sorted(known)
    near = difflib.get_close_matches(word, names, n=1, cutoff=0.6)
    if near:
        return f'did you mean "{near[0]}"?'
    return f"known here: {', '.join(names)}" if names else "none is defined yet"
