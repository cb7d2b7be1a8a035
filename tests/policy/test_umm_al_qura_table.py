"""The reference table of the Umm al-Qura calendar still says what ICU and java.time say."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from itertools import pairwise
from typing import Any

import pytest
from policy_values import REFERENCE, umm_al_qura

MAKERS = REFERENCE / "makers"


def test_table_has_every_month_once_and_of_29_or_30_days() -> None:
    rows = umm_al_qura()
    every_month = [(year, month) for year in range(1300, 1601) for month in range(1, 13)]
    assert [(year, month) for year, month, _ in rows] == every_month
    assert {(later - earlier).days for (_, _, earlier), (_, _, later) in pairwise(rows)} == {29, 30}


@pytest.mark.judge("node")
def test_table_is_what_icu_says(node: Callable[..., Any]) -> None:
    said = node(MAKERS / "umm_al_qura.js")["rows"]
    assert umm_al_qura() == [(year, month, date.fromisoformat(starts)) for year, month, starts in said]


@pytest.mark.judge("java")
def test_table_is_what_java_time_says(java: Callable[..., str]) -> None:
    lines = java(MAKERS / "UmmAlQura.java").splitlines()
    said = [line.split(",") for line in lines if not line.startswith("#")]
    assert umm_al_qura() == [(int(year), int(month), date.fromisoformat(starts)) for year, month, starts in said]
