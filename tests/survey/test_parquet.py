"""The Parquet tables of a survey read back by DuckDB, whose reader is its own; the extra that they need."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import duckdb
import pytest
from click.testing import CliRunner

from moonwrit.cli import main
from moonwrit.survey import parquet
from moonwrit.survey.parquet import write_parquet
from moonwrit.survey.plan import Place, Plan
from moonwrit.survey.results import gather
from moonwrit.survey.running import run

NAMES = ('Port "A", north', "Nuuk and\nnear", "NA", "1448", "Ürümqi")
"""What a careless reader of CSV takes for two cells, two rows, nothing, a number, or other letters."""
PLACES = tuple(Place(name, 20.0 * index - 40, 0.1, 0.0, None) for index, name in enumerate(NAMES))
WORDS = ("survey", "--content", "none", "--policy", "lag-48", "--policy", "tabular-16-civil", "--place", "Cairo,30,31",
         "--from", "1440")


def surveyed(folder: Path, policies: tuple[str, ...] = ("mabims-2021", "tabular-16-civil"),
             places: tuple[Place, ...] = PLACES) -> dict[str, list[dict[str, Any]]]:
    """The rows of each table as ``survey.json`` has them, which is not made from the tables."""
    asked = Plan(policies, places, None, 1440, 1440)
    run(asked, folder)
    gather(asked, folder)
    listed = json.loads((folder / "survey.json").read_bytes())["places"]
    return {
        "policies": [row for place in listed for row in place["policies"]],
        "agreement": [row for place in listed for row in place["agreement"]],
        "places": [{key: place[key] for key in place if key not in ("policies", "agreement")} for place in listed],
    }


def answer(query: str) -> list[Any]:
    relation = duckdb.sql(query)
    assert relation is not None
    return relation.fetchall()


def read(path: Path) -> list[dict[str, Any]]:
    found = duckdb.from_parquet(str(path))
    return [dict(zip(found.columns, row, strict=True)) for row in found.fetchall()]


@pytest.mark.parametrize("block", [1 << 24, 700])
def test_a_foreign_reader_finds_the_rows_of_the_results(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, block: int
) -> None:
    """Columns, their order, types and values are those of survey.json, in one group of rows and in many."""
    monkeypatch.setattr(parquet, "_BLOCK", block)
    rows = surveyed(tmp_path)
    write_parquet(tmp_path)
    for name, expected in rows.items():
        found = read(tmp_path / f"{name}.parquet")
        assert found == expected
        assert [[type(cell) for cell in row.values()] for row in found] == [
            [type(cell) for cell in row.values()] for row in expected]
        assert list(found[0]) == (tmp_path / f"{name}.csv").read_text(encoding="utf-8").split("\n")[0].split(",")
    groups = answer(f"SELECT DISTINCT row_group_id FROM parquet_metadata('{tmp_path / 'policies.parquet'}')")
    assert (len(groups) > 1) == (block == 700)


def test_what_is_empty_is_null(tmp_path: Path) -> None:
    """At the pole no Sun sets on an eve of 1440 AH: ages are null, of their type. One policy has no pairs: no rows."""
    rows = surveyed(tmp_path, ("tabular-16-civil",), (Place("Pole", 90.0, 0.0, 0.0, None),))
    write_parquet(tmp_path)
    assert read(tmp_path / "policies.parquet") == rows["policies"]
    assert rows["policies"][0]["age_least_h"] is None
    assert read(tmp_path / "agreement.parquet") == []
    types = dict(answer(
        f"SELECT column_name, column_type FROM (DESCRIBE SELECT * FROM '{tmp_path / 'policies.parquet'}')"))
    assert {types[name] for name in ("age_least_h", "age_mean_h", "latitude_deg")} == {"DOUBLE"}
    assert {types[name] for name in ("age_least_month", "longest_29_from", "place")} == {"VARCHAR"}
    assert {types[name] for name in ("months", "of_29", "unsettled_seams")} == {"INTEGER"}


def test_equal_tables_give_equal_bytes(tmp_path: Path) -> None:
    """The command writes the same bytes in another time zone, place, order of hashes and moment; no time is kept."""
    for name, zone, seed in (("here", "UTC", "1"), ("there", "Pacific/Auckland", "2")):
        done = subprocess.run(
            [sys.executable, "-m", "moonwrit.cli", *WORDS, "--parquet", "--output", str(tmp_path / name)],
            env={**os.environ, "TZ": zone, "PYTHONHASHSEED": seed}, capture_output=True, encoding="utf-8")
        assert (done.returncode, done.stderr) == (0, "")
    for table in ("policies", "agreement", "places"):
        one, other = (tmp_path / name / f"{table}.parquet" for name in ("here", "there"))
        assert one.read_bytes() == other.read_bytes()
        assert answer(f"SELECT DISTINCT decode(key) FROM parquet_kv_metadata('{one}')") == [("ARROW:schema",)]
    assert not list(tmp_path.glob("*/.*"))


def test_without_the_extra_it_is_named_before_anything_is_computed(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One line on standard error says what to install; exit code 1, and no folder is begun."""
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    done = CliRunner().invoke(main, [*WORDS, "--parquet", "--output", str(tmp_path / "out")], catch_exceptions=False)
    assert (done.exit_code, done.stdout) == (1, "")
    assert done.stderr == "moonwrit: --parquet needs the extra parquet; pip install 'moonwrit[parquet]'\n"
    assert not (tmp_path / "out").exists()
