"""Building again where a site stands: what did not change is kept, and the bytes are those of a build from nothing."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from collections.abc import Callable, Mapping
from dataclasses import replace
from datetime import date
from pathlib import Path

import pytest

from demonstration import Desk, desk_of_one_year
from moonwrit.building import assembled, content_of, held
from moonwrit.digests import Digests
from moonwrit.publish import pieces, site
from moonwrit.publish.render import Later
from moonwrit.publish.writing import MARKER

NOON = "2026-12-10T12:00:00+00:00"


@pytest.fixture
def desk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Desk:
    """A year in two languages, with two calendars and a decision on record, published."""
    monkeypatch.setenv("MOONWRIT_CACHE", str(tmp_path / "cache"))
    desk = desk_of_one_year(tmp_path)
    desk.change("site.yaml", "# one language", "languages: [ar]")
    with (desk.content / "site.yaml").open("a", encoding="utf-8") as file:
        file.write("  makkah: {name: Makkah, policy: umm-al-qura, region: three-harbours}\n")
    desk.publish("2026-12-09T12:00:00+00:00")
    desk.decide("2026-12-10T02:00:00+00:00", "1448-06", "2026-11-11", "sighted")
    desk.publish("2026-12-10T03:00:00+00:00")
    return desk


def files(folder: Path) -> dict[str, bytes]:
    """What stands in a folder, without the marker, which tells of one build."""
    found = [path for path in folder.rglob("*") if path.is_file() and path.name != MARKER]
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in found}


def inodes(folder: Path) -> dict[str, int]:
    return {path.relative_to(folder).as_posix(): path.stat().st_ino for path in folder.rglob("*") if path.is_file()}


def from_nothing(desk: Desk, now: str, *words: str) -> dict[str, bytes]:
    """The site as it is built where none stands."""
    other = desk.output.with_name("other")
    shutil.rmtree(other, ignore_errors=True)
    desk.do(now, "publish", "--output", str(other), "--workers", "1", *words)
    return files(other)


def added(desk: Desk, file: str, text: str) -> None:
    path = desk.content / file
    path.parent.mkdir(parents=True, exist_ok=True)
    with path.open("a", encoding="utf-8") as stream:
        stream.write(text)


REPORT = ("record", "report", "--evening", "2026-12-09", "--place", "wattle-harbour", "--outcome", "seen",
          "--aid", "naked-eye")
AMENDMENT = """- months: 1448-09..1448-10
  at: 2026-12-10T15:00:00+00:00
  by: The committee
  reason: The criterion was changed
