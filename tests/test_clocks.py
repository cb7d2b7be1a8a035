"""New time-zone data: a note for the officer, other times of the clock, and no date that moves."""

from __future__ import annotations

import json
from importlib import resources
from pathlib import Path
from zoneinfo import ZoneInfo

import pytest

from demonstration import Desk, desk_of_one_year
from moonwrit import clocks
from moonwrit.content import models

NOW = "2026-12-01T12:00:00+00:00"


@pytest.fixture
def desk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Desk:
    """A year, published. Without the cache: in life, new data are another package, and everything is made anew."""
    monkeypatch.setenv("MOONWRIT_CACHE", "off")
    desk = desk_of_one_year(tmp_path)
    assert "note:" not in desk.publish(NOW)
    return desk


def without_summer_time(monkeypatch: pytest.MonkeyPatch) -> None:
    """Melbourne as if it had Brisbane's clocks, ten hours ahead all the year (tzdata, northamerica and australasia)."""
    with resources.files("tzdata").joinpath("zoneinfo/Australia/Brisbane").open("rb") as file:
        other = ZoneInfo.from_file(file, key="Australia/Melbourne")
    monkeypatch.setattr(models, "zone_named", lambda name: other)


def lines(desk: Desk, feed: str, name: str) -> list[str]:
    text = (desk.output / "feeds" / feed).read_text(encoding="utf-8")
    return [line for line in text.splitlines() if line.startswith(name)]


def test_what_is_kept_is_what_the_zone_says(desk: Desk) -> None:
    """Expected: summer time in Victoria from the first Sunday of October to that of April, at 16:00 UTC of the Saturday
    (Summer Time Act 1972 (Vic); tzdata), and the same file after another build."""
    kept = (desk.content / clocks.FILE).read_bytes()
    told = json.loads(kept)
    assert sorted(told) == ["gannet-harbour", "lantern-harbour", "wattle-harbour"]
    clock = clocks.read(desk.content)["wattle-harbour"]
    assert (clock.zone, clock.first, clock.last) == ("Australia/Melbourne", 2026, 2027)
    assert [(f"{since:%F %R}", minutes) for since, minutes in clock.offsets] == [
        ("2026-01-01 00:00", 660), ("2026-04-04 16:00", 600), ("2026-10-03 16:00", 660), ("2027-04-03 16:00", 600),
        ("2027-10-02 16:00", 660),
    ]
    assert "note:" not in desk.publish("2026-12-02T12:00:00+00:00")
    assert (desk.content / clocks.FILE).read_bytes() == kept


def test_new_time_zone_data_are_a_note_and_no_shift(desk: Desk, monkeypatch: pytest.MonkeyPatch) -> None:
    """Expected: each place is named with the day from which its clock is another; times of summer evenings follow,
    those of winter ones and every date stand; the journal is not touched; and it is said once."""
    journal = (desk.content / "record/journal.jsonl").read_bytes()
    dates, starts = lines(desk, "observances.ics", "DTSTART"), lines(desk, "evenings.ics", "DTSTART;TZID")
    without_summer_time(monkeypatch)
    said = desk.publish(NOW)
    for place in ("wattle-harbour", "gannet-harbour", "lantern-harbour"):
        assert (
            "note: the time-zone data of Australia/Melbourne have changed: from 2026-01-01 on clocks at "
            f"{place} show UTC+10:00, and UTC+11:00 was published" in said
        )
    assert (desk.content / "record/journal.jsonl").read_bytes() == journal
    assert lines(desk, "observances.ics", "DTSTART") == dates
    after = lines(desk, "evenings.ics", "DTSTART;TZID")
    assert 0 < sum(was != now for was, now in zip(starts, after, strict=True)) < len(starts)
    assert "note:" not in desk.publish(NOW)


def test_another_zone_or_place_is_no_news_of_the_data(desk: Desk) -> None:
    """Expected: a place that was moved to another zone by its officer is not remarked on."""
    text = (desk.content / "places.yaml").read_text(encoding="utf-8")
    moved = text.replace("Australia/Melbourne", "Australia/Brisbane")
    (desk.content / "places.yaml").write_text(moved, encoding="utf-8")
    assert "note:" not in desk.publish(NOW)
    assert clocks.read(desk.content)["wattle-harbour"].zone == "Australia/Brisbane"


@pytest.mark.parametrize("text", [
    b"", b"{", b"[]", b"\xff", b'{"wattle-harbour": 1}', b"[" * 100_000, b" " * 50_000_000,
    b'{"wattle-harbour":{"zone":"Australia/Melbourne","first":2026,"last":2027,"offsets":[]}}',
    b'{"wattle-harbour":{"zone":"Australia/Melbourne","first":0,"last":99999,"offsets":[["2026-01-01T00:00:00Z",1]]}}',
    b'{"wattle-harbour":{"zone":"Australia/Melbourne","first":2026,"last":2027,"offsets":[["2026-01-01T00:00:00",1]]}}',
    b'{"wattle-harbour":{"zone":"Australia/Melbourne","first":2026,"last":2027,"offsets":[["2026-06-01T00:00:00Z",1]]}}',
], ids=range(11))
def test_what_cannot_be_read_is_written_anew(desk: Desk, text: bytes) -> None:
    """Expected: no note, no fault, and the file as it was: it holds nothing that the data do not say."""
    kept = (desk.content / clocks.FILE).read_bytes()
    (desk.content / clocks.FILE).write_bytes(text)
    assert clocks.read(desk.content) == {}
    clocks.keep(desk.content, {}, clocks._CLOCKS.validate_json(kept))
    assert (desk.content / clocks.FILE).read_bytes() == kept
