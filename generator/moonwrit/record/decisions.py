"""Which decision is in force for each month, and what speaks against one."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import datetime

from moonwrit.content.record import Decision
from moonwrit.policy import Month


def in_force(decisions: Iterable[Decision], until: datetime | None = None) -> dict[int, Decision]:
    """Month ordinal -> the latest decision on it, of those made ``until`` then (all: None).

    Of two at the same moment the one written later in the file stands.
    """
    known = [decision for decision in decisions if until is None or decision.at <= until]
    return {decision.ordinal: decision for decision in sorted(known, key=lambda decision: decision.at)}


def superseded(decisions: Iterable[Decision], until: datetime | None = None) -> dict[int, tuple[Decision, ...]]:
    """Month ordinal -> the decisions on it that a later one has replaced, in order of time."""
    standing = in_force(decisions, until)
    out: dict[int, list[Decision]] = {}
    for decision in sorted(decisions, key=lambda decision: decision.at):
        if (until is None or decision.at <= until) and standing[decision.ordinal] is not decision:
            out.setdefault(decision.ordinal, []).append(decision)
    return {ordinal: tuple(replaced) for ordinal, replaced in out.items()}


def objection(
    month: Month, before: Month | None, conjunction_passed: bool, may_be_28: bool
) -> tuple[str, str] | None:
    """Why a decided month cannot begin on its day, and how to mend that; None where nothing speaks against it.

    ``conjunction_passed``: by the sunset of the eve, somewhere in the region. ``may_be_28``: the policy lets the
    next month begin where the crescent is seen on the 28th evening.
    """
    decision = month.decision
    if decision is None or decision.knowingly:
        return None
    knowingly = "correct it, or say knowingly: true"
    if before is not None:
        late = before.length == 28 and may_be_28 and decision.basis == "sighted"
        if before.length not in (29, 30) and not late:
            return f"the month before would have {before.length} days, and a month has 29 or 30", knowingly
        if decision.basis == "completed" and before.length != 30:
            return f"the basis is completed, but the month before would have {before.length} days", knowingly
    if decision.basis in ("sighted", "calculated") and not conjunction_passed:
        return "its eve comes before the conjunction, when there is no new crescent to see", knowingly
    return None
