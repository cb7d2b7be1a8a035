"""The journal on months and occurrences set by hand: what is a change, what explains it, and what is written."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest

from demonstration import ROOT
from moonwrit.almanac import Almanac
from moonwrit.content.load import load
from moonwrit.content.record import Amendment, Decision
from moonwrit.errors import ContentError
from moonwrit.journal import (
    FILE,
    Entry,
    Ledger,
    SilentChangeError,
    append,
    hold_against,
    month_key,
    read,
    recover,
    site_marker,
)
from moonwrit.observances import Occurrence
from moonwrit.policy import FIXED, Evidence, Margin, Method, Month
from moonwrit.policy.months import Standing

DAY = timedelta(days=1)
FIRST = datetime(2026, 6, 1, 12, 0, 0, 123456, tzinfo=UTC)
"""When everything was published first."""
LATER = FIRST + 10 * DAY
CONTENT = load(ROOT / "content")


def month(number: int, starts: date, length: int = 30, *, standing: Standing = "expected", **more: Any) -> Month:
    return Month(1448, number, starts, length, "calculated", standing, "by-hand", FIXED,
                 Evidence(starts - DAY, None), **more)


def decided(moved: Month, starts: date, at: datetime = LATER - timedelta(hours=1), by: str = "The committee") -> Month:
    """The month with a decision on it."""
    decision = Decision(month=f"1448-{moved.month:02d}", starts=starts, basis="sighted", by=by, at=at)
    return replace(moved, starts=starts, standing="settled", decision=decision)


def occurrence(key: str, of: Month, day: int = 1, length: int = 1) -> Occurrence:
    starts = of.starts + (day - 1) * DAY
    ends = starts + (length - 1) * DAY
    name = key.rpartition("-1448")[0]
    return Occurrence(key, name, 1448, of.month, day, starts, ends, False, of.standing, "fixed", ())


def almanac(months: Sequence[Month], occurrences: Iterable[Occurrence] = (), calendar: str = "main") -> Almanac:
    """One calendar for the year 1448 alone."""
    site = CONTENT.site.model_copy(update={"years": type(CONTENT.site.years)(**{"from": 1448, "to": 1448})})
    declared = CONTENT.site.calendars["main"]
    return Almanac(
        calendar, declared, site, Method("by-hand", "By hand", "", "record"), CONTENT.regions[declared.region],
        {}, {}, tuple(months), (), tuple(occurrences), {}, (), LATER.date(), (),
    )


MUHARRAM = month(1, date(2026, 6, 17))
SAFAR = month(2, date(2026, 7, 17))
RABI = month(3, date(2026, 8, 16))
ASHURA = occurrence("ashura-1448", MUHARRAM, 10)


def publish(
    before: Ledger | None, months: Sequence[Month], occurrences: Iterable[Occurrence] = (), *amendments: Amendment,
    now: datetime = LATER,
) -> Ledger:
    return hold_against(before.history if before else (), [almanac(months, occurrences)], amendments, now)


def published(months: Sequence[Month], *occurrences: Occurrence) -> Ledger:
    return publish(None, months, occurrences, now=FIRST)


def refused(before: Ledger, months: Sequence[Month], occurrences: Iterable[Occurrence] = (), *why: Amendment) -> str:
    with pytest.raises(SilentChangeError) as said:
        publish(before, months, occurrences, *why)
    assert said.value.exit_code == 3
    return str(said.value)


def amendment(at: datetime = FIRST + DAY, **covers: Any) -> Amendment:
    return Amendment(at=at, by="The committee", reason="a new rule", **covers)


def shape(entry: Entry) -> tuple[str, str, int]:
    return entry.key, entry.standing, entry.seq


# --- what is a change -----------------------------------------------------------------------------


def test_the_first_time_everything_is_added_as_it_is() -> None:
    """Number 0, no reason, and the whole second of the build in UTC."""
    made = publish(None, [MUHARRAM], [ASHURA], now=FIRST.astimezone().replace(microsecond=999_999))
    assert made.added == made.history == (
        Entry("main", "month-1448-01", date(2026, 6, 17), date(2026, 7, 16), "expected", 0,
              FIRST.replace(microsecond=0)),
        Entry("main", "ashura-1448", date(2026, 6, 26), date(2026, 6, 26), "expected", 0, FIRST.replace(microsecond=0)),
    )
    assert made.entry("main", "ashura-1448") == made.added[1]
    assert made.moved("main") == ()


def test_what_is_the_same_adds_nothing() -> None:
    before = published([MUHARRAM], ASHURA)
    again = publish(before, [MUHARRAM], [ASHURA])
    assert again.added == ()
    assert again.history == before.history
    assert again.current == before.current


def test_a_date_that_is_settled_as_expected_is_a_line_and_no_move() -> None:
    before = published([MUHARRAM])
    after = publish(before, [decided(MUHARRAM, MUHARRAM.starts)])
    (entry,) = after.added
    assert (*shape(entry), entry.was, entry.because) == ("month-1448-01", "settled", 1, None, None)
    assert entry.at == LATER.replace(microsecond=0)
    assert after.current["main", "month-1448-01"] == entry
    assert after.moved("main") == ()


def test_what_was_amended_stays_so_when_it_is_built_again() -> None:
    """The build says "settled", for it does not know what was published; the journal does."""
    settled = publish(published([MUHARRAM]), [decided(MUHARRAM, MUHARRAM.starts)])
    moved = decided(MUHARRAM, MUHARRAM.starts + DAY, LATER + timedelta(hours=2))
    amended = publish(settled, [moved], now=LATER + DAY)
    (entry,) = amended.added
    assert (*shape(entry), entry.was) == ("month-1448-01", "amended", 2, MUHARRAM.starts)
    assert publish(amended, [moved], now=LATER + 2 * DAY).added == ()


def test_what_was_amended_is_amended_again_when_it_moves_again() -> None:
    before = published([MUHARRAM])
    for turn, starts in enumerate((MUHARRAM.starts, MUHARRAM.starts + DAY, MUHARRAM.starts)):
        at = LATER + turn * DAY
        before = publish(before, [decided(MUHARRAM, starts, at - timedelta(hours=1))], now=at)
    assert [entry.standing for entry in before.history] == ["expected", "settled", "amended", "amended"]
    assert [entry.seq for entry in before.history] == [0, 1, 2, 3]


def test_an_expected_date_that_a_decision_moves_is_settled_and_one_that_follows_it_stays_expected() -> None:
    before = published([MUHARRAM, SAFAR])
    after = publish(before, [decided(MUHARRAM, MUHARRAM.starts - DAY), replace(SAFAR, starts=SAFAR.starts - DAY)])
    assert [shape(entry) for entry in after.added] == [
        ("month-1448-01", "settled", 1), ("month-1448-02", "expected", 1)]
    reason = "decision of 2026-06-11 on month 1448-01 by The committee"
    assert [entry.because for entry in after.added] == [reason, reason]
    assert [entry.was for entry in after.added] == [MUHARRAM.starts, SAFAR.starts]


def test_where_a_month_ends_is_no_date_of_its_own() -> None:
    """A day more is told with the next month; what is current knows it, with the number and moment that it had."""
    before = published([MUHARRAM])
    after = publish(before, [replace(MUHARRAM, length=29)])
    assert after.added == ()
    entry = after.entry("main", "month-1448-01")
    assert entry == replace(before.entry("main", "month-1448-01"), ends=MUHARRAM.ends - DAY)


def test_where_an_observance_ends_is_its_date() -> None:
    before = published([MUHARRAM], occurrence("days-1448", MUHARRAM, 1, 10))
    shorter = occurrence("days-1448", MUHARRAM, 1, 9)
    assert "days-1448: was 2026-06-17 to 2026-06-26 (expected) -> would be 2026-06-17 to 2026-06-25 (expected)" in (
        refused(before, [MUHARRAM], [shorter]))
    after = publish(before, [MUHARRAM], [shorter], amendment(observances=("days",)))
    assert [(entry.ends, entry.was) for entry in after.added] == [(date(2026, 6, 25), date(2026, 6, 17))]


def test_calendars_are_apart() -> None:
    """The same key in another calendar of the site is another thing."""
    both = [almanac([MUHARRAM]), almanac([replace(MUHARRAM, starts=MUHARRAM.starts + DAY)], calendar="other")]
    first = hold_against((), both, (), FIRST)
    assert [(entry.calendar, entry.seq) for entry in first.added] == [("main", 0), ("other", 0)]
    assert hold_against(first.history, both, (), LATER).added == ()


# --- what explains a change -----------------------------------------------------------------------


def test_a_decision_explains_its_month_and_those_after_it_and_none_before() -> None:
    """Two changes without a reason are listed: the month before the one decided, and its observance."""
    before = published([MUHARRAM, SAFAR, RABI], ASHURA)
    moved = replace(MUHARRAM, starts=MUHARRAM.starts - DAY)
    rest = [decided(SAFAR, SAFAR.starts - DAY), replace(RABI, starts=RABI.starts - DAY)]
    said = refused(before, [moved, *rest])
    assert said.startswith("1 published date would change without a recorded reason:\n  month-1448-01: was 2026-06-17")
    after = publish(before, [MUHARRAM, *rest], [ASHURA])
    assert [entry.key for entry in after.added] == ["month-1448-02", "month-1448-03"]


def test_silent_changes_are_counted_and_listed() -> None:
    said = refused(published([MUHARRAM], ASHURA), [replace(MUHARRAM, starts=MUHARRAM.starts - DAY)], [
        replace(ASHURA, starts=ASHURA.starts - DAY, ends=ASHURA.ends - DAY)])
    assert said.splitlines()[:3] == [
        "2 published dates would change without a recorded reason:",
        "  month-1448-01: was 2026-06-17 (expected) -> would be 2026-06-16 (expected), "
        "because 1448-01 begins 2026-06-16: calculated",
        "  ashura-1448: was 2026-06-26 (expected) -> would be 2026-06-25 (expected), "
        "because 1448-01 begins 2026-06-16: calculated",
    ]


def test_a_silent_change_is_told_with_what_was_measured() -> None:
    before = published([MUHARRAM])
    measured = Margin("lag", 47.5, 48.0, -0.5, "min", -0.01, "edge")
    for margin, told in [
        (measured, "calculated, lag 47.5 min against 48\n"),
        (replace(measured, quantity="q", unit=""), "calculated, q 47.5 against 48\n"),
        (replace(measured, value=None), "calculated\n"),
        (replace(measured, threshold=None), "calculated\n"),
    ]:
        assert told in refused(before, [replace(MUHARRAM, starts=MUHARRAM.starts + DAY, margin=margin)])


def test_the_decision_on_the_month_after_explains_an_observance_and_not_the_month() -> None:
    """A run of days may end where the month ends; the month's own first day has nothing to do with the next."""
    before = published([MUHARRAM, SAFAR, RABI], occurrence("run-1448", MUHARRAM, 1, 30))
    shorter = occurrence("run-1448", MUHARRAM, 1, 29)
    next_moved = [MUHARRAM, decided(SAFAR, SAFAR.starts - DAY), RABI]
    assert [entry.key for entry in publish(before, next_moved, [shorter]).added] == ["month-1448-02", "run-1448"]
    second_next = [MUHARRAM, SAFAR, decided(RABI, RABI.starts - DAY)]
    assert "run-1448" in refused(before, second_next, [shorter])


