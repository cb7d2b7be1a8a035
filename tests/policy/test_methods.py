"""Methods that are reckoned ahead, and what a decision does to their months; what methods say of themselves."""

from __future__ import annotations

from datetime import UTC, date, datetime, timedelta
from itertools import pairwise
from zoneinfo import ZoneInfo

import pytest

from moonwrit.calendars import tabular_by_name
from moonwrit.content.record import Decision
from moonwrit.errors import RequestError
from moonwrit.policy import Method, Month, NamedPlace, method
from moonwrit.policy.conditions import Either, Every, Scoped
from moonwrit.policy.evening import evening_at
from moonwrit.policy.walk import Era
from moonwrit.sky.comparison import Comparison, age, lag

DAY = timedelta(days=1)
HERE = NamedPlace("Melbourne", -37.81, 144.96, 0.0, ZoneInfo("Australia/Melbourne"))
TABULAR = method("tabular-16-civil")
STARTS = TABULAR.starts(1447, 1449)
TABLE = Method("table", "Table", "", "record", table=dict(enumerate(STARTS[:25], (1447 - 1) * 12)))
ADOPTING = Method("adopting", "Adopting", "", "record", adopts=(TABULAR, TABLE))


def decision(month: str, starts: date) -> Decision:
    at = datetime(2026, 1, 1, tzinfo=UTC)
    return Decision(month=month, starts=starts, basis="sighted", by="The committee", at=at)


# --- months reckoned ahead, and decisions ---------------------------------------------------------


@pytest.mark.parametrize("asked", [TABULAR, TABLE, ADOPTING], ids=lambda asked: asked.name)
def test_a_decision_moves_its_month_alone_where_months_are_reckoned_ahead(asked: Method) -> None:
    """The month before ends where it begins, it ends where the next begins, and the rest is as it was."""
    plain = asked.months(1447, 1448)
    word = decision("1447-09", plain[8].starts + DAY)
    moved = asked.months(1447, 1448, {word.ordinal: word})
    changed = [index for index, (month, other) in enumerate(zip(plain, moved, strict=True)) if month != other]
    assert changed == [7, 8]
    assert (moved[7].starts, moved[7].length) == (plain[7].starts, plain[7].length + 1)
    month = moved[8]
    assert (month.starts, month.length) == (word.starts, plain[8].length - 1)
    assert (month.basis, month.standing, month.decision) == ("sighted", "settled", word)
    assert month.window == (word.starts, word.starts)
    assert month.evidence == plain[8].evidence
    for before, after in pairwise(moved):
        assert after.starts == before.ends + DAY


@pytest.mark.parametrize("asked", [TABULAR, TABLE, ADOPTING], ids=lambda asked: asked.name)
def test_the_last_month_ends_where_it_would_whatever_day_it_begins(asked: Method) -> None:
    plain = asked.months(1447, 1447)
    word = decision("1447-12", plain[11].starts - DAY)
    moved = asked.months(1447, 1447, {word.ordinal: word})
    assert (moved[11].starts, moved[11].ends) == (word.starts, plain[11].ends)
    assert moved[11].length == plain[11].length + 1


def test_a_decision_outside_the_years_asked_changes_nothing_that_is_reckoned_ahead() -> None:
    word = decision("1446-12", TABULAR.starts(1446, 1446)[11] + DAY)
    assert TABULAR.months(1447, 1447, {word.ordinal: word}) == TABULAR.months(1447, 1447)


def test_a_decision_before_the_years_asked_moves_what_is_reckoned_from_evening_to_evening() -> None:
    """Two months before the first: from the day recorded on, 29 or 30 days by what the sky says."""
    asked = method("yallop-b", None, HERE)
    last = asked.months(1446, 1446)[11]
    word = decision("1446-12", last.starts - DAY)
    assert asked.months(1447, 1447, {word.ordinal: word}) == asked.months(1446, 1447, {word.ordinal: word})[12:]
    first = asked.months(1447, 1447, {word.ordinal: word})[0]
    assert first.evidence.evening == word.starts + timedelta(days=28)


