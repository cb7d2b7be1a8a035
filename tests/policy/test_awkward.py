"""Where the sky does not fit the rules: no sunset, late sunsets, months too short or too long, the finest margins."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from itertools import pairwise
from zoneinfo import ZoneInfo

import pytest

from moonwrit.content.record import Decision
from moonwrit.policy import FIXED, Margin, Method, Month, NamedPlace, method
from moonwrit.policy.conditions import Either, Every, Scoped
from moonwrit.policy.evening import evening_at, evenings_at
from moonwrit.policy.scopes import AtPlaces
from moonwrit.policy.uncertainty import delta_t_error_s, uncertainty_note
from moonwrit.policy.walk import Era
from moonwrit.sky import Places
from moonwrit.sky.comparison import Comparison, age, lag
from moonwrit.sky.criteria import criterion

# Town centres to 0.01 degree, from memory: any point near would do.
TROMSO = NamedPlace("Tromsø", 69.65, 18.96, 0.0, ZoneInfo("Europe/Oslo"))
OSLO = NamedPlace("Oslo", 59.91, 10.75, 0.0, ZoneInfo("Europe/Oslo"))
REYKJAVIK = NamedPlace("Reykjavik", 64.15, -21.94, 0.0, ZoneInfo("Atlantic/Reykjavik"))
NOME = NamedPlace("Nome", 64.50, -165.41, 0.0, ZoneInfo("America/Nome"))
MELBOURNE = NamedPlace("Melbourne", -37.81, 144.96, 0.0, ZoneInfo("Australia/Melbourne"))


def noted(month: Month, words: str) -> bool:
    return any(words in str(note) for note in month.evidence.notes)


def asked_of(condition: Scoped) -> Method:
    return Method("here", "Here", "", "record", eras=(Era(0, condition),))


def with_fallback(place: NamedPlace, instead: NamedPlace) -> AtPlaces:
    return replace(place.scope(), fallback=Places.of([instead.row]), fallback_names=(instead.name,))


# --- no sunset, no moonset ------------------------------------------------------------------------


def test_without_a_sunset_thirty_days_are_completed_and_that_is_said() -> None:
    """Tromsø has neither day nor night for two months around each solstice (common knowledge)."""
    months = method("yallop-b", None, TROMSO).months(1440, 1443)
    dark = [month for month in months if noted(month, "the Sun does not set on this date")]
    assert len(dark) >= 4 * 2
    for month in dark:
        assert month.evidence.evening.month in (5, 6, 7, 11, 12, 1)
        assert (month.basis, month.evidence.met) == ("completed", False)
        assert (month.margin.value, month.margin.margin, month.margin.day_share) == (None, None, None)
        assert month.evidence.circumstances["sunset_utc"] is None
    # In July and January the Sun sets on some of the evenings asked, and then there is a value.
    assert any(m.margin.value is not None for m in months if m.evidence.evening.month in (1, 7))


def test_a_place_without_a_sunset_is_judged_at_the_one_declared_for_it() -> None:
    """On those evenings nothing else is found than there; on the others nothing is moved."""
    rule = criterion("yallop-1997").rule()
    months = asked_of(Scoped(rule, with_fallback(TROMSO, OSLO))).months(1440, 1446)
    moved = [month for month in months if month.evidence.place == "Oslo"]
    assert len(moved) >= 7 * 2
    there = asked_of(Scoped(rule, OSLO.scope()))
    for month in moved:
        assert noted(month, "The Sun does not set at Tromsø on this date: judged at Oslo, as the policy says.")
        found = there.on_evenings([(month.ordinal, month.evidence.evening)])
        assert found is not None
        assert found[0][1] == month.margin
        assert found[0][0].circumstances == month.evidence.circumstances
    for month in [month for month in months if month not in moved]:
        assert month.evidence.place == "Tromsø"
        assert not noted(month, "does not set")
        assert month.evidence.circumstances["sunset_utc"] is not None


def test_a_fallback_changes_nothing_where_the_sun_sets() -> None:
    rule = criterion("yallop-1997").rule()
    plain = asked_of(Scoped(rule, MELBOURNE.scope())).months(1447, 1448)
    assert asked_of(Scoped(rule, with_fallback(MELBOURNE, OSLO))).months(1447, 1448) == plain


def test_a_moon_that_does_not_set_has_an_endless_lag() -> None:
    """The test is met (or, where the Moon stays down, not), and no number is made up for it."""
    months = method("lag-48", None, REYKJAVIK).months(1440, 1450)
    moonless = [m for m in months if m.margin.margin is None and m.evidence.circumstances["sunset_utc"]]
    states = {"stays above": True, "stays below": False}
    assert {month.evidence.circumstances["moon"] for month in moonless} == set(states)
    for month in moonless:
        assert month.evidence.met == states[str(month.evidence.circumstances["moon"])]
        assert month.margin.closeness == "wide"
        assert (month.evidence.findings[0].value, month.evidence.circumstances["lag_min"]) == (None, None)


# --- sunset after midnight ------------------------------------------------------------------------


@pytest.mark.parametrize(("place", "offset_h"), [(REYKJAVIK, 0), (NOME, -8)])
def test_an_evening_keeps_its_date_when_the_sun_sets_after_midnight(place: NamedPlace, offset_h: int) -> None:
    """Through June the clocks of the sunsets pass midnight and come back; no evening is skipped nor counted twice.
    Offsets from UTC as of June (IANA tz database)."""
    late = 0
    sunsets = []
    for day in range(30):
        on = date(2026, 6, 10) + timedelta(days=day)
        said = str(evening_at(on, [place])[0]["sunset_utc"])
        local = datetime.fromisoformat(said).astimezone(UTC) + timedelta(hours=offset_h)
        sunsets.append(local)
        past_midnight = local.date() == on + timedelta(days=1)
        assert past_midnight or local.date() == on
        assert not past_midnight or local.hour < 3
        late += past_midnight
    assert late > 0
    for before, after in pairwise(sunsets):
        assert abs(after - before - timedelta(days=1)) < timedelta(minutes=10)


def test_a_month_begins_on_the_date_after_that_of_the_evening_all_the_same() -> None:
    """In Nome the clock has passed midnight at most summer sunsets; the first day is the date that follows."""
    months = method("mabims-2021", None, NOME).months(1440, 1450)
    late = []
    for month in months:
        sunset = datetime.fromisoformat(str(month.evidence.circumstances["sunset_utc"])).astimezone(NOME.zone)
        if sunset.date() > month.evidence.evening:
            late.append(month)
            assert sunset.date() == month.evidence.evening + timedelta(days=1)
        else:
            assert sunset.date() == month.evidence.evening
        assert month.starts == month.evidence.evening + timedelta(days=1 if month.evidence.met else 2)
    assert {month.evidence.met for month in late} == {True, False}


# --- months that the sky would make too short or too long -----------------------------------------


def test_a_crescent_on_the_28th_evening_waits_for_the_29th() -> None:
    """The month before keeps its 29 days, and the note says so when, and only when, the 28th evening met the test.

    Once the old Moon met it there, an hour of lag just before the conjunction, and the new one on the 29th evening
    did not: that month before has 30 days, and no note says that it was given 29."""
    asked = method("lag-48", None, REYKJAVIK)
    months = asked.months(1440, 1448)[1:]
    day_before = asked.on_evenings([(m.ordinal, m.evidence.evening - timedelta(days=1)) for m in months])
    assert day_before is not None
    met_early = [evidence.met for evidence, _ in day_before]
    for before, month, early in zip(months[:-1], months[1:], met_early[1:], strict=True):
        assert noted(month, "met on the 28th evening already") == (early and month.evidence.met)
        if early:
            assert (before.length, month.basis) == ((29, "calculated") if month.evidence.met else (30, "completed"))
    assert {month.evidence.met for month, early in zip(months, met_early, strict=True) if early} == {True, False}


def test_no_month_has_31_days_though_the_test_fails_on_the_30th_evening() -> None:
    asked = method("rgo-sheet-6", None, MELBOURNE)
    months = asked.months(1430, 1460)[1:]
    day_after = asked.on_evenings([(m.ordinal, m.evidence.evening + timedelta(days=1)) for m in months])
    assert day_after is not None
    too_long = [not month.evidence.met and not after.met for month, (after, _) in zip(months, day_after, strict=True)]
    assert too_long == [noted(month, "not met on the 30th evening either") for month in months]
    assert any(too_long)
    for before, month, late in zip(months[:-1], months[1:], too_long[1:], strict=True):
        if late:
            assert (before.length, month.basis) == (30, "completed")


@pytest.mark.parametrize(("threshold", "length", "words"), [(-1e6, 29, "28th evening"), (1e6, 30, "30th evening")])
def test_a_test_that_is_always_or_never_met_gives_months_of_29_or_30_days(
    threshold: float, length: int, words: str
) -> None:
    """And each of them says that the rule had to do with the length what the sky did not."""
    months = asked_of(Scoped(Comparison(lag(), ">", threshold), MELBOURNE.scope())).months(1447, 1447)
    assert {month.length for month in months} == {length}
    assert all(noted(month, words) for month in months)


# --- margins finer than what is known -------------------------------------------------------------


def margin(day_share: float | None) -> Margin:
    return replace(FIXED, day_share=day_share)


def test_uncertainty_grows_with_the_years_after_those_measured() -> None:
    """delta-T is known to a tenth of a second where it was measured, and to seconds a generation on."""
    errors = [delta_t_error_s(year) for year in (1950, 2020, 2030, 2050, 2100, 2500)]
    assert errors == sorted(errors)
    assert errors[1] == 0.1
    assert 1 < errors[3] < 20
    assert errors[5] > 100


def test_uncertainty_grows_with_the_years_before_those_measured() -> None:
    """Before clocks and occultations were exact it is a second in 1800 and many in 1600."""
    errors = [delta_t_error_s(year) for year in (1950, 1850, 1780, 1720, 1650, 1560)]
    assert errors == [0.1, 1.0, 2.0, 5.0, 20.0, 20.0]


@pytest.mark.parametrize(
    ("year", "error_s"),
    [
        (1600, 20.0), (1699, 20.0), (1700, 5.0), (1749, 5.0), (1750, 2.0), (1799, 2.0), (1800, 1.0), (1899, 1.0),
        (1900, 0.1), (2026, 0.1), (2027, 0.1),
        # by hand: 365.25 N sqrt(N x 0.058/3 x (1 + N/2500)) / 1000 with N = 2, 100 and 500 (the root of 11.6)
        (2028, 0.1437), (2126, 51.792), (2526, 621.998),
    ],
)
def test_uncertainty_of_single_years(year: int, error_s: float) -> None:
    """The steps of the table stand at its years; from 2026 on the formula, but never less than 0.1 s."""
    assert delta_t_error_s(year) == pytest.approx(error_s, rel=1e-4)


@pytest.mark.parametrize("seconds", [0.0, 0.05, 0.19])
@pytest.mark.parametrize("sign", [1, -1])
def test_a_margin_within_two_errors_is_said_to_be_so(seconds: float, sign: int) -> None:
    """Whether just met or just not met. Two errors are 0.2 s in a year that was measured."""
    notes = uncertainty_note(margin(sign * seconds / 86400), date(2020, 1, 1))
    assert [str(note) for note in notes] == [
        "The margin is smaller than the uncertainty of the Earth's rotation in that year (about 0.1 s)."
    ]


def test_a_wider_margin_or_none_is_not() -> None:
    assert uncertainty_note(margin(0.21 / 86400), date(2020, 1, 1)) == ()
    assert uncertainty_note(margin(-0.01), date(2050, 1, 1)) == ()
    assert uncertainty_note(margin(None), date(2050, 1, 1)) == ()  # arithmetic does not hang on the Earth


@pytest.mark.parametrize(("seconds", "said"), [(3, True), (-3, True), (120, False), (-120, False)])
def test_a_month_that_hangs_on_seconds_says_so(seconds: float, said: bool) -> None:
    """A threshold is put that far from the Moon's age on one evening of 2047, whose error is about five seconds."""
    ramadan_1470 = (1470 - 1) * 12 + 8
    plain = asked_of(Scoped(Comparison(age(), ">", 12.0), MELBOURNE.scope()))
    month = next(m for m in plain.months(1470, 1470) if m.ordinal == ramadan_1470)
    age_h = month.margin.value
    assert age_h is not None
    fine = asked_of(Scoped(Comparison(age(), ">", age_h - seconds / 3600), MELBOURNE.scope()))
    found = fine.on_evenings([(ramadan_1470, month.evidence.evening)])
    assert found is not None
    evidence, closely = found[0]
    assert evidence.met == (seconds > 0)
    assert bool(uncertainty_note(closely, month.starts)) == said
    assert closely.closeness == "edge"


