"""Policies side by side: which months differ, by how many days, and whether the reason that is given is so."""

from __future__ import annotations

from dataclasses import replace
from datetime import date, timedelta
from zoneinfo import ZoneInfo

import pytest

from moonwrit.errors import RequestError
from moonwrit.policy import Method, NamedPlace, method
from moonwrit.policy.conditions import Scoped
from moonwrit.policy.differ import Beside, beside, long_run
from moonwrit.policy.walk import Era
from moonwrit.sky.comparison import Comparison, age, lag

DAY = timedelta(days=1)
MELBOURNE = NamedPlace("Melbourne", -37.81, 144.96, 0.0, ZoneInfo("Australia/Melbourne"))
YEARS = 1440, 1447


def asking(title: str, rule: Comparison) -> Method:
    return Method(title.lower(), title, "", "calculation", eras=(Era(0, Scoped(rule, MELBOURNE.scope())),))


STRICT = asking("Strict", Comparison(lag(), ">=", 45.0))
EASY = asking("Easy", Comparison(age(), ">", 0.0))
LATE = asking("Late", Comparison(lag(), ">=", 90.0))
OLD = asking("Old", Comparison(age(), ">", 32.0))
"""By turns one and the other is met first, for a lag of so much comes with the season."""


def table(title: str, starts: list[date], first_year: int) -> Method:
    first = (first_year - 1) * 12
    return Method(title.lower(), title, "", "record", table=dict(enumerate(starts, first)))


def against(theirs: Method, ours: Method) -> Beside:
    return beside(theirs, ours.months(*YEARS), ours)


@pytest.mark.parametrize(("ours", "theirs"), [(STRICT, EASY), (EASY, STRICT)])
def test_months_that_begin_on_other_days_are_the_differences(ours: Method, theirs: Method) -> None:
    """Each with the days from ours to theirs; the rest agree."""
    found = against(theirs, ours)
    mine, others = ours.months(*YEARS), theirs.months(*YEARS)
    assert found.months == others
    assert found.method == theirs
    apart = [(our, their) for our, their in zip(mine, others, strict=True) if our.starts != their.starts]
    assert [(one.ours, one.theirs) for one in found.differences] == apart
    assert {one.days for one in found.differences} <= ({-1, -2} if theirs is EASY else {1, 2})
    for one in found.differences:
        assert one.ours.starts + one.days * DAY == one.theirs.starts
    assert found.agreement == pytest.approx((len(mine) - len(apart)) / len(mine))
    assert 0 < found.agreement < 1


@pytest.mark.parametrize(("ours", "theirs"), [(LATE, OLD), (OLD, LATE)])
def test_the_reason_is_what_each_test_says_on_the_evening_that_the_earlier_begins(ours: Method, theirs: Method) -> None:
    """Each kind of reason is given where, and only where, it is so; and the numbers in it are those of that evening."""
    kinds = set()
    for one in against(theirs, ours).differences:
        pairs = [(one.ours, ours), (one.theirs, theirs)]
        (early, by), (late, late_by) = sorted(pairs, key=lambda pair: pair[0].starts)
        asked = late_by.on_evenings([(early.ordinal, early.eve)])
        assert asked is not None
        ((then, _),) = asked
        said, values = str(one.reason), one.reason.values
        assert (values["early"], values["late"], values["evening"]) == (by.title, late_by.title, early.eve)
        assert values["missed"] == then.findings[0]
        missed, found = f"{then.findings[0]}", f"{early.evidence.findings[0]}"
        if then.met:
            kinds.add("28th")
            assert said.startswith(f"On the evening of {early.eve} both tests are met ({late_by.title}: {missed}), ")
            assert early.eve == late.evidence.evening - DAY
        elif early.basis == "completed":
            kinds.add("30th")
            assert said == (f"Under {by.title} thirty days were complete on the evening of {early.eve}, whatever the "
                            f"Moon; {late_by.title} has {missed} then.")
        else:
            kinds.add("29th")
            assert said == f"On the evening of {early.eve} {by.title} has {found}; {late_by.title} has {missed}."
    assert kinds == {"28th", "29th", "30th"}


