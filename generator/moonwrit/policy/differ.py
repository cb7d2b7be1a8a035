"""Policies side by side: where month starts differ, and the reason for each difference, computed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

from moonwrit.errors import RequestError
from moonwrit.policy.methods import Method
from moonwrit.policy.months import Evidence, Finding, Margin, Month, Note


@dataclass(frozen=True, slots=True)
class Difference:
    """One month that two policies begin on different days. ``days``: theirs minus ours."""

    ours: Month
    theirs: Month
    days: int
    reason: Note


@dataclass(frozen=True, slots=True)
class Beside:
    """One policy beside the community's: its months, the differences, and the share of months that agree."""

    method: Method
    months: tuple[Month, ...]
    differences: tuple[Difference, ...]

    @property
    def agreement(self) -> float:
        return 1 - len(self.differences) / len(self.months)


@dataclass(frozen=True, slots=True)
class LongRun:
    """The months of two methods over whole Hijri years, decisions left aside: ``days`` by which theirs begin later."""

    first_year: int
    last_year: int
    days: tuple[int, ...]

    @property
    def months(self) -> int:
        return len(self.days)

    @property
    def same(self) -> int:
        """How many begin on the same day."""
        return self.days.count(0)


def long_run(ours: Method, theirs: Method, first_year: int, last_year: int) -> LongRun | None:
    """The agreement of two methods over whole Hijri years; None where one of them cannot answer for all."""
    try:
        pairs = zip(ours.starts(first_year, last_year), theirs.starts(first_year, last_year), strict=True)
        days = tuple((their - our).days for our, their in pairs)
    except RequestError:
        return None
    return LongRun(first_year, last_year, days)


def beside(method: Method, ours: Sequence[Month], our_method: Method) -> Beside:
    """``method`` over the same years as ``ours``, the months of ``our_method`` over whole Hijri years.

    Raises RequestError where the method cannot answer for those years.
    """
    theirs = method.months(ours[0].year, ours[-1].year)
    apart = [(our, their) for our, their in zip(ours, theirs, strict=True) if our.starts != their.starts]
    our_later = [(our, their) for our, their in apart if our.starts > their.starts]
    their_later = [(our, their) for our, their in apart if our.starts < their.starts]
    # What the later policy's own test says on the evening on which the earlier one begins the month.
    on_eve = {
        **_asked(our_method, [(our.ordinal, their) for our, their in our_later]),
        **_asked(method, [(their.ordinal, our) for our, their in their_later]),
    }
    differences = []
    for our, their in apart:
        (early, early_method), (late, late_method) = sorted(
            ((our, our_method), (their, method)), key=lambda pair: pair[0].starts
        )
        reason = _reason(early, early_method.title, late, late_method.title, on_eve.get(our.ordinal))
        differences.append(Difference(our, their, (their.starts - our.starts).days, reason))
    return Beside(method, theirs, tuple(differences))


def _asked(method: Method, earlier: list[tuple[int, Month]]) -> dict[int, tuple[Evidence, Margin]]:
    found = method.on_evenings([(ordinal, month.eve) for ordinal, month in earlier])
    return {} if found is None else {
        ordinal: pair for (ordinal, _), pair in zip(earlier, found, strict=True)
    }


def _reason(
    early: Month, early_title: str, late: Month, late_title: str, on_eve: tuple[Evidence, Margin] | None
) -> Note:
    """Why the earlier policy could begin the month when the later one could not."""
    names: dict[str, str | int | float | date | Finding] = {
        "early": early_title, "late": late_title, "evening": early.eve,
    }
    for month, title in ((early, early_title), (late, late_title)):
        if not month.evidence.findings:
            return Note("%(title)s is reckoned ahead and does not look at the Moon.", {"title": title})
    if on_eve is None:
        return Note("%(late)s follows another authority, which begins later.", names)
    names["missed"] = _deciding(*on_eve)
    if on_eve[0].met:
        return Note(
            "On the evening of %(evening)s both tests are met (%(late)s: %(missed)s), but under %(late)s that is "
            "only the 28th evening, for its month before began later.", names,
        )
    if early.basis == "completed":
        return Note(
            "Under %(early)s thirty days were complete on the evening of %(evening)s, whatever the Moon; "
            "%(late)s has %(missed)s then.", names,
        )
    names["found"] = _deciding(early.evidence, early.margin)
    return Note("On the evening of %(evening)s %(early)s has %(found)s; %(late)s has %(missed)s.", names)


def _deciding(evidence: Evidence, margin: Margin) -> Finding:
    """The finding that the margin was taken from."""
    deciding = margin.quantity, margin.value, margin.threshold
    return next(one for one in evidence.findings if (one.quantity, one.value, one.threshold) == deciding)