def test_arithmetic_months_are_those_of_the_tabular_calendar() -> None:
    """The evening that is named is the 29th of the month before, also in the first month of a year."""
    calendar = tabular_by_name("tabular-16-civil")
    months = TABULAR.months(1446, 1448)
    for month in months:
        assert month.starts == calendar.month_start(month.year, month.month)
        assert month.length == calendar.month_length(month.year, month.month)
        assert month.evidence.met is None
    for before, month in pairwise(months):
        assert month.evidence.evening == before.starts + timedelta(days=28)


def test_the_first_month_of_all_is_begun_on_the_evening_before_it() -> None:
    """There is none before Muharram of the year 1; that of the civil epoch is 19 July 622 of the Gregorian calendar."""
    first = TABULAR.months(1, 1)[0]
    assert (first.starts, first.evidence.evening) == (date(622, 7, 19), date(622, 7, 18))


def test_a_table_gives_evenings_and_lengths() -> None:
    """The 29th evening of the month before; of the first month of the table as if the month before had 29 days."""
    months = TABLE.months(1447, 1448)
    assert [month.starts for month in months] == list(STARTS[:24])
    assert months[0].evidence.evening == STARTS[0] - DAY
    assert [month.evidence.evening for month in months[1:]] == [start + timedelta(days=28) for start in STARTS[:23]]
    assert [month.length for month in months] == [(b - a).days for a, b in pairwise(STARTS[:25])]
    assert TABLE.months(1448, 1448) == months[12:]
    assert {(month.basis, month.standing, month.policy) for month in months} == {("tabulated", "expected", "table")}


@pytest.mark.parametrize(("years", "missing"), [((1446, 1447), "1446-01"), ((1448, 1449), "1449-02")])
def test_a_month_that_a_table_lacks_is_named(years: tuple[int, int], missing: str) -> None:
    with pytest.raises(RequestError, match=f"the table of Table has no month {missing};"):
        TABLE.months(*years)


def test_an_adopted_month_is_the_first_of_the_authorities_and_takes_their_reasons() -> None:
    """Where all begin together it is that of the first named; the last month has its authority's length."""
    earlier = Method("earlier", "Earlier", "", "calculation", table={
        ordinal: starts - DAY * (ordinal % 12 == 11) for ordinal, starts in enumerate(STARTS[:25], (1447 - 1) * 12)})
    asked = Method("adopting", "Adopting", "", "record", adopts=(TABULAR, earlier))
    months = asked.months(1447, 1447)
    assert [str(month.evidence.notes[0]) for month in months] == [
        *["Adopted from Tabular calendar (16-civil)."] * 11, "Adopted from Earlier."]
    assert [month.starts for month in months] == [*STARTS[:11], STARTS[11] - DAY]
    assert [month.length for month in months[10:]] == [
        (STARTS[11] - STARTS[10]).days - 1, (STARTS[12] - STARTS[11]).days + 1]
    assert {(month.basis, month.standing, month.policy) for month in months} == {("adopted", "expected", "adopting")}
    assert [month.evidence.evening for month in months[:11]] == [
        month.evidence.evening for month in TABULAR.months(1447, 1447)[:11]]


def test_what_is_not_asked_of_the_sky_finds_nothing_on_an_evening() -> None:
    assert TABULAR.on_evenings([(0, date(622, 7, 18))]) is None
    assert TABULAR.on_evenings([]) is None
    assert method("yallop-b", None, HERE).on_evenings([]) == []


# --- eras -----------------------------------------------------------------------------------------


def eras(*conditions: tuple[int, float]) -> tuple[Era, ...]:
    return tuple(Era(first, Scoped(Comparison(age(), ">", hours), HERE.scope())) for first, hours in conditions)


def test_each_month_is_asked_by_the_condition_of_its_era() -> None:
    """From the very month on with which an era begins, in the answer, in the evidence and on any evening."""
    first, second = (1447 - 1) * 12 + 4, (1448 - 1) * 12
    asked = Method("eras", "Eras", "", "record", eras=eras((0, 10.0), (first, 20.0), (second, 30.0)))
    months = asked.months(1447, 1448)
    for month in months:
        threshold = 10.0 if month.ordinal < first else 20.0 if month.ordinal < second else 30.0
        (finding,) = month.evidence.findings
        assert finding.threshold == threshold
        assert finding.met == month.evidence.met == (month.basis == "calculated")
    found = asked.on_evenings([(month.ordinal, month.evidence.evening) for month in reversed(months)])
    assert found is not None
    assert [margin for _, margin in found] == [month.margin for month in reversed(months)]
    assert asked.starts(1447, 1448) == tuple(month.starts for month in months)


