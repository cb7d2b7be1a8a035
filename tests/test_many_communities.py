"""Many communities in one call: side by side, one failure never stopping the rest."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest
from click.testing import CliRunner

from demonstration import one_language
from moonwrit.cli import main

ROOT = Path(__file__).resolve().parent.parent


@pytest.fixture
def folders(tmp_path: Path) -> dict[str, Path]:
    """Three communities for one year each; the second does not load, the third would change silently."""
    out = {}
    for name in ("north", "broken", "silent"):
        content = out[name] = tmp_path / name
        shutil.copytree(ROOT / "content", content, ignore=shutil.ignore_patterns("record"))
        one_language(content)
        site = (content / "site.yaml").read_text(encoding="utf-8")
        site = site.replace("{from: 1447, to: 1449}", "{from: 1448, to: 1448}")
        (content / "site.yaml").write_text(site, encoding="utf-8")
    (out["broken"] / "places.yaml").write_text("- not: places\n", encoding="utf-8")
    (out["silent"] / "record").mkdir()
    (out["silent"] / "record/journal.jsonl").write_text(
        '{"calendar":"main","key":"month-1448-09","starts":"2027-02-07","ends":"2027-03-08","standing":"settled",'
        '"seq":0,"at":"2026-11-01T00:00:00Z"}\n', encoding="utf-8",
    )
    return out


def files(folder: Path) -> dict[str, bytes]:
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*") if p.is_file()}


def test_one_failure_never_stops_the_rest(folders: dict[str, Path], tmp_path: Path) -> None:
    """Exit code 3 is the worst of 0, 1 and 3; the sound one is the site that it is when built alone."""
    environment = {"SOURCE_DATE_EPOCH": "1796083200"}
    alone = tmp_path / "alone"
    shutil.copytree(folders["north"], tmp_path / "by-itself")
    done = CliRunner(env=environment).invoke(
        main, ["publish", "--content", str(tmp_path / "by-itself"), "--output", str(alone)])
    assert done.exit_code == 0, done.output
    words = [word for folder in folders.values() for word in ("--content", str(folder))]
    words += ["--output", str(tmp_path / "all"), "--workers", "2"]
    done = CliRunner(env=environment).invoke(main, ["publish", *words])
    assert done.exit_code == 3, done.output
    said = {line.partition(":")[0]: line for line in done.output.splitlines() if line.partition(":")[0] in folders}
    assert "files in" in said["north"]
    assert "places.yaml" in said["broken"]
    assert "1 published date would change" in said["silent"]
    assert {path.name for path in (tmp_path / "all").iterdir() if not path.name.startswith(".")} == {"north"}
    assert files(tmp_path / "all/north") == files(alone)
    assert (folders["north"] / "record/journal.jsonl").exists()


def test_two_folders_of_one_name_are_refused(folders: dict[str, Path], tmp_path: Path) -> None:
    other = tmp_path / "elsewhere/north"
    shutil.copytree(folders["north"], other)
    done = CliRunner().invoke(main, ["publish", "--content", str(folders["north"]), "--content", str(other),
                                     "--output", str(tmp_path / "all")])
    assert done.exit_code == 1
    assert 'two content folders are called "north"' in done.output
    assert not (tmp_path / "all").exists()


def test_a_cluster_builds_the_same(folders: dict[str, Path], tmp_path: Path) -> None:
    """A local Dask scheduler with two workers gives the sites that this machine's processes give."""
    distributed = pytest.importorskip("distributed", reason="the extra cluster is not installed")
    pair = [str(folders["north"]), str(tmp_path / "south")]
    shutil.copytree(folders["north"], pair[1])
    words = [word for folder in pair for word in ("--content", folder)]
    with distributed.LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=None) as cluster:
        done = CliRunner(env={"SOURCE_DATE_EPOCH": "1796083200"}).invoke(
            main, ["publish", *words, "--output", str(tmp_path / "there"), "--scheduler", cluster.scheduler_address])
    assert done.exit_code == 0, done.output
    for folder in pair:
        shutil.rmtree(Path(folder) / "record")
    done = CliRunner(env={"SOURCE_DATE_EPOCH": "1796083200"}).invoke(
        main, ["publish", *words, "--output", str(tmp_path / "here")])
    assert done.exit_code == 0, done.output
    assert files(tmp_path / "here/north") == files(tmp_path / "there/north")
    assert files(tmp_path / "here/south") == files(tmp_path / "there/south")


def test_a_cluster_that_does_not_answer_is_one_message(folders: dict[str, Path], tmp_path: Path) -> None:
    pytest.importorskip("distributed", reason="the extra cluster is not installed")
    words = [word for folder in folders.values() for word in ("--content", str(folder))]
    done = CliRunner().invoke(main, ["publish", *words, "--output", str(tmp_path / "all"), "--scheduler", "nowhere"])
    assert done.exit_code == 1
    assert "no Dask scheduler answers at nowhere" in done.output
