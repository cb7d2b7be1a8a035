"""Putting a site in place: stopped anywhere, beside other builds, and where the folder is not ours to write."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

import pytest

from moonwrit.errors import RequestError
from moonwrit.publish.writing import MARKER, put_in_place

OLD = {"index.html": b"old", "gone/index.html": b"old", "feeds/months.ics": b"old"}
NEW = {"index.html": b"new", "1447/ramadan/index.html": b"new", "feeds/months.ics": b"new"}

# Builds NEW where OLD stands and stops before the n-th step that touches the file system: by the signal that no
# program can catch, by an exception, or with every later step of writing failing as on a full disk. Python's own
# audit events are the steps, so the program under test is not told that it is watched.
STOPPED = """
import errno, os, signal, sys
from pathlib import Path
from moonwrit.publish.writing import put_in_place

folder, how, stop, files = Path(sys.argv[1]), sys.argv[2], int(sys.argv[3]), eval(sys.argv[4])
armed, count = False, 0

def hook(event, args):
    global count
    if not armed or event not in ("os.mkdir", "os.rename", "os.remove", "os.rmdir", "open"):
        return
    if str(args[0]).startswith("/") and not str(args[0]).startswith(str(folder)):
        return  # an import
    count += 1
    if how == "full":
        if count >= stop and (event == "os.mkdir" or event == "open" and args[1] not in (None, "r", "rb")):
            raise OSError(errno.ENOSPC, "No space left on device")
    elif count == stop:
        if how == "kill":
            os.kill(os.getpid(), signal.SIGKILL)
        raise {"interrupt": KeyboardInterrupt, "error": RuntimeError}[how]("stopped")

sys.addaudithook(hook)
armed = True
try:
    put_in_place(files, folder / "site")
finally:
    armed = False
    print(count)
"""


def site(output: Path) -> dict[str, bytes]:
    """What stands in a folder, without the marker."""
    return {
        path.relative_to(output).as_posix(): path.read_bytes()
        for path in output.rglob("*") if path.is_file() and path.name != MARKER
    }


def stopped(folder: Path, how: str, step: int) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-c", STOPPED, str(folder), how, str(step), repr(NEW)],
        capture_output=True, encoding="utf-8", timeout=60,
    )


@pytest.fixture(scope="module")
def steps(tmp_path_factory: pytest.TempPathFactory) -> int:
    """How many steps a build takes that nothing stops."""
    folder = tmp_path_factory.mktemp("whole")
    put_in_place(OLD, folder / "site")
    count = int(stopped(folder, "kill", 0).stdout)
    assert site(folder / "site") == NEW
    return count


@pytest.mark.parametrize("how", ["kill", "interrupt", "error", "full"])
def test_a_build_stopped_at_any_step_leaves_a_whole_site_and_the_next_completes(
    how: str, steps: int, tmp_path: Path
) -> None:
    """Expected: at every step the old or the new site is whole, in its place or (killed between two renames) beside."""
    assert steps > 10
    left = []
    for step in range(1, steps + 1):
        folder = tmp_path / str(step)
        put_in_place(OLD, folder / "site")
        ended = stopped(folder, how, step)
        whole = [path for path in folder.iterdir() if site(path) in (OLD, NEW) and (path / MARKER).exists()]
        assert whole, f"step {step}: nothing whole is left"
        if how != "kill":
            assert folder / "site" in whole, f"step {step}: a build that could tidy up left {list(folder.iterdir())}"
        if how == "full":
            assert ended.returncode == 0 or "RequestError" in ended.stderr.splitlines()[-1]
        left.append(site(folder / "site") != NEW)
        put_in_place(NEW, folder / "site")
        assert site(folder / "site") == NEW
        assert [path.name for path in folder.iterdir()] == ["site"], "nothing is left beside the site"
    assert left == sorted(left, reverse=True), "up to some step no new site is in place, and then it always is"
    assert left[0]


def test_a_build_replaces_the_site_whole(tmp_path: Path) -> None:
    """Expected: pages that are no longer built are gone, and the placeholder that git keeps stays."""
    (tmp_path / "site").mkdir()
    (tmp_path / "site/.gitkeep").touch()
    put_in_place(OLD, tmp_path / "site")
    put_in_place(NEW, tmp_path / "site", "the marker's text\n")
    assert site(tmp_path / "site") == {**NEW, ".gitkeep": b""}
    assert (tmp_path / "site" / MARKER).read_text() == "the marker's text\n"


def test_builds_into_one_folder_at_once_all_end_well(tmp_path: Path) -> None:
    """Expected: each of eight builds ends without an error, and the site that stands is whole, that of one of them."""
    program = (
        "import sys; from pathlib import Path; from moonwrit.publish.writing import put_in_place\n"
        "for turn in range(5):\n"
        "    put_in_place({f'{n}/index.html': sys.argv[2].encode() for n in range(40)}, Path(sys.argv[1]))\n"
    )
    started = [
        subprocess.Popen([sys.executable, "-c", program, str(tmp_path / "site"), str(n)], stderr=subprocess.PIPE)
        for n in range(8)
    ]
    assert [build.communicate(timeout=60)[1] for build in started] == [b""] * 8
    assert [build.returncode for build in started] == [0] * 8
    there = site(tmp_path / "site")
    assert len(there) == 40
    assert len(set(there.values())) == 1
    assert [path.name for path in tmp_path.iterdir()] == ["site"]


def test_a_folder_that_is_not_ours_is_never_overwritten(tmp_path: Path) -> None:
    """Expected: a folder with anything in it but our marker or the placeholder is refused and kept as it is."""
    (tmp_path / "thesis").mkdir()
    (tmp_path / "thesis/chapter.txt").write_text("years of work")
    with pytest.raises(RequestError, match="holds files that moonwrit did not write"):
        put_in_place(NEW, tmp_path / "thesis")
    assert site(tmp_path / "thesis") == {"chapter.txt": b"years of work"}
    assert [path.name for path in tmp_path.iterdir()] == ["thesis"]


def test_what_is_no_folder_is_refused(tmp_path: Path) -> None:
    """Expected: a file and links, also one that leads nowhere, are refused and kept."""
    (tmp_path / "file").write_text("kept")
    put_in_place(OLD, tmp_path / "real")
    (tmp_path / "link").symlink_to("real")
    (tmp_path / "nowhere").symlink_to("missing")
    for name, said in (("file", "is not a folder"), ("link", "is a link"), ("nowhere", "is a link")):
        with pytest.raises(RequestError, match=said):
            put_in_place(NEW, tmp_path / name)
    assert (tmp_path / "file").read_text() == "kept"
    assert site(tmp_path / "real") == OLD
    assert (tmp_path / "link").readlink() == Path("real")
    with pytest.raises(RequestError, match="holds files"):
        put_in_place(NEW, Path("/"))


def test_the_folder_in_which_one_stands_can_be_rebuilt(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Expected: ".." names the same site as its full path, and is replaced like it."""
    put_in_place(OLD, tmp_path / "site")
    monkeypatch.chdir(tmp_path / "site/gone")
    put_in_place(NEW, Path(".."))
    assert site(tmp_path / "site") == NEW