def test_first_days_alone_are_asked_for_within_the_same_years() -> None:
    """As with months, a year that cannot be computed is refused, at either end."""
    asked = method("yallop-b", None, HERE)
    assert asked.starts(1318, 1318) == tuple(month.starts for month in asked.months(1318, 1318))
    for first, last, said in [(1317, 1320, "1317"), (1474, 1476, "1476")]:
        with pytest.raises(RequestError, match=f"the year {said} was asked for"):
            asked.starts(first, last)


def test_what_is_found_on_an_evening_does_not_depend_on_how_far_the_conjunction_is() -> None:
    """From two weeks before the conjunction to two weeks after it, the circumstances are those that the evening has
    by itself; only the age is reckoned from the conjunction of the month that is asked for."""
    asked = method("yallop-b", None, HERE)
    month = asked.months(1447, 1447)[5]
    evenings = [month.evidence.evening + timedelta(days=days) for days in range(-14, 15)]
    together = asked.on_evenings([(month.ordinal, evening) for evening in evenings])
    assert together is not None
    for evening, (evidence, _) in zip(evenings, together, strict=True):
        alone = {**evening_at(evening, [HERE])[0], "age_h": None}
        assert {name: alone[name] for name in evidence.circumstances} == {**evidence.circumstances, "age_h": None}


def test_years_before_the_first_era_cannot_be_asked() -> None:
    """The first whole year is named: an era that begins in the midst of a year leaves that one out."""
    since = Method("since", "Since", "", "record", eras=eras(((1446 - 1) * 12 + 1, 10.0)))
    with pytest.raises(RequestError, match="from the year 1447 to 1475 AH, and the year 1446 was asked for"):
        since.months(1446, 1447)
    assert len(since.months(1447, 1447)) == 12
    whole = Method("whole", "Whole", "", "record", eras=eras(((1446 - 1) * 12, 10.0)))
    assert len(whole.months(1446, 1446)) == 12
    with pytest.raises(RequestError, match="from the year 1446 to 1475 AH, and the year 1476 was asked for"):
        whole.months(1470, 1476)
    assert len(whole.months(1475, 1475)) == 12


# --- in words -------------------------------------------------------------------------------------


def test_methods_say_what_they_ask() -> None:
    at = Scoped(Comparison(lag(), ">=", 45.0), HERE.scope())
    besides = Scoped(Comparison(age(), ">", 0.0), HERE.scope())
    lagging, aged = (str(part) for part in (at, besides))
    assert lagging.endswith(", at Melbourne")

    def words(**how: object) -> str:
        return Method("m", "M", "", "record", **how).in_words  # type: ignore[arg-type]

    assert TABULAR.in_words == "arithmetic: tabular-16-civil"
    assert TABLE.in_words == "a table of month starts"
    assert ADOPTING.in_words == "the first to begin a month of: Tabular calendar (16-civil), Table"
    assert words(eras=(Era(0, at),)) == lagging
    assert words(eras=(Era(12, at), Era(1422 * 12, besides))) == f"from 2 AH on, {lagging}; from 1423 AH on, {aged}"
    assert words(eras=(Era(0, Every((at, besides))),)) == f"all of: ({lagging}); ({aged})"
    assert words(eras=(Era(0, Either((at, besides))),)) == f"one of: ({lagging}); ({aged})"


def months_with(length: int) -> list[Month]:
    return [month for month in TABULAR.months(1447, 1447) if month.length == length]


def test_a_month_knows_its_eve_its_end_and_its_number() -> None:
    for month in (months_with(29)[0], months_with(30)[0]):
        assert (month.starts - month.eve, month.ends - month.eve) == (DAY, month.length * DAY)
        assert (month.ordinal // 12, month.ordinal % 12) == (month.year - 1, month.month - 1)
