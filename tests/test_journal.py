"""The journal: what was published is never changed silently, merged or lost."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from demonstration import ROOT, Desk, desk_of_one_year


@pytest.fixture
def desk(tmp_path: Path) -> Desk:
    return desk_of_one_year(tmp_path)


JUNE = "2026-06-01T00:00:00Z"
POLICY_CHANGE = ("policies.yaml", "    accept: [A, B]", "    accept: [A]")


def test_a_silent_change_stops_the_build_with_a_list_and_leaves_everything(desk: Desk) -> None:
    """Another policy without an amendment: exit 3, was -> would be, site and journal untouched."""
    desk.publish(JUNE)
    page = (desk.output / "index.html").read_bytes()
    journal = desk.lines()
    desk.change(*POLICY_CHANGE)
    said = desk.publish("2026-06-02T00:00:00Z", exit_code=3)
    assert "month-1448-02: was 2026-07-16 (expected) -> would be 2026-07-17 (expected), because 1448-02 begins" in said
    assert ": completed, Yallop's q 0.075 against 0.216" in said
    assert "moonwrit record decision" in said
    assert "amendments.yaml" in said
    assert (desk.output / "index.html").read_bytes() == page
    assert desk.lines() == journal


def test_an_amendment_explains_the_change_and_is_told(desk: Desk) -> None:
    """The same change with a dated reason: published, with the reason in the journal and in the event."""
    desk.publish(JUNE)
    desk.change(*POLICY_CHANGE)
    (desk.content / "record/amendments.yaml").write_text(
        "- at: '2026-06-01T12:00:00+10:00'\n  by: The committee\n  reason: only class A from now on\n"
        "  since: 1448-02\n", encoding="utf-8",
    )
    desk.publish("2026-06-02T00:00:00Z")
    (entry,) = [one for one in desk.lines() if one["key"] == "month-1448-02" and "was" in one]
    assert (entry["was"], entry["starts"], entry["seq"]) == ("2026-07-16", "2026-07-17", 1)
    assert entry["because"] == "amendment of 2026-06-01 by The committee: only class A from now on"
    feed = (desk.output / "feeds/months.ics").read_text(encoding="utf-8").replace("\r\n ", "")
    (event,) = [part for part in feed.split("BEGIN:VEVENT") if "UID:month-1448-02" in part]
    assert "SEQUENCE:1" in event
    assert "LAST-MODIFIED:20260602T000000Z" in event
    assert "it was published as Thursday\\, 16 July 2026" in event


def test_an_amendment_older_than_the_publication_explains_nothing(desk: Desk) -> None:
    (desk.content / "record").mkdir()
    (desk.content / "record/amendments.yaml").write_text(
        "- {at: '2026-05-01T12:00:00+10:00', by: The committee, reason: an old one, since: 1448-01}\n", encoding="utf-8"
    )
    desk.publish(JUNE)
    desk.change(*POLICY_CHANGE)
    desk.publish("2026-06-02T00:00:00Z", exit_code=3)


def test_a_decision_written_down_late_explains_its_change(desk: Desk) -> None:
    """Made at eight, the site built for another reason at nine, recorded at ten: no silent change."""
    desk.publish(JUNE)
    desk.publish("2027-02-07T21:00:00+11:00")
    desk.decide("2027-02-07T22:00:00+11:00", "1448-09", "2027-02-08", "sighted", "--at", "2027-02-07T20:00:00+11:00")
    desk.publish("2027-02-07T22:01:00+11:00")
    assert [one["starts"] for one in desk.lines() if one["key"] == "month-1448-09"] == ["2027-02-09", "2027-02-08"]


def test_a_decision_that_was_published_explains_no_later_change(desk: Desk) -> None:
    """A decision as expected, published; then another policy for the months to come: that is a silent change."""
    desk.publish(JUNE)
    desk.decide("2026-07-15T21:00:00+10:00", "1448-02", "2026-07-16", "sighted")
    desk.publish("2026-07-15T21:05:00+10:00")
    desk.change(POLICY_CHANGE[0], POLICY_CHANGE[1], "    accept: [A, B, C, D, E]")
    said = desk.publish("2026-07-20T00:00:00Z", exit_code=3)
    assert "month-1448-05: was 2026-10-13 (expected) -> would be 2026-10-12 (expected)" in said


def test_the_decision_on_the_next_month_explains_a_run_that_ends_sooner(desk: Desk) -> None:
    """Shawwal a day early: Ramadan keeps its first day and loses its last."""
    desk.decide("2027-02-07T21:00:00+11:00", "1448-09", "2027-02-09", "completed")
    desk.publish("2027-02-07T22:00:00+11:00")
    desk.decide("2027-03-09T21:00:00+11:00", "1448-10", "2027-03-10", "sighted")
    desk.publish("2027-03-09T21:05:00+11:00")
    ramadan = [one for one in desk.lines() if one["key"] == "ramadan-1448"]
    assert [(one["starts"], one["ends"]) for one in ramadan] == [
        ("2027-02-09", "2027-03-10"), ("2027-02-09", "2027-03-09")]
    assert "on month 1448-10" in str(ramadan[-1]["because"])


def test_a_published_decision_cannot_be_altered_in_its_place(desk: Desk) -> None:
    """A settled date moves by a later decision only, never by rewriting the one that was published."""
    desk.decide("2027-02-07T21:00:00+11:00", "1448-09", "2027-02-08", "sighted")
    desk.publish("2027-02-07T22:00:00+11:00")
    desk.change("record/decisions.yaml", "starts: '2027-02-08'\n  basis: sighted",
                "starts: '2027-02-09'\n  basis: completed")
    assert "month-1448-09: was 2027-02-08 (settled)" in desk.publish("2027-02-08T09:00:00+11:00", exit_code=3)


def test_an_observance_taken_out_stays_as_cancelled_for_sixty_days(desk: Desk) -> None:
    """Withdrawn with a reason: the event keeps its UID, is cancelled and says so in its title; later it goes."""
    desk.publish(JUNE)
    text = (desk.content / "observances.yaml").read_text(encoding="utf-8")
    start = text.index("\narbain:")
    (desk.content / "observances.yaml").write_text(text[:start] + text[text.index("\nmawlid:"):], encoding="utf-8")
    assert "arbain-1448: was 2026-08-04 (expected) -> would be withdrawn" in desk.publish(
        "2026-06-02T00:00:00Z", exit_code=3)
    (desk.content / "record/amendments.yaml").write_text(
        "- {at: '2026-06-02T12:00:00+10:00', by: The committee, reason: not kept here, observances: [arbain]}\n",
        encoding="utf-8",
    )
    desk.publish("2026-06-03T00:00:00Z")
    feed = (desk.output / "feeds/observances.ics").read_text(encoding="utf-8").replace("\r\n ", "")
    (event,) = [part for part in feed.split("BEGIN:VEVENT") if "UID:arbain-1448." in part]
    assert "STATUS:CANCELLED" in event
    assert "SEQUENCE:1" in event
    assert "(withdrawn)" in event
    desk.publish("2026-09-01T00:00:00Z")
    assert "UID:arbain-1448" not in (desk.output / "feeds/observances.ics").read_text(encoding="utf-8")


def test_nothing_changed_adds_no_line_and_gives_the_same_feed(desk: Desk) -> None:
    desk.publish(JUNE)
    journal, feed = desk.lines(), (desk.output / "feeds/observances.ics").read_bytes()
    desk.publish("2026-06-05T00:00:00Z")
    assert desk.lines() == journal
    assert (desk.output / "feeds/observances.ics").read_bytes() == feed


def _git(folder: Path, *words: str) -> subprocess.CompletedProcess[str]:
    names = ("-c", "user.name=Officer", "-c", "user.email=officer@three-harbours.example", "-c", "commit.gpgsign=false")
    return subprocess.run(["git", *names, *words], cwd=folder, capture_output=True, encoding="utf-8")


@pytest.fixture
def two_desks(desk: Desk, tmp_path: Path) -> tuple[Desk, Desk]:
    """Two officers with clones of one repository, in which the calendar was published once."""
    desk.publish(JUNE)
    shutil.copy(ROOT / "content/record/.gitattributes", desk.content / "record")
    _git(desk.content, "init", "-q", "-b", "main")
    _git(desk.content, "add", ".")
    assert _git(desk.content, "commit", "-q", "-m", "published").returncode == 0
    other = tmp_path / "other"
    assert _git(tmp_path, "clone", "-q", str(desk.content), str(other)).returncode == 0
    return desk, Desk(other, tmp_path / "other-output")


def test_two_copies_of_the_journal_merge_line_by_line(two_desks: tuple[Desk, Desk]) -> None:
    """Each publishes another month's decision; git merges, and the next build knows both."""
    here, there = two_desks
    here.decide("2026-07-15T21:00:00+10:00", "1448-02", "2026-07-16", "sighted")
    here.publish("2026-07-15T21:05:00+10:00")
    _git(here.content, "add", ".")
    _git(here.content, "commit", "-q", "-m", "here")
    (there.content / "record/amendments.yaml").write_text(
        "- {at: '2026-07-15T21:00:00+10:00', by: There, reason: only class A, since: 1448-03}\n", encoding="utf-8")
    there.change("observances.yaml", "  when: {month: 10, day: 1}", "  when: {month: 10, day: 1, run: 3}")
    there.change("record/amendments.yaml", "since: 1448-03", "observances: [eid-al-fitr]")
    there.publish("2026-07-15T21:10:00+10:00")
    _git(there.content, "add", ".")
    _git(there.content, "commit", "-q", "-m", "there")
    pulled = _git(there.content, "pull", "-q", "--no-rebase", "--no-edit")
    assert pulled.returncode == 0, pulled.stdout + pulled.stderr
    keys = [(one["key"], one["seq"]) for one in there.lines()]
    assert ("month-1448-02", 1) in keys
    assert ("eid-al-fitr-1448", 1) in keys
    assert len(keys) == len(set(keys))
    there.publish("2026-07-16T09:00:00+10:00")


