"""The demonstration community, made smaller for tests that build it often."""

from __future__ import annotations

import json
import re
import shutil
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from click.testing import CliRunner, Result

from moonwrit.cli import main

ROOT = Path(__file__).resolve().parent.parent


def one_language(content: Path) -> None:
    """Only the default language; the lines of the file keep their numbers."""
    site = content / "site.yaml"
    text = site.read_text(encoding="utf-8")
    site.write_text(re.sub(r"(?m)^languages:.*$", "# one language", text), encoding="utf-8")


@dataclass(frozen=True)
class Desk:
    """An officer's copy of the content, and the site built from it."""

    content: Path
    output: Path

    def try_to(self, now: str, *words: str) -> Result:
        """A command at a moment."""
        at = str(int(datetime.fromisoformat(now).timestamp()))
        return CliRunner(env={"SOURCE_DATE_EPOCH": at}).invoke(main, [*words, "--content", str(self.content)])

    def do(self, now: str, *words: str, exit_code: int = 0) -> str:
        """A command at a moment, which must end so; what it says."""
        done = self.try_to(now, *words)
        assert done.exit_code == exit_code, done.output
        return done.output

    def publish(self, now: str, exit_code: int = 0) -> str:
        return self.do(now, "publish", "--output", str(self.output), exit_code=exit_code)

    def decide(self, now: str, month: str, starts: str, basis: str, *more: str) -> None:
        given = ("--month", month, "--starts", starts, "--basis", basis, "--by", "The committee")
        self.do(now, "record", "decision", *given, *more)

    def change(self, file: str, old: str, new: str) -> None:
        text = (self.content / file).read_text(encoding="utf-8")
        assert text.count(old) == 1
        (self.content / file).write_text(text.replace(old, new), encoding="utf-8")

    def lines(self) -> list[dict[str, object]]:
        text = (self.content / "record/journal.jsonl").read_text(encoding="utf-8")
        return [json.loads(line) for line in text.splitlines()]


def desk_of_one_year(folder: Path) -> Desk:
    """The demonstration for 1448 alone, in one language, with nothing on record."""
    desk = Desk(folder / "content", folder / "output")
    shutil.copytree(ROOT / "content", desk.content, ignore=shutil.ignore_patterns("record"))
    one_language(desk.content)
    desk.change("site.yaml", "years: {from: 1447, to: 1449}", "years: {from: 1448, to: 1448}")
    return desk
