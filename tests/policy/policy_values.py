"""Reading the recorded and published month starts in tests/reference (sources at the head of each file)."""

from __future__ import annotations

import csv
from datetime import date
from pathlib import Path

REFERENCE = Path(__file__).resolve().parent.parent / "reference"


def rows(name: str) -> list[dict[str, str]]:
    """The rows of a file below tests/reference, without the comments at its head."""
    lines = (REFERENCE / name).read_text(encoding="utf-8").splitlines()
    found = list(csv.DictReader(line for line in lines if not line.startswith("#")))
    assert found, f"{name} is empty"
    return found


def umm_al_qura() -> list[tuple[int, int, date]]:
    """Hijri year, month and first civil day of each month, in the file's order."""
    return [
        (int(row["year"]), int(row["month"]), date.fromisoformat(row["starts"]))
        for row in rows("umm_al_qura.csv")
    ]