def test_the_latest_month_decided_is_the_reason_and_of_one_month_the_latest_decision() -> None:
    """Muharram's word is older, though it was written later: Rabi al-Awwal hangs on that of Safar."""
    before = published([MUHARRAM, SAFAR, RABI])
    after = publish(before, [
        decided(MUHARRAM, MUHARRAM.starts - DAY, LATER, by="One"),
        decided(SAFAR, SAFAR.starts - DAY, LATER - timedelta(hours=5), by="Another"),
        replace(RABI, starts=RABI.starts - DAY),
    ])
    assert [str(entry.because).rpartition(" by ")[2] for entry in after.added] == ["One", "Another", "Another"]


@pytest.mark.parametrize(("after", "explains"), [(timedelta(seconds=1), True), (timedelta(0), False)])
def test_a_settled_date_moves_only_by_a_decision_made_since(after: timedelta, explains: bool) -> None:
    settled = publish(published([MUHARRAM]), [decided(MUHARRAM, MUHARRAM.starts)])
    at = settled.entry("main", "month-1448-01").at + after
    moved = [decided(MUHARRAM, MUHARRAM.starts + DAY, at)]
    if explains:
        assert [shape(entry) for entry in publish(settled, moved).added] == [("month-1448-01", "amended", 2)]
    else:
        assert "(settled)" in refused(settled, moved)


