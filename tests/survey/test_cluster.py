"""A survey on a Dask cluster of two workers on this machine: the same files as alone, whatever becomes of a worker."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import suppress
from pathlib import Path

import pytest
from click.testing import CliRunner

from moonwrit.cli import main
from moonwrit.errors import RequestError
from moonwrit.survey.plan import Plan, Unit
from moonwrit.survey.running import run

pytest.importorskip("distributed", reason="the extra cluster is not installed")

PLAN = Plan(("mabims-2021", "umm-al-qura"), (), 40.0, 1440, 1447, places_per_unit=9, years_per_unit=4)
"""Twelve units; umm-al-qura names its own place."""


class Cluster:
    """A scheduler and two workers of one thread, each a process of its own."""

    def __init__(self, folder: Path) -> None:
        self.file = folder / "scheduler.json"
        self.processes = [self._start("scheduler", "--port", "0", "--no-dashboard")]
        self.address = self._address()
        self.workers = [self._start("worker", "--no-nanny", "--nthreads", "1", "--no-dashboard") for _ in "12"]
        self.processes += self.workers

    def _start(self, kind: str, *options: str) -> subprocess.Popen[bytes]:
        words = [sys.executable, "-m", "dask", kind, "--scheduler-file", str(self.file), *options]
        return subprocess.Popen(words, cwd=self.file.parent, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)

    def _address(self) -> str:
        for _ in range(600):
            with suppress(OSError, ValueError):  # until the file is there, and whole
                return str(json.loads(self.file.read_bytes())["address"])
            time.sleep(0.1)
        raise AssertionError("the scheduler does not start")

    def wait_for_workers(self) -> None:
        from distributed import Client

        with Client(self.address) as client:
            client.wait_for_workers(2, timeout=60)

    def stop(self) -> None:
        for process in reversed(self.processes):
            process.kill()
            process.wait()


@pytest.fixture
def cluster(tmp_path: Path) -> Iterator[Cluster]:
    (tmp_path / "cluster").mkdir()
    made = Cluster(tmp_path / "cluster")
    try:
        made.wait_for_workers()
        yield made
    finally:
        made.stop()


def files(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}


def test_a_cluster_gives_equal_files_and_a_killed_worker_costs_only_time(cluster: Cluster, tmp_path: Path) -> None:
    """Two workers, one of them killed after the second unit: every file is as one process alone writes it."""
    killed: list[int] = []

    def kill(done: int, of: int) -> None:
        if done == 2:
            os.kill(cluster.workers[0].pid, signal.SIGKILL)
            killed.append(cluster.workers[0].wait())

    assert run(PLAN, tmp_path / "alone") == 12
    assert run(PLAN, tmp_path / "cluster survey", scheduler=cluster.address, each=kill) == 12
    assert killed == [-signal.SIGKILL]
    assert cluster.workers[1].poll() is None
    assert files(tmp_path / "cluster survey") == files(tmp_path / "alone")
    assert run(PLAN, tmp_path / "cluster survey", scheduler=cluster.address) == 0


def test_the_command_works_on_a_cluster(cluster: Cluster, tmp_path: Path) -> None:
    """`--scheduler` gives the same results, with no other change; what is wrong on a worker is said here."""
    words = ["survey", "--content", str(tmp_path / "none"), "--policy", "lag-48", "--policy", "tabular-15-civil",
             "--place", "Cairo,30.05,31.25,0,Africa/Cairo", "--from", "1440", "--to", "1450"]
    for name, more in (("alone", ["--workers", "1"]), ("cluster survey", ["--scheduler", cluster.address])):
        done = CliRunner().invoke(main, [*words, *more, "--output", str(tmp_path / name)], catch_exceptions=False)
        assert (done.exit_code, done.stderr) == (0, "")
    assert files(tmp_path / "cluster survey") == files(tmp_path / "alone")

    class Elsewhere(Plan):
        """A plan whose units cannot be computed."""

        def units(self) -> Iterator[Unit]:
            yield Unit("yallop-z", 0, 9, 1440, 1443)

    wrong = Elsewhere(*(getattr(PLAN, name) for name in PLAN.__dataclass_fields__))
    with pytest.raises(RequestError, match='policy "yallop-z" is not known'):
        run(wrong, tmp_path / "wrong", scheduler=cluster.address)


def test_no_cluster_library_is_loaded_unasked(tmp_path: Path) -> None:
    """`moonwrit survey` on this machine imports neither dask nor distributed nor pyarrow."""
    program = (
        "import atexit, sys\n"
        "atexit.register(lambda: print(sorted({n.split('.')[0] for n in sys.modules} "
        "& {'dask', 'distributed', 'pyarrow'})))\n"
        "from moonwrit.cli import main\n"
        "main()\n"
    )
    words = ["survey", "--content", "none", "--policy", "lag-48", "--place", "Cairo,30,31", "--from", "1440"]
    done = subprocess.run([sys.executable, "-c", program, *words], cwd=tmp_path, capture_output=True, encoding="utf-8")
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.splitlines()[-1] == "[]"