# --- planning windows -----------------------------------------------------------------------------


def decided(month: Month, starts: date) -> Decision:
    return Decision(
        month=f"{month.year}-{month.month:02d}", starts=starts, basis="sighted", by="The committee",
        at=datetime.combine(month.evidence.evening, datetime.min.time(), UTC) + timedelta(hours=12),
    )


def test_a_decision_leaves_nothing_open_and_narrows_what_follows() -> None:
    asked = method("yallop-b", None, MELBOURNE)
    open_months = asked.months(1447, 1448)
    first = open_months[3]
    months = asked.months(1447, 1448, {first.ordinal: decided(first, first.starts)})
    assert months[3].window == (first.starts, first.starts)
    assert (months[3].standing, months[3].basis) == ("settled", "sighted")
    assert months[:3] == open_months[:3]
    earliest, latest = window(months[4])
    assert first.starts + timedelta(days=29) <= earliest <= latest <= first.starts + timedelta(days=30)
    for narrowed, wide in zip(months[4:], open_months[4:], strict=True):
        assert window(wide)[0] <= window(narrowed)[0]
        assert window(narrowed)[1] <= window(wide)[1]


def test_after_a_decision_the_window_is_what_the_rules_leave_open() -> None:
    """29 or 30 days after the day decided, but not before the evening after the conjunction, nor, where that leaves a
    choice, after the second evening that follows it: reckoned here from the sunsets themselves."""
    asked = method("yallop-b", None, MELBOURNE)
    months = asked.months(1447, 1448)
    spans = set()
    for before, month in pairwise(months):
        conjunction = month.evidence.conjunction
        assert conjunction is not None
        days = [conjunction.date() + timedelta(days=n) for n in (-1, 0, 1)]
        sunsets = [str(evening_at(day, [MELBOURNE])[0]["sunset_utc"]) for day in days]
        after = (day for day, at in zip(days, sunsets, strict=True) if datetime.fromisoformat(at) > conjunction)
        first = next(after) + timedelta(days=1)
        for start in window(before):
            earliest = max(start + timedelta(days=29), first)
            latest = max(earliest, min(start + timedelta(days=30), first + timedelta(days=2)))
            after_it = asked.months(1447, 1448, {before.ordinal: decided(before, start)})
            found = next(each for each in after_it if each.ordinal == month.ordinal)
            assert window(found) == (min(earliest, found.starts), max(latest, found.starts))
            spans.add(((window(found)[0] - start).days, (window(found)[1] - start).days))
    assert spans == {(29, 30), (29, 29), (30, 30)}  # open, and closed by the Moon on either side