def test_an_expected_date_moves_by_a_decision_made_before_too() -> None:
    """It was made before the date was published, and written down after."""
    before = published([MUHARRAM])
    assert publish(before, [decided(MUHARRAM, MUHARRAM.starts + DAY, FIRST - DAY)]).added


def test_a_decision_on_a_month_never_published_explains_nothing() -> None:
    """The years are longer than before: the new month was decided, and an old one moves for no reason."""
    before = published([SAFAR])
    said = refused(before, [decided(MUHARRAM, MUHARRAM.starts + DAY), replace(SAFAR, starts=SAFAR.starts + DAY)])
    assert "month-1448-02" in said


@pytest.mark.parametrize(("after", "explains"), [(timedelta(seconds=1), True), (timedelta(0), False)])
def test_an_amendment_explains_what_was_published_before_it(after: timedelta, explains: bool) -> None:
    """Published at the same second, it was known already."""
    before = published([MUHARRAM])
    why = amendment(FIRST.replace(microsecond=0) + after, since="1448-01")
    moved = [replace(MUHARRAM, starts=MUHARRAM.starts + DAY)]
    if explains:
        (entry,) = publish(before, moved, (), why).added
        assert entry.because == f"amendment of {why.at.date()} by The committee: a new rule"
        assert entry.standing == "expected"
    else:
        refused(before, moved, (), why)