def test_a_contradiction_of_two_copies_is_reported_until_a_later_line_settles_it(two_desks: tuple[Desk, Desk]) -> None:
    here, there = two_desks
    for desk, day, basis in ((here, "2026-07-16", "sighted"), (there, "2026-07-17", "completed")):
        desk.decide("2026-07-15T21:00:00+10:00", "1448-02", day, basis)
        desk.publish("2026-07-15T21:05:00+10:00")
        _git(desk.content, "add", "record/journal.jsonl")
        _git(desk.content, "commit", "-q", "-m", day)
    shutil.rmtree(there.output)
    assert _git(there.content, "pull", "-q", "--no-rebase", "--no-edit").returncode == 0
    said = there.publish("2026-07-15T22:00:00+10:00", exit_code=1)
    assert "month-1448-02 was published from two copies on different days" in said
    assert "2026-07-16" in said
    assert "2026-07-17" in said
    journal = there.content / "record/journal.jsonl"
    settled = {"calendar": "main", "key": "month-1448-02", "starts": "2026-07-17", "ends": "2026-08-14",
               "standing": "settled", "seq": 2, "at": "2026-07-15T12:00:00Z"}
    journal.write_text(journal.read_text(encoding="utf-8") + json.dumps(settled) + "\n", encoding="utf-8")
    again = there.try_to("2026-07-15T22:05:00+10:00", "publish", "--output", str(there.output))
    assert "month-1448-02" not in again.output