@pytest.mark.parametrize(("place", "dark"), [(MELBOURNE, False), (TROMSO, True)])
def test_the_windows_of_thirty_years_are_reckoned_from_one_month_to_the_next(place: NamedPlace, dark: bool) -> None:
    """By the same rules, with the sunsets of each conjunction's date and its neighbours; where the Sun does not set
    around it, the month is planned for as late as the walk looks. Now and then a sunset follows the conjunction within
    the hour, and counts."""
    months = method("yallop-b", None, place).months(1430, 1460)
    conjunctions = [month.evidence.conjunction or datetime.max for month in months]
    around = [[moment.date() + timedelta(days=n) for n in (-1, 0, 1, 2)] for moment in conjunctions]
    rows = evenings_at([day for days in around for day in days], [place])
    sunsets = [row["sunset_utc"] for (row,) in rows]
    soon = without = 0
    earliest, latest = window(months[0])
    for index in range(1, len(months)):
        month, conjunction, days = months[index], conjunctions[index], around[index]
        after = [
            (day, datetime.fromisoformat(at) - conjunction)
            for day, at in zip(days, sunsets[4 * index : 4 * index + 4], strict=True)
            if isinstance(at, str) and datetime.fromisoformat(at) > conjunction
        ]
        first = (after[0][0] if after else days[-1]) + timedelta(days=1)
        soon += bool(after) and after[0][1] < timedelta(hours=1)
        without += not after
        earliest = max(earliest + timedelta(days=29), first)
        latest = max(earliest, min(latest + timedelta(days=30), first + timedelta(days=2)))
        earliest, latest = min(earliest, month.starts), max(latest, month.starts)
        assert window(month) == (earliest, latest)
    assert soon > 3
    assert (without > 3) == dark