def test_an_amendment_explains_only_what_it_covers_and_the_first_that_does_is_named() -> None:
    before = published([MUHARRAM, SAFAR])
    moved = [MUHARRAM, replace(SAFAR, starts=SAFAR.starts + DAY)]
    refused(before, moved, (), amendment(since="1448-03"))
    because = [entry.because for entry in publish(
        before, moved, (), amendment(since="1448-03"), amendment(FIRST + 2 * DAY, since="1448-02"),
        amendment(FIRST + 3 * DAY, since="1448-01"),
    ).added]
    assert because == ["amendment of 2026-06-03 by The committee: a new rule"]


# --- what the content no longer gives -------------------------------------------------------------


def test_an_observance_taken_out_is_withdrawn_once_and_with_a_reason() -> None:
    before = published([MUHARRAM], ASHURA)
    assert "ashura-1448: was 2026-06-26 (expected) -> would be withdrawn" in refused(before, [MUHARRAM])
    why = amendment(observances=("ashura",))
    after = publish(before, [MUHARRAM], (), why)
    (entry,) = after.added
    assert entry == Entry(
        "main", "ashura-1448", ASHURA.starts, ASHURA.ends, "withdrawn", 1, LATER.replace(microsecond=0), None,
        "amendment of 2026-06-02 by The committee: a new rule",
    )
    assert after.moved("main") == (entry,)
    assert after.entry("main", "ashura-1448") == entry
    assert publish(after, [MUHARRAM], (), why, now=LATER + DAY).added == ()