def test_what_is_reckoned_ahead_does_not_look_at_the_moon() -> None:
    """Arithmetic, on whichever side it stands and whether it is earlier or later."""
    tabular = method("tabular-16-civil")
    for ours, theirs in [(tabular, STRICT), (STRICT, tabular)]:
        differences = against(theirs, ours).differences
        assert differences
        assert {str(one.reason) for one in differences} == {
            "Tabular calendar (16-civil) is reckoned ahead and does not look at the Moon."
        }


def test_of_two_that_are_reckoned_ahead_the_earlier_is_named() -> None:
    early, late = method("tabular-16-thursday"), method("tabular-16-civil")
    for ours, theirs in [(early, late), (late, early)]:
        assert {str(one.reason) for one in against(theirs, ours).differences} == {
            f"{early.title} is reckoned ahead and does not look at the Moon."
        }


def test_who_follows_an_authority_that_begins_later_is_later_for_that() -> None:
    """An adopted month has the authority's evidence; where it is the later one, that is the reason, and where it is
    the earlier one, its authority's test is compared."""
    adopting = Method("adopting", "Adopting", "", "record", adopts=(STRICT,))
    said = {str(one.reason) for one in against(adopting, EASY).differences}
    assert said == {"Adopting follows another authority, which begins later."}
    adopting = Method("adopting", "Adopting", "", "record", adopts=(EASY,))
    first = against(adopting, STRICT).differences[0]
    assert str(first.reason).startswith(f"On the evening of {first.theirs.eve} Adopting has age ")


def test_a_recorded_month_is_compared_by_what_was_recorded() -> None:
    """Ours moved by a day is a difference, though both tests are the same."""
    months = STRICT.months(*YEARS)
    moved = replace(months[5], starts=months[5].starts - DAY)
    (one,) = beside(STRICT, (*months[:5], moved, *months[6:]), STRICT).differences
    assert (one.ours, one.theirs, one.days) == (moved, months[5], 1)


def test_a_test_met_by_a_moon_that_does_not_set_is_met() -> None:
    """Reykjavik in June: on the 28th evening before Rajab 1430 the Moon stays up, a lag without end and without a
    number; that the month did not begin then is for the 28th evening, and not for the lag."""
    asked = method("lag-48", None, NamedPlace("Reykjavik", 64.15, -21.94, 0.0, ZoneInfo("Atlantic/Reykjavik")))
    months = asked.months(1430, 1430)
    moved = replace(months[6], starts=months[6].starts - DAY)
    (one,) = beside(asked, (*months[:6], moved, *months[7:]), asked).differences
    assert one.reason.values["evening"] == date(2009, 6, 21)
    assert "both tests are met (Lag of 48 minutes: lag none > 48 min (Reykjavik)), but under" in str(one.reason)


def test_the_long_run_counts_every_month() -> None:
    """Days by which theirs begin later, over both years given and those between."""
    found = long_run(EASY, STRICT, 1430, 1450)
    assert found is not None
    assert (found.first_year, found.last_year, found.months) == (1430, 1450, 21 * 12)
    assert set(found.days) == {0, 1, 2} or set(found.days) == {0, 1}
    assert found.same == sum(
        our == their for our, their in zip(EASY.starts(1430, 1450), STRICT.starts(1430, 1450), strict=True)
    )
    assert 0 < found.same < found.months


def test_there_is_no_long_run_where_one_cannot_answer() -> None:
    short = table("Short", list(STRICT.starts(1440, 1441)), 1440)
    assert long_run(STRICT, short, 1440, 1442) is None
    assert long_run(short, STRICT, 1440, 1442) is None
    found = long_run(short, STRICT, 1440, 1440)
    assert found is not None
    assert found.days == (0,) * 12
    with pytest.raises(RequestError, match="the table of Short has no month"):
        against(short, STRICT)
