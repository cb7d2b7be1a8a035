"""Observance rules on months whose first days and lengths are set by hand."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import date, timedelta
from itertools import pairwise
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moonwrit.content.models import Observance, When
from moonwrit.observances import Occurrence, occurrences
from moonwrit.policy.months import FIXED, Closeness, Evidence, Margin, Month, Standing

DAY = timedelta(days=1)


def month(
    number: int,
    starts: date,
    length: int,
    *,
    year: int = 1447,
    standing: Standing = "settled",
    closeness: Closeness = "fixed",
) -> Month:
    margin = FIXED if closeness == "fixed" else Margin("q", 0.0, 0.0, 0.0, "", 0.0, closeness)
    evidence = Evidence(starts - DAY, None)
    return Month(year, number, starts, length, "arithmetic", standing, "by-hand", margin, evidence)


# Ramadan 1447 from Thursday 19 February to Friday 20 March 2026 where it has thirty days. These are
# examples set by hand; nothing here says on which day that month begins anywhere.
LONG = month(9, date(2026, 2, 19), 30)
SHORT = month(9, date(2026, 2, 19), 29)


def rule(**when: Any) -> Observance:
    return Observance(name={"": "it"}, when=When(**when), tags=["main"])


def found(months: Sequence[Month], **when: Any) -> tuple[Occurrence, ...]:
    return occurrences({"it": rule(**when)}, months)


def dates(found: Iterable[Occurrence]) -> list[tuple[date, date]]:
    return [(one.starts, one.ends) for one in found]


def test_a_fixed_day() -> None:
    assert found([LONG], month=9, day=1) == (
        Occurrence(
            key="it-1447",
            observance="it",
            year=1447,
            month=9,
            day=1,
            starts=date(2026, 2, 19),
            ends=date(2026, 2, 19),
            night=False,
            standing="settled",
            closeness="fixed",
            tags=("main",),
        ),
    )
    assert dates(found([LONG], month=9, day=30)) == [(date(2026, 3, 20), date(2026, 3, 20))]


def test_another_month_has_none() -> None:
    assert found([LONG], month=10, day=1) == ()


def test_the_thirtieth_of_a_short_month_does_not_occur() -> None:
    assert found([SHORT], month=9, day=30) == ()
    assert found([SHORT], month=9, day=30, night=True) == ()


@pytest.mark.parametrize(("ramadan", "last"), [(LONG, date(2026, 3, 20)), (SHORT, date(2026, 3, 19))])
def test_the_last_day_follows_the_length(ramadan: Month, last: date) -> None:
    (one,) = found([ramadan], month=9, day="last")
    assert (one.starts, one.ends, one.day) == (last, last, ramadan.length)


@pytest.mark.parametrize(("ramadan", "last"), [(LONG, date(2026, 3, 20)), (SHORT, date(2026, 3, 19))])
def test_a_whole_month(ramadan: Month, last: date) -> None:
    assert dates(found([ramadan], month=9, day=1, run="month")) == [(date(2026, 2, 19), last)]


def test_a_run_is_one_occurrence() -> None:
    (one,) = found([LONG], month=9, day=8, run=6)
    assert (one.day, one.starts, one.ends) == (8, date(2026, 2, 26), date(2026, 3, 3))


def test_a_run_goes_on_into_the_next_month() -> None:
    # Four civil days from the 28th of 29: 18, 19 March and the first two days of the next month.
    assert dates(found([SHORT], month=9, day=28, run=4)) == [(date(2026, 3, 18), date(2026, 3, 21))]


def test_a_night_begins_on_the_civil_date_before_its_day() -> None:
    (one,) = found([LONG], month=9, day=27, night=True)
    assert (one.day, one.starts, one.ends, one.night) == (27, date(2026, 3, 16), date(2026, 3, 16), True)


def test_the_night_of_the_first_day_is_the_eve_with_the_new_month_s_standing() -> None:
    before = month(8, date(2026, 1, 20), 30)
    expected = month(9, date(2026, 2, 19), 30, standing="expected", closeness="edge")
    (one,) = found([before, expected], month=9, day=1, night=True)
    assert one.starts == before.ends == expected.eve
    assert (one.month, one.standing, one.closeness) == (9, "expected", "edge")


@pytest.mark.parametrize(
    ("weekday", "ramadan", "expected"),
    [
        ("friday", LONG, date(2026, 3, 20)),
        ("friday", SHORT, date(2026, 3, 13)),
        ("thursday", SHORT, date(2026, 3, 19)),
        ("saturday", LONG, date(2026, 3, 14)),
    ],
)
def test_the_last_weekday(weekday: str, ramadan: Month, expected: date) -> None:
    (one,) = found([ramadan], month=9, last=weekday)
    assert one.starts == one.ends == expected
    assert ramadan.starts + (one.day - 1) * DAY == expected


def test_the_last_ten_nights_of_thirty_days_are_ten_and_of_29_nine() -> None:
    long = found([LONG], month=9, last_nights=10)
    assert [one.day for one in long] == [*range(21, 31)]
    assert [one.key for one in long][:2] == ["it-1447-21", "it-1447-22"]
    assert all(one.night and one.starts == one.ends for one in long)
    assert long[0].starts == date(2026, 3, 10)
    assert [one.day for one in found([SHORT], month=9, last_nights=10)] == [*range(21, 30)]


@pytest.mark.parametrize("ramadan", [LONG, SHORT])
def test_the_odd_nights(ramadan: Month) -> None:
    odd = found([ramadan], month=9, last_nights=10, odd=True)
    assert [one.day for one in odd] == [21, 23, 25, 27, 29]


def test_a_monthly_rule_names_the_month_in_its_key() -> None:
    months = [LONG, month(10, date(2026, 3, 21), 29)]
    white = found(months, month="every", day=13, run=3)
    assert [one.key for one in white] == ["it-1447-9", "it-1447-10"]
    assert dates(white) == [(date(2026, 3, 3), date(2026, 3, 5)), (date(2026, 4, 2), date(2026, 4, 4))]


def test_order_is_by_civil_date_then_as_written() -> None:
    rules = {
        "zeta": rule(month=9, day=1),
        "alpha": rule(month=9, day=1),
        "eve": rule(month=9, day=1, night=True),
        "earlier": rule(month=8, day="last"),
    }
    months = [month(8, date(2026, 1, 20), 30), LONG]
    assert [one.observance for one in occurrences(rules, months)] == ["eve", "earlier", "zeta", "alpha"]


@pytest.mark.parametrize(
    ("own", "following", "weaker"),
    [("wide", "edge", "edge"), ("close", "wide", "close"), ("fixed", "wide", "wide"), ("fixed", "fixed", "fixed")],
)
def test_what_hangs_on_where_the_month_ends_is_as_close_as_the_closer_of_both_months(
    own: Closeness, following: Closeness, weaker: Closeness
) -> None:
    """The 30th day and what follows it does; the 29th is there in any case, and hangs on its own month alone."""
    months = [month(9, date(2026, 2, 19), 30, closeness=own), month(10, date(2026, 3, 21), 29, closeness=following)]
    rules: list[tuple[dict[str, Any], Closeness]] = [
        ({"day": "last"}, weaker), ({"last": "friday"}, weaker), ({"day": 1, "run": "month"}, weaker),
        ({"day": 30}, weaker), ({"day": 28, "run": 3}, weaker), ({"day": 29}, own), ({"day": 28, "run": 2}, own),
    ]
    for when, expected in rules:
        (one,) = found(months, month=9, **when)
        assert one.closeness == expected


# Properties

_WEEKDAYS = ["monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday"]


@st.composite
def years_of_months(draw: st.DrawFn) -> list[Month]:
    """Up to thirty consecutive months of 29 or 30 days, from any month on, of any standing and closeness."""
    lengths = draw(st.lists(st.sampled_from([29, 30]), min_size=1, max_size=30))
    starts = draw(st.dates(date(1900, 1, 1), date(2100, 1, 1)))
    first = draw(st.integers(1447 * 12, 1448 * 12))
    months = []
    for step, length in enumerate(lengths):
        year, number = divmod(first + step, 12)
        standing: Standing = draw(st.sampled_from(["expected", "settled", "amended"]))
        closeness: Closeness = draw(st.sampled_from(["edge", "close", "wide", "fixed"]))
        months.append(month(number + 1, starts, length, year=year, standing=standing, closeness=closeness))
        starts += length * DAY
    return months


_MONTH = st.one_of(st.integers(1, 12), st.just("every"))
_WHEN = st.one_of(
    st.builds(
        When,
        month=_MONTH,
        day=st.one_of(st.integers(1, 30), st.just("last")),
        run=st.one_of(st.integers(1, 30), st.just("month")),
    ),
    st.builds(When, month=_MONTH, day=st.integers(1, 30), night=st.just(True)),
    st.builds(When, month=_MONTH, last=st.sampled_from(_WEEKDAYS)),
    st.builds(When, month=_MONTH, last_nights=st.integers(1, 29), odd=st.booleans()),
)
_RULES = st.dictionaries(
    st.from_regex(r"[a-z]{1,8}(-[a-z]{1,8})?", fullmatch=True),
    st.builds(Observance, name=st.just({"": "it"}), when=_WHEN),
    max_size=5,
)


@settings(deadline=None)  # a busy machine is no fault
@given(_RULES, years_of_months())
def test_every_occurrence_belongs_to_its_month(rules: dict[str, Observance], months: list[Month]) -> None:
    by_number = {(m.year, m.month): m for m in months}
    next_of = dict(zip(((m.year, m.month) for m in months), months[1:], strict=False))
    for one in occurrences(rules, months):
        home = by_number[one.year, one.month]
        when = rules[one.observance].when
        assert when.month in ("every", one.month)
        assert 1 <= one.day <= home.length
        assert one.starts == home.starts + (one.day - 1 - one.night) * DAY
        assert home.eve <= one.starts <= home.ends
        following = next_of.get((one.year, one.month))
        last_day = (one.ends - home.starts).days + 1 + one.night
        if following and (when.last or when.day == "last" or when.run == "month" or last_day >= 30):
            # These move where the month turns out a day longer or shorter: the weaker of the two months.
            either = (home.standing, following.standing)
            assert one.standing == ("expected" if "expected" in either else home.standing)
            order = ("edge", "close", "wide", "fixed")
            assert order.index(one.closeness) == min(
                order.index(month.margin.closeness) for month in (home, following)
            )
        else:
            assert (one.standing, one.closeness) == (home.standing, home.margin.closeness)
        assert one.night == (when.night or when.last_nights is not None)
        if when.run == "month":
            assert one.ends == home.ends
        else:
            assert one.ends - one.starts == (when.run - 1) * DAY


@settings(deadline=None)  # a busy machine is no fault
@given(_RULES, years_of_months())
def test_keys_are_unique_and_dates_in_order(rules: dict[str, Observance], months: list[Month]) -> None:
    found = occurrences(rules, months)
    assert len({one.key for one in found}) == len(found)
    names = list(rules)
    order = [(one.starts, names.index(one.observance)) for one in found]
    assert order == sorted(order)
    # Each rule finds the same dates alone as in company.
    alone = [one for name in rules for one in occurrences({name: rules[name]}, months)]
    assert sorted(one.key for one in alone) == sorted(one.key for one in found)


@settings(deadline=None)  # a busy machine is no fault
@given(st.sampled_from(_WEEKDAYS), years_of_months())
def test_no_later_such_weekday_is_left_in_the_month(weekday: str, months: list[Month]) -> None:
    found = occurrences({"it": rule(month="every", last=weekday)}, months)
    assert len(found) == len(months)
    for one, home in zip(found, months, strict=True):
        assert one.starts.strftime("%A").lower() == weekday
        assert home.starts <= one.starts <= home.ends < one.starts + 7 * DAY


@settings(deadline=None)  # a busy machine is no fault
@given(years_of_months())
def test_whole_months_leave_no_gap(months: list[Month]) -> None:
    found = occurrences({"it": rule(month="every", day=1, run="month")}, months)
    assert [(one.starts, one.ends) for one in found] == [(m.starts, m.ends) for m in months]
    assert all(later.starts == earlier.ends + DAY for earlier, later in pairwise(found))