@pytest.mark.parametrize(
    ("damage", "line"),
    [
        (lambda text: text.replace('"standing":"expected"', '"standing":"perhaps"', 1), 1),
        (lambda text: "<<<<<<< mine\n" + text, 1),
        (lambda text: text.replace('"seq":0', '"seq":"many"', 1), 1),
    ],
    ids=["unknown standing", "conflict marks", "no number"],
)
def test_a_damaged_journal_is_one_message(desk: Desk, damage: Callable[[str], str], line: int) -> None:
    desk.publish(JUNE)
    journal = desk.content / "record/journal.jsonl"
    journal.write_text(damage(journal.read_text(encoding="utf-8")), encoding="utf-8")
    said = desk.publish("2026-06-02T00:00:00Z", exit_code=1)
    assert f"journal.jsonl:{line}: this line is no entry of the journal" in said
    assert "Traceback" not in said


def test_a_journal_cut_in_its_last_line_is_completed(desk: Desk) -> None:
    """A line cut short by a power failure is dropped, and the site in place gives it back."""
    desk.publish(JUNE)
    journal = desk.content / "record/journal.jsonl"
    whole = journal.read_bytes()
    journal.write_bytes(whole[:-40])
    desk.publish("2026-06-02T00:00:00Z")
    assert sorted(journal.read_bytes().splitlines()) == sorted(whole.splitlines())