def test_a_withdrawn_observance_that_had_moved_has_not_moved_again() -> None:
    before = published([MUHARRAM], ASHURA)
    moved = decided(MUHARRAM, MUHARRAM.starts + DAY)
    before = publish(before, [moved], [occurrence("ashura-1448", moved, 10)])
    (entry,) = publish(before, [moved], (), amendment(LATER + DAY, observances=("ashura",)), now=LATER + 2 * DAY).added
    assert (*shape(entry), entry.was) == ("ashura-1448", "withdrawn", 2, None)


@pytest.mark.parametrize(
    ("key", "within"),
    [
        ("one-1447", False), ("one-1449", False), ("one-1448", True), ("every-1448-12", True),
        ("nights-1448-9-21", True), ("every-1447-12", False),
        ("since-1448-1449", False), ("since-1449-1448", True), ("unnumbered", False),
    ],
)
def test_only_what_belongs_to_the_years_published_is_withdrawn(key: str, within: bool) -> None:
    """Years that are no longer published are left as they were. The year of a key is what follows the name, though a
    name may hold a number of four figures as well."""
    old = Entry("main", key, date(2026, 8, 1), date(2026, 8, 1), "expected", 0, FIRST)
    if within:
        with pytest.raises(SilentChangeError, match=f"{key}: was 2026-08-01"):
            hold_against([old], [almanac([])], (), LATER)
    else:
        assert hold_against([old], [almanac([])], (), LATER).added == ()


def test_what_another_calendar_published_is_not_withdrawn_from_this_one() -> None:
    old = Entry("other", "one-1448", date(2026, 8, 1), date(2026, 8, 1), "expected", 0, FIRST)
    assert hold_against([old], [almanac([])], (), LATER).added == ()


@pytest.mark.parametrize(("since", "explains"), [("1448-12", True), ("1449-01", False)])
def test_an_amendment_since_a_month_of_the_year_explains_a_withdrawal(since: str, explains: bool) -> None:
    """The key alone does not say in which month of the year it stood."""
    before = published([MUHARRAM], ASHURA)
    if explains:
        assert publish(before, [MUHARRAM], (), amendment(since=since)).added
    else:
        refused(before, [MUHARRAM], (), amendment(since=since))


def test_changes_are_told_newest_first_and_of_one_calendar() -> None:
    """Moves and withdrawals; neither first publications nor what was only settled."""
    def entry(key: str, calendar: str = "main", days: int = 0, **more: Any) -> Entry:
        return Entry(calendar, key, date(2026, 8, 1), date(2026, 8, 1), more.pop("standing", "settled"), 1,
                     FIRST + days * DAY, **more)

    was = date(2026, 8, 2)
    history = (
        entry("a-1448", was=was), entry("b-1448"), entry("c-1448", standing="withdrawn", days=1),
        entry("d-1448", calendar="other", was=was), entry("e-1448", was=was, days=2), entry("f-1448", was=was, days=2),
    )
    keys = [one.key for one in Ledger({}, (), history).moved("main")]
    assert keys == ["f-1448", "e-1448", "c-1448", "a-1448"]


# --- the file -------------------------------------------------------------------------------------

LINE = ('{"calendar":"main","key":"month-1448-01","starts":"2026-06-17","ends":"2026-07-16","standing":"expected",'
        '"seq":0,"at":"2026-06-01T12:00:00Z"}\n')
ENTRY = Entry("main", "month-1448-01", date(2026, 6, 17), date(2026, 7, 16), "expected", 0,
              datetime(2026, 6, 1, 12, tzinfo=UTC))
MOVED = replace(ENTRY, starts=date(2026, 6, 18), seq=1, was=date(2026, 6, 17), because="Überlegung: „so“")


def written(folder: Path, text: str) -> Path:
    file = folder / FILE
    file.parent.mkdir(exist_ok=True)
    file.write_text(text, encoding="utf-8")
    return file


