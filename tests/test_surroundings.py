"""What surrounds a build: no network, a damaged ephemeris, a clock that jumps back, any day, another Python."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from datetime import date
from pathlib import Path

import pytest
import skyfield_data
from numpy._core._multiarray_umath import __cpu_dispatch__, __cpu_features__  # type: ignore[import-not-found]

from demonstration import one_language

ROOT = Path(__file__).resolve().parent.parent
PUBLISH = [sys.executable, "-m", "moonwrit.cli", "publish"]


@pytest.fixture
def content(tmp_path: Path) -> Path:
    shutil.copytree(ROOT / "content", tmp_path / "content")
    one_language(tmp_path / "content")
    return tmp_path / "content"


Done = subprocess.CompletedProcess[str]


def run(content: Path, *words: str, before: tuple[str, ...] = (), **environment: str) -> Done:
    command = [*before, *PUBLISH, "--content", str(content), "--output", str(content.parent / "site"), *words]
    env = {**os.environ, **environment}
    return subprocess.run(command, capture_output=True, encoding="utf-8", env=env, timeout=300)


def fresh(content: Path, first: int, last: int) -> None:
    """Without a record and what is written about its years, for other years."""
    for folder in ("record", "notices", "pages"):
        shutil.rmtree(content / folder, ignore_errors=True)
    site = (content / "site.yaml").read_text(encoding="utf-8")
    assert "from: 1447, to: 1449" in site
    (content / "site.yaml").write_text(site.replace("from: 1447, to: 1449", f"from: {first}, to: {last}"))


def test_no_network_is_asked_for(content: Path) -> None:
    """Expected: in a network namespace without even a loopback, a site; and that a connection fails there."""
    alone = ("unshare", "--map-root-user", "--net")
    probe = "import socket; socket.create_connection(('127.0.0.1', 9), 2)"
    if shutil.which("unshare") is None or subprocess.run([*alone, "true"], capture_output=True).returncode:
        pytest.skip("network namespaces are not permitted here")
    unreachable = subprocess.run([*alone, sys.executable, "-c", probe], capture_output=True, encoding="utf-8")
    assert "Network is unreachable" in unreachable.stderr
    done = run(content, "--as-of", "2026-12-01", before=alone)
    assert (done.returncode, done.stderr) == (0, "")
    assert (content.parent / "site/feeds/observances.ics").stat().st_size > 10_000


@pytest.mark.parametrize("damage", ["missing", "empty", "cut", "text"])
def test_a_damaged_ephemeris_is_one_message(content: Path, damage: str) -> None:
    """Expected: exit 1, the file and what to do; no site."""
    package = content.parent / "packages" / "skyfield_data"
    shutil.copytree(Path(skyfield_data.__file__).parent, package, ignore=shutil.ignore_patterns("*.bsp"))
    whole = Path(skyfield_data.__file__).parent / "data/de421.bsp"
    kernel = package / "data/de421.bsp"
    if damage == "cut":
        kernel.write_bytes(whole.read_bytes()[:5_000_000])
    elif damage != "missing":
        kernel.write_bytes(b"" if damage == "empty" else b"<html>not found</html>" * 100)
    # A cache of its own, for what was computed from a whole file is still right.
    cache = str(content.parent / "cache")
    done = run(content, "--as-of", "2026-12-01", PYTHONPATH=str(package.parent), XDG_CACHE_HOME=cache)
    assert done.returncode == 1, done.stderr
    assert done.stderr.count("\n") == 1
    assert done.stderr.startswith(f"moonwrit: the ephemeris {kernel} cannot be read (")
    assert done.stderr.endswith("; reinstall the package skyfield-data\n")
    assert not (content.parent / "site").exists()


def test_a_clock_that_jumped_back_is_one_message(content: Path) -> None:
    """Expected: nothing new is published before what was published last; a clock a little behind is forgiven, and so
    is one far behind where nothing is to be published."""
    fresh(content, 1448, 1448)
    assert run(content, SOURCE_DATE_EPOCH="1796810400").returncode == 0  # 2026-12-09
    journal = (content / "record/journal.jsonl").read_bytes()
    assert run(content, SOURCE_DATE_EPOCH="1790000000").returncode == 0
    site = (content / "site.yaml").read_text(encoding="utf-8")
    (content / "site.yaml").write_text(site.replace("to: 1448", "to: 1449"), encoding="utf-8")
    done = run(content, SOURCE_DATE_EPOCH="1790000000")  # 2026-09-21
    assert done.returncode == 1
    assert done.stderr == (
        "moonwrit: the clock says 2026-09-21T14:13:20+00:00, and the journal was last written 2026-12-09T10:00:00+00:00"
        "; set the clock, or SOURCE_DATE_EPOCH\n"
    )
    assert (content / "record/journal.jsonl").read_bytes() == journal
    assert run(content, SOURCE_DATE_EPOCH=str(1796810400 - 3600)).returncode == 0
    assert len((content / "record/journal.jsonl").read_bytes()) > len(journal)


@pytest.mark.parametrize(("as_of", "year"), [
    ("1937-03-14", 1356), ("1969-07-20", 1389), ("2000-02-29", 1420), ("2016-12-31", 1438), ("2038-01-19", 1459),
    ("2053-01-01", 1474),
])
def test_any_day_builds(content: Path, as_of: str, year: int) -> None:
    """Expected: a site whose first page is of that year: from the day on which 1356 began by Umm al-Qura's table of
    today's rules to the end of the ephemeris, leap days and leap seconds and the end of 32-bit seconds included."""
    fresh(content, year, year)
    done = run(content, "--as-of", as_of)
    assert (done.returncode, done.stderr) == (0, "")
    assert str(date.fromisoformat(as_of).year) in (content.parent / "site/index.html").read_text(encoding="utf-8")


@pytest.mark.judge("python")
def test_other_versions_of_python_give_equal_bytes(content: Path, pythons: list[Path]) -> None:
    """Expected: the site of each other Python, in another time zone and locale, without UTF-8 for a default, with
    another order of hashes, and as on a plainer processor, is byte for byte this one's; and Python warns of nothing."""

    def built(python: Path | str, name: str, **environment: str) -> dict[str, bytes]:
        output = content.parent / name
        # The ephemeris stays open to the end.
        command = [python, "-W", "error", "-W", "ignore::ResourceWarning", "-m", "moonwrit.cli", "publish"]
        words = ["--as-of", "2026-12-01", "--content", str(content), "--output", str(output)]
        env = {**os.environ, "PYTHONPATH": str(ROOT / "generator"), **environment}
        done = subprocess.run([*command, *words], capture_output=True, encoding="utf-8", env=env, timeout=300)
        assert (done.returncode, done.stderr) == (0, "")
        return {p.relative_to(output).as_posix(): p.read_bytes() for p in output.rglob("*") if p.is_file()}

    mine = built(sys.executable, "mine", TZ="Pacific/Kiritimati", LC_ALL="C.UTF-8", PYTHONHASHSEED="0")
    assert "index.html" in mine
    # Sines that numpy takes with and without wide registers differ in their last bits.
    registers = " ".join(feature for feature in __cpu_dispatch__ if __cpu_features__[feature])
    for python in pythons:
        elsewhere = {"TZ": "America/St_Johns", "LC_ALL": "C", "PYTHONHASHSEED": "4711"}
        ascii_only = {"PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"}
        plain = {"NPY_DISABLE_CPU_FEATURES": registers}
        assert built(python, python.parts[-3], **elsewhere, **ascii_only, **plain) == mine
