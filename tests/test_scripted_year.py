"""A year as its public lives through it: expected dates, three decisions, and a subscriber's calendar after each.

The subscriber is vdirsyncer, which fetches the feed over HTTP, and khal, which reads what it fetched. vdirsyncer puts
hashes in place of the UIDs of a plain HTTP feed, so events are told apart by their titles and counted; that UIDs last
is held against the feed itself.
"""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Iterator
from datetime import date
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest

from demonstration import Desk, desk_of_one_year
from live_subscriber import Subscriber, subscribed


@pytest.fixture
def community(tmp_path: Path) -> Desk:
    return desk_of_one_year(tmp_path)


@pytest.fixture
def subscriber(community: Desk, tmp_path: Path) -> Iterator[Subscriber]:
    community.publish("2026-06-01T00:00:00Z")
    with subscribed(community.output, tmp_path / "home", ["observances.ics"]) as reader:
        yield reader


def _look(subscriber: Subscriber) -> list[tuple[str, date]]:
    return [(title, date.fromisoformat(start)) for title, start in subscriber.look("observances.ics")]


def _plain(title: str) -> str:
    """A title without what it says of its standing."""
    return title.partition(" (")[0]


def _uids(community: Desk) -> list[str]:
    lines = _feed(community, "observances.ics").replace("\r\n ", "").splitlines()
    return sorted(line for line in lines if line.startswith("UID:"))


def _feed(community: Desk, name: str) -> str:
    return (community.output / "feeds" / name).read_text(encoding="utf-8")


@pytest.mark.judge("vdirsyncer", "khal")
def test_subscribers_follow_three_decisions_and_lose_nothing(community: Desk, subscriber: Subscriber) -> None:
    """One decision as expected, one that moves a month by a day, one superseded the same night."""
    expected = _look(subscriber)
    assert ("Ramadan (expected)", date(2027, 2, 9)) in expected
    assert ("Eid al-Fitr (expected)", date(2027, 3, 11)) in expected
    uids = _uids(community)

    # As expected: nothing moves, and what hangs on that month alone is no longer only expected.
    community.decide("2027-01-08T21:00:00+11:00", "1448-08", "2027-01-10", "completed")
    community.publish("2027-01-08T21:05:00+11:00")
    first = _look(subscriber)
    assert sorted(day for _, day in first) == sorted(day for _, day in expected)
    mid_shaban = ("Mid-Shaban: night of 15 Shaban (begins at sunset)", date(2027, 1, 23))
    assert mid_shaban in first
    assert mid_shaban not in expected

    # Sighted a day before it was expected: Ramadan moves, and the feast that ends it with it.
    community.decide("2027-02-07T21:00:00+11:00", "1448-09", "2027-02-08", "sighted")
    community.publish("2027-02-07T21:05:00+11:00")
    second = _look(subscriber)
    assert ("Ramadan (expected; moved)", date(2027, 2, 8)) in second  # its last day is still open
    assert ("Eid al-Fitr (expected; moved)", date(2027, 3, 10)) in second
    assert mid_shaban in second

    # Completed, and two hours later a late report is accepted: the second word stands.
    community.decide("2027-05-07T20:00:00+10:00", "1448-12", "2027-05-09", "completed")
    community.publish("2027-05-07T20:05:00+10:00")
    assert [day for title, day in _look(subscriber) if title.startswith("Eid al-Adha")] == [date(2027, 5, 18)]
    community.decide("2027-05-07T22:00:00+10:00", "1448-12", "2027-05-08", "sighted")
    community.publish("2027-05-07T22:05:00+10:00")
    third = _look(subscriber)
    assert ("Eid al-Adha (moved)", date(2027, 5, 17)) in third

    # None is doubled and none is lost, and each keeps its UID.
    for later in (first, second, third):
        assert Counter(_plain(title) for title, _ in later) == Counter(_plain(title) for title, _ in expected)
    assert _uids(community) == uids

    # The journal and the notices tell the same story.
    lines = [json.loads(line) for line in (community.content / "record/journal.jsonl").read_text().splitlines()]
    moved = {(one["key"], one["starts"]) for one in lines if "was" in one}
    assert ("month-1448-09", "2027-02-08") in moved
    assert ("eid-al-fitr-1448", "2027-03-10") in moved
    assert {("month-1448-12", "2027-05-09"), ("month-1448-12", "2027-05-08")} & moved
    atom = ET.fromstring(_feed(community, "notices.atom"))
    titles = [str(title.text) for title in atom.iterfind("{*}entry/{*}title")]
    told = [one["title"] for one in json.loads(_feed(community, "notices.json"))["items"]]
    assert titles == told
    assert len([title for title in told if " has moved to " in title]) == len([one for one in lines if "was" in one])
    assert [title for title in told if title.startswith("Dhu al-Hijja 1448 begins on")] == [
        "Dhu al-Hijja 1448 begins on Saturday, 8 May 2027", "Dhu al-Hijja 1448 begins on Sunday, 9 May 2027",
    ]
    page = (community.output / "changes/index.html").read_text(encoding="utf-8")
    assert page.count("<tr><td>") == len([one for one in lines if "was" in one])


def test_replay_gives_what_the_public_saw(community: Desk, tmp_path: Path) -> None:
    """``publish --as-of`` a past day writes byte for byte the site of that day, whatever was decided since."""
    community.publish("2027-02-05T12:00:00+11:00")
    community.decide("2027-02-07T21:00:00+11:00", "1448-09", "2027-02-08", "sighted")
    community.publish("2027-02-07T23:00:00+11:00")
    seen = _files(community.output)
    community.decide("2027-05-07T20:00:00+10:00", "1448-12", "2027-05-08", "sighted")
    community.publish("2027-05-07T20:05:00+10:00")
    journal = (community.content / "record/journal.jsonl").read_bytes()
    assert _files(community.output) != seen

    replayed = tmp_path / "replayed"
    community.do("2028-01-01T00:00:00Z", "publish", "--as-of", "2027-02-07", "--output", str(replayed))
    assert _files(replayed) == seen
    community.do("2028-01-01T00:00:00Z", "publish", "--output", str(replayed))
    lines = (community.content / "record/journal.jsonl").read_bytes().splitlines()
    assert lines == journal.splitlines(), "a replay leaves nothing behind for the journal"


def _files(folder: Path) -> dict[str, bytes]:
    return {
        path.relative_to(folder).as_posix(): path.read_bytes()
        for path in folder.rglob("*") if path.is_file() and path.name != ".moonwrit"
    }