@pytest.mark.parametrize("path", ["../outside.html", "/etc/outside.html", "a/../../b.html", "a\\b.html", "a\0b", ""])
def test_a_page_that_would_lie_outside_is_refused(path: str, tmp_path: Path) -> None:
    """Expected: refused before anything is written."""
    with pytest.raises(RequestError, match="outside the output folder"):
        put_in_place({**NEW, path: b""}, tmp_path / "site")
    assert list(tmp_path.iterdir()) == []


@pytest.fixture
def read_only() -> Iterator[Path]:
    """A folder that this process may read and not write, though it may run as root."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        put_in_place(OLD, folder / "site")
        folder.chmod(0o555)
        root = os.geteuid() == 0
        if root:
            os.seteuid(65534)
        try:
            yield folder
        finally:
            if root:
                os.seteuid(0)
            folder.chmod(0o755)


@pytest.mark.parametrize("name", ["site", "new", "deeper/new"])
def test_a_folder_that_cannot_be_written_is_one_message(name: str, read_only: Path) -> None:
    """Expected: one RequestError that names the folder and the reason; the site that stood there stands."""
    with pytest.raises(RequestError, match=r"cannot be written \(Permission denied\)") as caught:
        put_in_place(NEW, read_only / name)
    assert str(read_only / name) in str(caught.value)
    assert site(read_only / "site") == OLD
    assert [path.name for path in read_only.iterdir()] == ["site"]


def test_a_site_that_was_made_read_only_is_replaced_and_leaves_nothing() -> None:
    """Expected: twice, by a user whom modes bind; the old one goes, though its folders cannot be written."""
    program = (
        "import fcntl, os, sys\n"
        "from pathlib import Path\n"
        "from moonwrit.publish.writing import put_in_place\n"
        "folder = Path(sys.argv[1])\n"
        "if os.geteuid() == 0:\n"
        "    os.chown(folder, 65534, 65534)\n"
        "    os.seteuid(65534)\n"
        "for text in (b'one', b'two', b'three'):\n"
        "    put_in_place({'index.html': text, 'a/b/index.html': text}, folder / 'site')\n"
        "    for path in (folder / 'site/a/b', folder / 'site/a', folder / 'site'):\n"
        "        path.chmod(0o555)\n"
    )
    home = tempfile.mkdtemp()
    try:
        subprocess.run([sys.executable, "-c", program, home], check=True)
        assert site(Path(home) / "site") == {"index.html": b"three", "a/b/index.html": b"three"}
        assert [path.name for path in Path(home).iterdir()] == ["site"]
    finally:
        for path in (Path(home), *Path(home).rglob("*")):
            path.chmod(0o755)
        shutil.rmtree(home)
