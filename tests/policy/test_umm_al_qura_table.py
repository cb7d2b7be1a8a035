"""The reference table of the Umm al-Qura calendar still says what ICU and java.time say."""

from __future__ import annotations

import csv
from collections.abc import Callable
from datetime import date
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest

REFERENCE = Path(__file__).parent.parent / "reference"
MAKERS = REFERENCE / "makers"

Row = tuple[int, int, date]


def table() -> list[Row]:
    lines = (REFERENCE / "umm_al_qura.csv").read_text(encoding="utf-8").splitlines()
    rows = csv.DictReader(line for line in lines if not line.startswith("#"))
    return [(int(row["year"]), int(row["month"]), date.fromisoformat(row["starts"])) for row in rows]


def test_table_has_every_month_once_and_of_29_or_30_days() -> None:
    rows = table()
    every_month = [(year, month) for year in range(1300, 1601) for month in range(1, 13)]
    assert [(year, month) for year, month, _ in rows] == every_month
    assert {(later - earlier).days for (_, _, earlier), (_, _, later) in pairwise(rows)} == {29, 30}


@pytest.mark.judge("node")
def test_table_is_what_icu_says(node: Callable[..., Any]) -> None:
    said = node(MAKERS / "umm_al_qura.js")["rows"]
    assert table() == [(year, month, date.fromisoformat(starts)) for year, month, starts in said]


@pytest.mark.judge("java")
def test_table_is_what_java_time_says(java: Callable[..., str]) -> None:
    lines = java(MAKERS / "UmmAlQura.java").splitlines()
    said = [line.split(",") for line in lines if not line.startswith("#")]
    assert table() == [(int(year), int(month), date.fromisoformat(starts)) for year, month, starts in said]