# Publishes again and again in forked children, each killed at another of its steps on the disk, as the audit events
# of the interpreter tell them; after each the same build is run to its end and must leave what an undisturbed one does.
_KILLED = r"""
import json, os, shutil, signal, sys
from pathlib import Path
import moonwrit.almanac, moonwrit.cli
from moonwrit import building
import moonwrit.publish.site  # loaded before the count begins

content, output, start = (Path(word) for word in sys.argv[1:])
assemble, made = moonwrit.almanac.assemble, {}
def once(content, as_of, until=None):  # the sky is asked once; what is tested is what follows
    if as_of not in made:
        made[as_of] = assemble(content, as_of, until)
    return made[as_of]
moonwrit.almanac.assemble = once
WRITES = {"os.rename", "os.remove", "os.rmdir", "os.mkdir", "shutil.rmtree"}

def publish(kill_at=None, log=None):
    pid = os.fork()
    if pid:
        return os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1])
    count = 0
    def hook(event, args):
        nonlocal count
        if event in WRITES or event == "open" and isinstance(args[1], str) and args[1][:1] in "wax":
            if str(args[0]).startswith((str(content), str(output.parent))):
                if log:
                    os.write(log, event.encode() + b"\n")
                if count == kill_at:
                    os.kill(os.getpid(), signal.SIGKILL)
                count += 1
    sys.addaudithook(hook)
    os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
    try:
        moonwrit.cli.main(["publish", "--content", str(content), "--output", str(output)], standalone_mode=False)
    except BaseException as fault:
        os.write(2, repr(fault).encode())
        os._exit(1)
    os._exit(0)

def begin():
    for folder in (content, output.parent):
        shutil.rmtree(folder, ignore_errors=True)
    shutil.copytree(start / "content", content)
    shutil.copytree(start / "site", output.parent)

def state():
    site = {p.relative_to(output).as_posix(): p.read_bytes().hex() for p in output.rglob("*") if p.is_file()}
    site.pop(".moonwrit")
    beside = sorted(p.name for p in output.parent.iterdir())
    return [site, beside, sorted((content / "record/journal.jsonl").read_text().splitlines())]

begin()
community = building.content_of(content)
once(community, building.today(community, building.now()))
reading, writing = os.pipe()
assert publish(log=writing) == 0
os.close(writing)
events = os.fdopen(reading).read().split()
wanted = state()
swap = events.index("os.rename")
result = {"steps": len(events), "swap": swap, "killed": 0, "wrong": []}
# Every step from the swap on, but of the old site's many files only some.
after = [at for at in range(swap, len(events)) if events[at] not in ("os.remove", "os.rmdir") or at % 20 == 0]
for at in [*range(0, swap, max(1, swap // 4)), *after]:
    begin()
    result["killed"] += publish(kill_at=at) == -signal.SIGKILL
    whole = (output / "index.html").exists() or any(p.name.startswith(".") for p in output.parent.iterdir())
    if not whole or publish() != 0 or state() != wanted:
        result["wrong"].append([at, events[at]])
print(json.dumps(result))
"""


def test_a_build_killed_anywhere_is_completed_by_the_next(desk: Desk, tmp_path: Path) -> None:
    """Old site or new at every moment, and after one more run the journal and the site of an undisturbed build."""
    desk.publish("2026-05-01T00:00:00Z")
    desk.decide("2026-07-15T21:00:00+10:00", "1448-02", "2026-07-16", "sighted")
    start = tmp_path / "start"
    shutil.copytree(desk.content, start / "content")
    shutil.copytree(desk.output, start / "site/output")
    done = subprocess.run(
        [sys.executable, "-c", _KILLED, tmp_path / "at-work", tmp_path / "site/output", start],
        env={**os.environ, "PYTHONPATH": str(ROOT / "generator"), "SOURCE_DATE_EPOCH": "1784113500"},
        capture_output=True, encoding="utf-8", timeout=240,
    )
    assert done.returncode == 0, done.stderr
    result = json.loads(done.stdout)
    assert result["killed"] >= 10
    assert result["wrong"] == []