def test_lines_are_plain_and_read_back(tmp_path: Path) -> None:
    """Nothing is said of what an entry has not; letters stand as they are."""
    append(tmp_path, [ENTRY])
    assert (tmp_path / FILE).read_text(encoding="utf-8") == LINE
    append(tmp_path, [MOVED])
    assert read(tmp_path) == (ENTRY, MOVED)
    assert '"was":"2026-06-17","because":"Überlegung: „so“"}\n' in (tmp_path / FILE).read_text(encoding="utf-8")
    assert [file.name for file in (tmp_path / FILE).parent.iterdir()] == ["journal.jsonl"]


def test_where_nothing_is_added_nothing_is_written(tmp_path: Path) -> None:
    assert read(tmp_path) == ()
    append(tmp_path, ())
    assert list(tmp_path.iterdir()) == []


def test_a_line_cut_short_at_the_end_is_left_out_and_written_over(tmp_path: Path) -> None:
    file = written(tmp_path, LINE + LINE[:50])
    assert read(tmp_path) == (ENTRY,)
    append(tmp_path, [MOVED])
    assert read(tmp_path) == (ENTRY, MOVED)
    file.write_text(LINE[:50], encoding="utf-8")
    append(tmp_path, [MOVED])
    assert read(tmp_path) == (MOVED,)


def test_a_damaged_line_elsewhere_is_named_and_empty_ones_are_passed_over(tmp_path: Path) -> None:
    written(tmp_path, f"\n{LINE}  \n{LINE}")
    assert read(tmp_path) == (ENTRY, ENTRY)
    file = written(tmp_path, f"\n{LINE}{LINE[:50]}\n")
    with pytest.raises(ContentError) as said:
        read(tmp_path)
    assert str(said.value).startswith(f"{file}:3: this line is no entry of the journal")


@pytest.mark.parametrize(
    ("old", "new", "sound"),
    [
        ('"seq":0', '"seq":-1', False),
        ('"seq":0', '"seq":2147483647', True),  # the largest SEQUENCE of RFC 5545 (3.3.8)
        ('"seq":0', '"seq":2147483648', False),
        ('"seq":0', '"seq":true', False),
        ('"seq":0', '"seq":1.0', False),
        ("2026-06-17", "0001-12-31", False),
        ("2026-06-17", "0002-01-01", True),
        ("2026-07-16", "9998-12-31", True),
        ("2026-07-16", "9999-01-01", False),
        ("T12:00:00Z", "T12:00:00", False),
        ("main", "Main", False),
        ("main", "-main", False),
        ("main", "second-calendar", True),
        ("month-1448-01", "month-1448-01-", False),
        ('"main"', "7", False),
        ("expected", "withdrawn", True),
        ("expected", "", False),
        ('"seq":0', '"seq":0,"because":null', True),
        ('"seq":0', '"seq":0,"because":7', False),
        ('"seq":0', '"seq":0,"was":"2026-06-1"', False),
        (LINE, "[]\n", False),
        ('"ends":"2026-07-16",', "", False),
    ],
)
def test_what_is_an_entry(tmp_path: Path, old: str, new: str, sound: bool) -> None:
    """Bounds of numbers and days, names that are names, a moment with its zone."""
    assert LINE.count(old) == 1
    written(tmp_path, LINE.replace(old, new))
    if sound:
        assert len(read(tmp_path)) == 1
    else:
        with pytest.raises(ContentError, match="is no entry"):
            read(tmp_path)


def test_a_journal_is_read_up_to_its_bound(tmp_path: Path) -> None:
    """Spaces at the end of a line are no fault; a byte more than 32 MB is."""
    bound = 32 * 1024 * 1024
    written(tmp_path, LINE + " " * (bound - len(LINE)))
    assert read(tmp_path) == (ENTRY,)
    written(tmp_path, LINE + " " * (bound - len(LINE) + 1))
    with pytest.raises(ContentError) as said:
        read(tmp_path)
    assert str(said.value).startswith(f"{tmp_path / FILE}: the journal is larger than 32 MB")


