"""The judges: programs that this project did not write and that its results are held against.

A test that needs one is marked ``@pytest.mark.judge("node")``. Where the judge is missing the test is skipped
with the reason; with ``MOONWRIT_JUDGES=required`` in the environment it fails instead. ``make judges`` installs
them all.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from ctypes.util import find_library
from pathlib import Path
from typing import Any

import pytest

# Whoever runs the tests keeps nothing of them; tests of the cache name a folder of their own.
os.environ["MOONWRIT_CACHE"] = "off"

ROOT = Path(__file__).resolve().parent.parent
NODE_MODULES = ROOT / ".judges" / "node_modules"
PYTHONS = ROOT / ".judges" / "pythons"  # the names of those that make judges found

# What each judge needs: commands on the path, files below NODE_MODULES (those with a slash), system libraries (with
# "lib:"), and the introspection data of one (with "gi:").
JUDGES = {
    "node": ("node",),
    "java": ("java", "javac"),  # a single-file program is compiled as it starts
    "chromium": ("chromium",),
    "khal": ("khal",),
    "vdirsyncer": ("vdirsyncer",),
    "vnu": ("java", "vnu-jar/build/dist/vnu.jar"),
    "pango": ("lib:pango-1.0", "lib:pangoft2-1.0"),
    "python": (str(PYTHONS),),
    "libical": ("/usr/bin/python3", "gi:ICalGLib-3.0"),
    "ajv": ("node", "ajv/package.json", "ajv-formats/package.json"),
    "node-ical": ("node", "node-ical/package.json"),
    "jsqr": ("node", "chromium", "playwright-core/package.json", "jsqr/package.json"),
    "ical.js": ("node", "ical.js/package.json"),
    "playwright": ("node", "chromium", "playwright-core/package.json"),
    "lighthouse": ("node", "chromium", "lighthouse/package.json"),
    "axe": ("node", "chromium", "playwright-core/package.json", "axe-core/axe.min.js"),
}


def _present(need: str) -> bool:
    if need.startswith("gi:"):
        typelib = need.removeprefix("gi:") + ".typelib"
        return any(Path("/usr/lib").glob(f"*/girepository-1.0/{typelib}"))
    if need.startswith("lib:"):
        return find_library(need.removeprefix("lib:")) is not None
    return (NODE_MODULES / need).exists() if "/" in need else shutil.which(need) is not None


def _require(judge: str) -> None:
    """Skip the running test, or fail it where judges are required, unless ``judge`` is installed."""
    if judge not in JUDGES:
        pytest.fail(f"no judge is called {judge!r}; known: {', '.join(JUDGES)}", pytrace=False)
    needs = JUDGES[judge]
    if all(map(_present, needs)):
        return
    reason = f"judge {judge} is not installed (make judges)"
    if os.environ.get("MOONWRIT_JUDGES") == "required":
        pytest.fail(reason, pytrace=False)
    pytest.skip(reason)


def pytest_runtest_setup(item: pytest.Item) -> None:
    for mark in item.iter_markers("judge"):
        for judge in mark.args:
            _require(judge)


def _run(*command: str | Path, stdin: str = "", timeout: float = 300.0, **environment: str) -> str:
    """What a judge prints on standard output; its error output is shown if it fails."""
    done = subprocess.run(
        [str(word) for word in command],
        input=stdin,
        capture_output=True,
        encoding="utf-8",
        timeout=timeout,
        env={**os.environ, **environment},
    )
    assert done.returncode == 0, f"{command[0]} ended with {done.returncode}:\n{done.stderr}\n{done.stdout}"
    return done.stdout


@pytest.fixture(scope="session")
def node() -> Callable[..., Any]:
    """``node(program, *arguments, stdin="")``: run JavaScript and return the JSON that it prints.

    ``program`` is the path of a script, or the source itself; ``require`` finds the npm judges. The arguments
    are ``process.argv.slice(2)`` of a script, ``process.argv.slice(1)`` of source.
    """

    def run(program: Path | str, *arguments: str | Path, stdin: str = "") -> Any:
        start = [program] if isinstance(program, Path) else ["-e", program, "--"]
        return json.loads(_run("node", *start, *arguments, stdin=stdin, NODE_PATH=str(NODE_MODULES)))

    return run


@pytest.fixture(scope="session")
def java() -> Callable[..., str]:
    """``java(source, *arguments)``: run a single-file Java program and return what it prints."""

    def run(source: Path, *arguments: str) -> str:
        return _run("java", source, *arguments)

    return run


@pytest.fixture(scope="session")
def vnu() -> Callable[[Path], list[dict[str, Any]]]:
    """``vnu(folder)``: what the Nu Html Checker says of all HTML, CSS and SVG files below a folder.

    Each message has ``type`` ("error", or "info" with ``subType`` "warning"), ``url``, ``lastLine`` and
    ``message``.
    """

    def check(folder: Path) -> list[dict[str, Any]]:
        files = sorted(f for f in folder.rglob("*") if f.suffix in {".html", ".css", ".svg"})
        assert files, f"nothing to check in {folder}"
        checker = ("java", "-Xss4m", "-jar", NODE_MODULES / "vnu-jar/build/dist/vnu.jar")
        flags = ("--format", "json", "--stdout", "--exit-zero-always", "--also-check-css", "--also-check-svg")
        messages: list[dict[str, Any]] = json.loads(_run(*checker, *flags, *files))["messages"]
        return messages

    return check


@pytest.fixture(scope="session")
def chromium() -> str:
    """The path of the browser."""
    path = shutil.which("chromium")
    assert path, "mark the test with judge('chromium')"
    return path


@pytest.fixture(scope="session")
def pythons() -> list[Path]:
    """The other versions of Python that the machine has, each with the packages of the lock."""
    mine = f"python{sys.version_info.major}.{sys.version_info.minor}"
    others = [name for name in PYTHONS.read_text(encoding="utf-8").split() if name != mine]
    if not others:
        pytest.skip(f"make judges found no Python here but {mine}")
    return [PYTHONS.parent / name / "bin/python" for name in others]


@pytest.fixture(scope="session")
def node_modules() -> Path:
    """Where the npm judges are."""
    return NODE_MODULES