"""
READING = "{% extends 'moonwrit/pages/home.html' %}{% block main %}Ours{% endblock %}"
CHANGES: list[tuple[str, Callable[[Desk], object], int]] = [
    # what, how, and at least how many files must be kept of more than 300
    ("nothing", lambda desk: None, 300),
    ("a report", lambda desk: desk.do(NOON, *REPORT), 290),
    ("a decision as expected", lambda desk: desk.decide(NOON, "1448-07", "2026-12-11", "sighted"), 150),
    ("a decision that moves a month", lambda desk: desk.decide(NOON, "1448-08", "2027-01-09", "sighted"), 120),
    ("a notice", lambda desk: added(desk, "notices/2026-12-09-a.md", "# A\n\nFrom {date eid-al-fitr 1448} on.\n"), 0),
    ("a text", lambda desk: desk.change("pages/about.md", "letter or e-mail", "letter"), 290),
    ("a name", lambda desk: desk.change("observances.yaml", "Eid al-Fitr", "Breaking of the fast"), 0),
    ("a height", lambda desk: desk.change("places.yaml", "elevation: 25", "elevation: 26"), 0),
    ("a colour", lambda desk: desk.change("look.yaml", "mark: '#8d3b1f'", "mark: '#8d3b20'"), 100),
    ("an own template", lambda desk: added(desk, "theme/pages/reading.html", READING), 0),
    ("one language fewer", lambda desk: desk.change("site.yaml", "languages: [ar]", "languages: []"), 0),
    ("a contact", lambda desk: desk.change("site.yaml", "contact: calendar@", "contact: officer@"), 0),
]


def test_after_any_change_the_bytes_are_those_of_a_build_from_nothing(desk: Desk) -> None:
    """Expected: for each change, one after the other, equal to a build from nothing; and what a change does not touch
    is kept, as the same file."""
    for number, (what, change, least) in enumerate(CHANGES):
        change(desk)
        before, now = inodes(desk.output), f"2026-12-10T13:{number:02d}:00+00:00"
        desk.publish(now)
        after = inodes(desk.output)
        kept = [path for path, inode in after.items() if before.get(path) == inode]
        assert files(desk.output) == from_nothing(desk, now), what
        assert len(after) > 150
        assert len(kept) >= least, f"{what}: {len(kept)} of {len(after)} files are kept"


def test_another_day_is_another_site(desk: Desk) -> None:
    """Expected: on each day equal to a build from nothing; from the month's last day to the next month's first
    the front page, the cells of today and what is next are others."""
    for now in ("2026-12-10T02:00:00+00:00", "2026-12-11T02:00:00+00:00", "2027-02-09T02:00:00+00:00"):
        desk.publish(now)
        assert files(desk.output) == from_nothing(desk, now), now


def test_what_is_not_as_it_was_built_is_built_again(desk: Desk, monkeypatch: pytest.MonkeyPatch) -> None:
    """Expected: whatever became of the site or of the note, a build mends it; files that were for one user alone are
    for all again, as new ones are, and as old as they were."""
    desk.publish(NOON)
    wanted = from_nothing(desk, NOON)
    page = desk.output / "1448/ramadan/index.html"
    text = page.read_bytes()

    def notes_are_cut() -> None:
        for note in (desk.output.parent / "cache/sites").iterdir():
            note.write_bytes(note.read_bytes()[:5000])

    def all_are_for_one_alone() -> None:
        for path in desk.output.rglob("*.html"):
            path.chmod(0o600)

    damages: list[Callable[[], object]] = [
        lambda: page.write_bytes(text.replace(b"2027", b"2028")), lambda: page.write_bytes(text + b"<!-- -->"),
        page.unlink, lambda: os.replace(desk.output / "1448/shawwal/index.html", page), notes_are_cut,
        all_are_for_one_alone,
    ]
    for number, damage in enumerate(damages):
        damage()
        before = page.stat().st_mtime_ns if damage is all_are_for_one_alone else None
        desk.publish(NOON)
        assert files(desk.output) == wanted, number
        modes = {path.stat().st_mode for path in desk.output.rglob("*") if path.is_file()}
        assert modes == {(desk.output / MARKER).stat().st_mode}, number
        assert before in (None, page.stat().st_mtime_ns)
    held = inodes(desk.output)
    monkeypatch.setattr(pieces, "_program_digest", lambda theme: "another")
    desk.publish(NOON)
    assert files(desk.output) == wanted
    assert not set(held.values()) & set(inodes(desk.output).values()), "another program keeps nothing"


def test_many_processes_make_what_one_makes(desk: Desk, tmp_path: Path) -> None:
    """Expected: equal bytes; and the pages are really made by the others."""
    content = content_of(desk.content)
    almanacs = assembled(content, date(2026, 12, 10))
    ledger = held(content, desk.content, almanacs, date(2026, 12, 10))
    for processes in (1, 3):
        site.publish(almanacs, ledger, tmp_path / str(processes), own=content.own, processes=processes)
    assert files(tmp_path / "3") == files(tmp_path / "1")
    here = os.getpid()
    whose = {f"{number}": (pieces.Piece(bytes([number % 256, number // 256]), lambda: str(os.getpid()).encode()),)
             for number in range(400)}
    makers = set(pieces.made(whose, pieces.Before(None, None), 3).values())
    assert len(makers) == 3
    assert str(here).encode() not in makers


def test_what_fails_in_another_process_is_one_message(desk: Desk) -> None:
    """Expected: a template of the community's own that fails is named with its line, and the old site stands."""
    before = files(desk.output)
    added(desk, "theme/pages/month.html", "{% extends 'moonwrit/pages/month.html' %}\n{% block main %}\n"
          "{{ 1 // 0 }}{% endblock %}")
    said = desk.do(NOON, "publish", "--output", str(desk.output), "--workers", "2", exit_code=1)
    assert "theme/pages/month.html:3: the template fails" in said
    assert files(desk.output) == before


def test_a_site_that_another_build_put_in_place_is_not_mixed(desk: Desk, monkeypatch: pytest.MonkeyPatch) -> None:
    """Expected: where another site stands by the time that this one is put in place, nothing of it is kept."""
    desk.change("site.yaml", "contact: calendar@", "contact: officer@")
    wanted = from_nothing(desk, NOON)
    kept = pieces.Before.kept

    def meanwhile(self: pieces.Before, files: pieces.Files) -> object:
        found = kept(self, files)
        for path in desk.output.rglob("*.html"):
            path.write_bytes(b"of another build")
        return found

    monkeypatch.setattr(pieces.Before, "kept", meanwhile)
    desk.publish(NOON)
    assert files(desk.output) == wanted


