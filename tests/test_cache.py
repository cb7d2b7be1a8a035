"""The cache on disk: never needed, never believed unread, and without a trace in what is computed."""

from __future__ import annotations

import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest

from moonwrit.cache import kept

CENTURY = "from moonwrit.sky import lunations; import hashlib; m = lunations(17000, 17060); w = m.windows; " \
    "print(hashlib.sha256(b''.join(a.tobytes() for a in (m.conjunction_tt, m.conjunction_ut, m.day, w.centre_tt, " \
    "w.sun_km, w.moon_km, w.gast_rad, w.obliquity_rad))).hexdigest())"


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("MOONWRIT_CACHE", str(tmp_path / "cache"))
    return tmp_path / "cache"


def files(folder: Path) -> list[Path]:
    return sorted(file for file in folder.rglob("*") if file.is_file())


def test_what_was_kept_is_not_made_again(folder: Path) -> None:
    """The second time the maker is not asked; another key or kind asks it."""
    made: list[str] = []

    def make() -> bytes:
        made.append("made")
        return b"\0content"

    assert kept("kind", ("key", 1), make) == kept("kind", ("key", 1), make) == b"\0content"
    assert len(made) == 1
    kept("kind", ("key", 2), make)
    kept("other", ("key", 1), make)
    assert len(made) == 3


@pytest.mark.parametrize("left", [b"", b"x", bytes(31), bytes(32), bytes(200)])
def test_a_damaged_file_is_made_anew_with_a_note(
    folder: Path, left: bytes, capsys: pytest.CaptureFixture[str]
) -> None:
    """Cut short, emptied or overwritten: the note names the file, the result is right, and the file is whole again."""
    kept("kind", "key", lambda: b"content")
    (file,) = files(folder)
    whole = file.read_bytes()
    file.write_bytes(left)
    assert kept("kind", "key", lambda: b"content") == b"content"
    assert str(file) in capsys.readouterr().err
    assert file.read_bytes() == whole


def test_a_single_flipped_bit_is_noticed(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Any byte of the file: what comes back is never other than what was made."""
    kept("kind", "key", lambda: b"content")
    (file,) = files(folder)
    whole = file.read_bytes()
    for at in range(len(whole)):
        file.write_bytes(whole[:at] + bytes([whole[at] ^ 4]) + whole[at + 1:])
        assert kept("kind", "key", lambda: b"content") == b"content"
        assert "damaged" in capsys.readouterr().err


def test_off_writes_nothing_and_asks_every_time(
    folder: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """``MOONWRIT_CACHE=off``: the maker is asked both times, and no folder is made, here or in the user's home."""
    monkeypatch.setenv("MOONWRIT_CACHE", "off")
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "xdg"))
    answers = iter([b"one", b"two"])
    assert [kept("kind", "key", lambda: next(answers)) for _ in range(2)] == [b"one", b"two"]
    assert files(tmp_path) == []


def test_the_folder_is_the_users_cache_folder(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """XDG_CACHE_HOME/moonwrit; where that is unset or relative, ~/.cache/moonwrit."""
    monkeypatch.delenv("MOONWRIT_CACHE", raising=False)
    monkeypatch.setenv("HOME", str(tmp_path / "home"))
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "xdg"))
    kept("kind", "key", lambda: b"content")
    assert len(files(tmp_path / "xdg" / "moonwrit")) == 1
    for value in ("", "relative"):
        monkeypatch.setenv("XDG_CACHE_HOME", value)
        kept("kind", "key", lambda: b"content")
    assert len(files(tmp_path / "home" / ".cache" / "moonwrit")) == 1
    assert not (tmp_path / "relative").exists()


def test_a_folder_that_cannot_be_written_is_done_without(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A file in the folder's place: the result is made, and nobody is troubled with it."""
    folder.write_bytes(b"")
    assert kept("kind", "key", lambda: b"content") == b"content"
    assert capsys.readouterr().err == ""


def test_many_writers_leave_one_whole_file(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Eight at once, over and over: each gets the content, no file is seen half written, none is left aside."""
    content = bytes(range(256)) * 4000

    def ask(_: int) -> bytes:
        found = kept("kind", "key", lambda: content)
        for file in files(folder):
            file.unlink(missing_ok=True)
        return found

    with ThreadPoolExecutor(8) as pool:
        assert set(pool.map(ask, range(64))) == {content}
    kept("kind", "key", lambda: content)
    assert len(files(folder)) == 1
    assert capsys.readouterr().err == ""


def test_the_sky_is_the_same_to_the_last_bit_with_the_cache_and_without(
    monkeypatch: pytest.MonkeyPatch, folder: Path
) -> None:
    """Off, first written, and read back by another process: equal arrays of lunations and windows."""

    def alone() -> str:
        done = subprocess.run([sys.executable, "-c", CENTURY], capture_output=True, text=True, check=True)
        assert done.stderr == ""
        return done.stdout

    written = alone()
    (file,) = files(folder)
    content = file.read_bytes()
    assert alone() == written
    assert files(folder) == [file]
    assert file.read_bytes() == content
    monkeypatch.setenv("MOONWRIT_CACHE", "off")
    assert alone() == written