def test_tests_at_two_places_joined_plan_as_one_test_at_both() -> None:
    """Melbourne, and Reykjavik ten hours later: between their sunsets comes the conjunction of many a month, so that
    a month may begin in one of them on an evening on which it may not in every one."""
    rule = criterion("yallop-1997").rule()
    both = AtPlaces(("Melbourne", "Reykjavik"), Places.of([MELBOURNE.row, REYKJAVIK.row]))
    parts = (Scoped(rule, MELBOURNE.scope()), Scoped(rule, REYKJAVIK.scope()))
    planned = []
    for joined, needed in ((Every(parts), 1.0), (Either(parts), 0.0)):
        months, others = (
            Method("here", "Here", "", "record", eras=(Era(0, condition),)).months(1440, 1446)
            for condition in (joined, Scoped(rule, replace(both, needed=needed)))
        )
        planned.append([(month.starts, window(month)) for month in months])
        assert planned[-1] == [(month.starts, window(month)) for month in others]
    assert sum(every != either for every, either in zip(*planned, strict=True)) > 20


def test_the_first_month_of_a_policy_leaves_nothing_open_and_the_next_at_most_a_day() -> None:
    """There is nothing before it from which it might have come out otherwise: it begins on the first evening that
    meets the test, and no rule about the month before had to do with it."""
    since_1447 = Era((1447 - 1) * 12, Scoped(criterion("yallop-1997").rule(), MELBOURNE.scope()))
    first, second, *_ = Method("here", "Here", "", "record", eras=(since_1447,)).months(1447, 1447)
    assert window(first) == (first.starts, first.starts)
    assert (first.basis, first.evidence.met, first.evidence.evening, first.evidence.notes) == (
        "calculated", True, first.eve, ())
    assert first.margin.day_share is not None
    assert first.margin.day_share > 0
    assert first.starts + timedelta(days=29) <= window(second)[0]
    assert window(second)[1] <= first.starts + timedelta(days=30)