def test_a_site_that_goes_while_sheets_are_drawn_from_it_is_built_from_nothing(
    desk: Desk, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Expected: the pages that were to be kept are gone when their sheets are drawn; the whole site is made then."""
    monkeypatch.setattr(site, "sheet", _as_sheet)
    desk.do(NOON, "publish", "--output", str(desk.output), "--pdf", "a4")
    wanted = from_nothing(desk, NOON, "--pdf", "letter")
    kept = pieces.Before.kept

    def meanwhile(self: pieces.Before, files: pieces.Files) -> object:
        found = kept(self, files)
        shutil.rmtree(desk.output, ignore_errors=True)
        return found

    monkeypatch.setattr(pieces.Before, "kept", meanwhile)
    desk.do(NOON, "publish", "--output", str(desk.output), "--pdf", "letter")
    assert files(desk.output) == wanted
    assert wanted["1448/ramadan/sheet.pdf"].startswith(b"letter <!doctype html>")


def _as_sheet(path: str, contents: Mapping[str, bytes], paper: str) -> bytes:
    """Quickly drawn, and of all that a sheet is made from."""
    return paper.encode() + b" " + contents[path]


def test_processes_end_with_the_one_that_was_asked(tmp_path: Path) -> None:
    """Expected: where that is killed, the others end too, and soon."""
    program = (
        "import os, sys, time\n"
        "from moonwrit.publish import pieces\n"
        "def slow(n):\n"
        "    time.sleep(0.02)\n"
        "    return b'x' * 100_000\n"
        "files = {str(n): (pieces.Piece(n.to_bytes(4, 'big'), lambda n=n: slow(n)),) for n in range(2000)}\n"
        "pieces.made(files, pieces.Before(None, None), 3)\n"
    )
    asked = subprocess.Popen([sys.executable, "-c", program])
    children = Path(f"/proc/{asked.pid}/task/{asked.pid}/children")
    if not children.exists():
        asked.kill()
        pytest.skip("this system does not tell a process's children")
    started: list[str] = []
    while len(started) < 3 and asked.poll() is None:
        started = children.read_text().split()
    asked.kill()
    asked.wait()
    for _ in range(200):
        left = [pid for pid in started if _runs(pid)]
        if not left:
            break
        subprocess.run(["sleep", "0.05"], check=True)
    assert len(started) == 3
    assert left == []


def test_an_interruption_while_processes_start_is_heard() -> None:
    """Expected: one that comes within a fork, where Python would only print it, ends the build all the same."""
    program = (
        "import os, signal\n"
        "from moonwrit.publish import pieces\n"
        "os.register_at_fork(before=lambda: signal.raise_signal(signal.SIGINT))\n"
        "files = {str(n): (pieces.Piece(n.to_bytes(4, 'big'), lambda: b'x'),) for n in range(2000)}\n"
        "try:\n"
        "    pieces.made(files, pieces.Before(None, None), 2)\n"
        "except KeyboardInterrupt:\n"
        "    print('interrupted')\n"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=False, timeout=60)
    assert (done.returncode, done.stdout, done.stderr) == (0, "interrupted\n", "")


def _runs(pid: str) -> bool:
    try:
        return ") Z" not in Path(f"/proc/{pid}/stat").read_text()
    except FileNotFoundError:
        return False


# --- digests --------------------------------------------------------------------------------------


def test_equal_values_have_equal_digests_and_others_do_not(desk: Desk) -> None:
    """Expected: the months, evenings, places and policies of two readings of one content, digest for digest; and for
    each of many small differences another digest."""
    one, two = (assembled(content_of(desk.content), date(2026, 12, 10))[0] for _ in range(2))
    for name in ("months", "evenings", "occurrences", "places", "observances", "site", "region", "method", "fasting"):
        first, second = (Digests().of(getattr(almanac, name)) for almanac in (one, two))
        assert first == second, name
    month = one.months[3]
    others = [
        replace(month, length=month.length - 1), replace(month, starts=date(2000, 1, 1)), replace(month, policy=""),
        replace(month, evidence=replace(month.evidence, met=None)),
        replace(month, evidence=replace(month.evidence, circumstances={**month.evidence.circumstances, "age_h": 0.0})),
        replace(month, margin=replace(month.margin, value=1)), replace(month, margin=replace(month.margin, value=1.0)),
        (month,), [month, month], {"month": month}, Later(files, month), "", None, 0, 0.0, -0.0, False, b"", (), ((),),
        ("", ""), ("','",),
    ]
    digests = {Digests().of(value) for value in others}
    assert len(digests) == len(others)
    assert Digests().of(month) not in digests


def test_what_is_not_known_is_refused() -> None:
    """Expected: an object whose parts are not known has no digest, also deep inside."""
    with pytest.raises(TypeError, match="object cannot be digested"):
        Digests().of({"a": [object()]})