def test_a_journal_that_cannot_be_read_or_written_is_one_message(tmp_path: Path) -> None:
    (tmp_path / FILE).mkdir(parents=True)
    with pytest.raises(ContentError) as said:
        read(tmp_path)
    assert str(said.value).startswith(f"{tmp_path / FILE}: the journal cannot be read (")
    with pytest.raises(ContentError) as said:
        append(tmp_path, [ENTRY])
    assert str(said.value).startswith(f"{tmp_path / FILE}: the journal cannot be written (")


CONTRARY = replace(ENTRY, starts=date(2026, 6, 18))


@pytest.mark.parametrize(
    ("entries", "sound"),
    [
        ([ENTRY, CONTRARY], False),
        ([CONTRARY, ENTRY], False),
        ([ENTRY, replace(ENTRY, standing="settled")], False),
        ([ENTRY, ENTRY], True),
        ([ENTRY, replace(ENTRY, at=FIRST.replace(microsecond=0) + DAY, ends=ENTRY.ends - DAY)], True),
        ([ENTRY, replace(CONTRARY, seq=1)], True),
        ([ENTRY, CONTRARY, replace(CONTRARY, seq=1)], True),
        ([ENTRY, replace(CONTRARY, seq=1), CONTRARY], True),  # an old line that a merge put after the newer
        ([ENTRY, replace(CONTRARY, calendar="other")], True),
        ([ENTRY, replace(CONTRARY, key="month-1448-02")], True),
        ([replace(ENTRY, seq=1), replace(CONTRARY, seq=1), replace(CONTRARY, seq=1)], False),
    ],
)
def test_two_copies_contradict_each_other_only_on_one_thing_under_one_number(
    tmp_path: Path, entries: list[Entry], sound: bool
) -> None:
    """Another first day or standing under the same number, which no later line has settled. No single line is at
    fault."""
    append(tmp_path, entries)
    if sound:
        assert read(tmp_path) == tuple(entries)
    else:
        with pytest.raises(ContentError) as said:
            read(tmp_path)
        assert str(said.value).startswith(
            f"{tmp_path / FILE}: month-1448-01 was published from two copies on different days")
        assert f'add one with "seq":{entries[0].seq + 1} that says which stands' in str(said.value)


def test_the_highest_number_counts_and_of_equals_the_last_line() -> None:
    """A merge may put lines in any order."""
    newer, older = replace(ENTRY, starts=SAFAR.starts, seq=2), replace(ENTRY, starts=RABI.starts, seq=1)
    found = hold_against([older, newer, older], (), (), LATER)
    assert found.entry("main", "month-1448-01") == newer
    again = replace(newer, ends=newer.ends + DAY)
    assert hold_against([newer, again], (), (), LATER).entry("main", "month-1448-01") == again


def test_the_site_gives_back_what_the_journal_lacks(tmp_path: Path) -> None:
    """A build that was stopped before the journal was written; each line once, and only to its own journal."""
    marker = tmp_path / ".moonwrit"
    marker.write_text(site_marker(Ledger({}, (ENTRY, MOVED), (ENTRY, MOVED)), "https://here.example"), encoding="utf-8")
    recover(tmp_path, marker, "https://there.example")
    assert read(tmp_path) == ()
    append(tmp_path, [ENTRY])
    for _ in range(2):
        recover(tmp_path, marker, "https://here.example")
        assert read(tmp_path) == (ENTRY, MOVED)


@pytest.mark.parametrize("damage", ["none", "other head", "cut", "one line", "no entry"])
def test_a_marker_that_is_none_is_left_alone(tmp_path: Path, damage: str) -> None:
    marker, text = tmp_path / ".moonwrit", site_marker(Ledger({}, (ENTRY,), (ENTRY,)), "a")
    texts = {"other head": "x" + text, "cut": text[:-20], "one line": text.partition("\n")[0],
             "no entry": text + "[]\n"}
    if damage in texts:
        marker.write_text(texts[damage], encoding="utf-8")
    recover(tmp_path, marker, "a")
    assert not (tmp_path / FILE).exists()


def test_keys_of_months_are_in_order() -> None:
    assert [month_key(1448, 2), month_key(957, 12)] == ["month-1448-02", "month-957-12"]