def window(month: Month) -> tuple[date, date]:
    assert month.window is not None
    return month.window


def test_whatever_is_decided_within_a_window_the_later_months_keep_to_theirs() -> None:
    """The earliest and the latest day of each month's window are decided in turn; what the policy then expects of the
    next half year lies within the windows that were announced before."""
    asked = method("yallop-b", None, MELBOURNE)
    months = asked.months(1446, 1448)
    tried = 0
    for index, month in enumerate(months[:-6]):
        for starts in {*window(month)} - {month.starts}:
            tried += 1
            after = asked.months(1446, 1448, {month.ordinal: decided(month, starts)})
            for moved, announced in zip(after[index : index + 7], months[index:], strict=False):
                earliest, latest = window(announced)
                assert earliest <= moved.starts <= latest
    assert tried > 20


def test_a_month_never_begins_before_the_evening_after_its_conjunction() -> None:
    """That is what the window's first day allows at the earliest, wherever the walk has got to."""
    for month in method("odeh-b", None, MELBOURNE).months(1446, 1448):
        conjunction = month.evidence.conjunction
        assert conjunction is not None
        first_sunset = evening_at(window(month)[0] - timedelta(days=1), [MELBOURNE])[0]["sunset_utc"]
        assert conjunction < datetime.fromisoformat(str(first_sunset))
