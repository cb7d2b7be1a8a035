"""The house itself: what lies at the top, what the command loads, and what a wheel carries."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
import sysconfig
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent

TOP = {
    "README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE", "Makefile", "requirements.lock",
    "generator", "themes", "content", "tests", "output",
}  # fmt: skip


def _run(*command: str | Path, at: Path = ROOT, **environment: str) -> str:
    """Standard output of a command that must succeed; ``PYTHONPATH`` is not handed on unless named."""
    inherited = {name: value for name, value in os.environ.items() if name != "PYTHONPATH"}
    done = subprocess.run(
        [str(word) for word in command],
        cwd=at,
        env={**inherited, **environment},
        capture_output=True,
        encoding="utf-8",
        stdin=subprocess.DEVNULL,
    )
    assert done.returncode == 0, f"{command} ended with {done.returncode}:\n{done.stdout}\n{done.stderr}"
    return done.stdout


def _git_files(*paths: str) -> list[str]:
    """Paths that git keeps or would keep: all but what .gitignore leaves out."""
    listed = _run("git", "ls-files", "-z", "--cached", "--others", "--exclude-standard", "--", *paths)
    return sorted(name for name in listed.split("\0") if name and (ROOT / name).is_file())


def test_top_level_holds_only_what_belongs_there() -> None:
    tops = {name.split("/")[0] for name in _run("git", "ls-files", "-z").split("\0") if name}
    assert {top for top in tops - TOP if not top.startswith(".")} == set()
    assert TOP - tops == set()


@pytest.mark.parametrize("words", [["--help"], ["check"]], ids=" ".join)
def test_command_loads_neither_ephemeris_nor_numpy(words: list[str]) -> None:
    program = (
        "import atexit, json, sys\n"
        "atexit.register(lambda: print('\\n' + json.dumps(sorted(sys.modules))))\n"
        "from moonwrit.cli import main\n"
        "main()\n"
    )
    printed = _run(sys.executable, "-c", program, *words, PYTHONPATH=str(ROOT / "generator"))
    loaded = {name.split(".")[0] for name in json.loads(printed.splitlines()[-1])}
    assert "moonwrit" in loaded
    assert loaded & {"numpy", "skyfield", "skyfield_data", "jplephem"} == set()


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A wheel built from a copy of what git keeps, in which an editor and Python have left their own files."""
    source = tmp_path_factory.mktemp("source")
    for name in _git_files():
        (source / name).parent.mkdir(parents=True, exist_ok=True)
        shutil.copy2(ROOT / name, source / name)
    for junk in ("content/notes.md~", "content/.notes.md.swp", "generator/moonwrit/__pycache__/cli.pyc"):
        (source / junk).parent.mkdir(parents=True, exist_ok=True)
        (source / junk).write_text("private")
    _run(sys.executable, "-m", "hatchling", "build", "-t", "wheel", "-d", source / "dist", at=source)
    (built,) = (source / "dist").glob("*.whl")
    return built


def test_wheel_carries_package_themes_and_starter_and_nothing_else(wheel: Path) -> None:
    homes = {"themes/": "moonwrit/_themes/", "content/": "moonwrit/_starter/", "generator/moonwrit/": "moonwrit/"}
    expected = {home + name.removeprefix(kept) for kept, home in homes.items() for name in _git_files(kept)}
    carried = {name for name in zipfile.ZipFile(wheel).namelist() if ".dist-info/" not in name}
    assert carried == expected
    assert all(any(name.startswith(home) for name in carried) for home in homes.values())


def test_installed_wheel_checks_and_publishes_outside_the_checkout(wheel: Path, tmp_path: Path) -> None:
    environment = tmp_path / "environment"
    _run(sys.executable, "-m", "venv", "--without-pip", environment)
    python = environment / "bin" / "python"
    pip = (sys.executable, "-m", "pip", "--python", python, "--quiet", "--disable-pip-version-check")
    _run(*pip, "install", "--no-deps", "--no-index", wheel)
    # The dependencies are borrowed from this environment; its .pth files, and so our checkout, are not read.
    site_packages = Path(_run(python, "-c", "import sysconfig; print(sysconfig.get_path('purelib'))").strip())
    (site_packages / "borrowed.pth").write_text(sysconfig.get_path("purelib") + "\n", encoding="utf-8")
    away = tmp_path / "away"
    shutil.copytree(ROOT / "content", away / "content")

    found = Path(_run(python, "-c", "import moonwrit; print(moonwrit.__file__)", at=away).strip())
    assert found.is_relative_to(site_packages)
    moonwrit = environment / "bin" / "moonwrit"
    _run(moonwrit, "check", at=away)
    _run(moonwrit, "publish", at=away)
    assert (away / "output" / "index.html").read_text(encoding="utf-8").startswith("<!doctype html>")
