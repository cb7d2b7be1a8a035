"""Methods: a policy made ready to answer, whatever its kind, and the months it yields."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import date, timedelta
from types import MappingProxyType
from typing import Literal

import numpy as np

from moonwrit.calendars import Tabular
from moonwrit.content.record import Decision
from moonwrit.errors import RequestError
from moonwrit.policy.conditions import evidence
from moonwrit.policy.months import FIXED, Basis, Evidence, Margin, Month, Note, Standing
from moonwrit.policy.uncertainty import uncertainty_note
from moonwrit.policy.walk import Era, Questions, Step, walk
from moonwrit.policy.windows import windows
from moonwrit.sky.criteria import Criterion


@dataclass(frozen=True)
class Method:
    """A policy that can be asked for months. Exactly one of ``eras``, ``tabular``, ``table`` and ``adopts``.

    ``table`` maps the ordinal of a month to its first day. ``adopts`` names authorities of which the first to
    begin a month decides. ``note`` says what is inferred, unverified or our own choice about it; ``rests_on``
    are the published criteria it uses.
    """

    name: str
    title: str
    source: str
    decided_by: Literal["record", "calculation"]
    eras: tuple[Era, ...] = ()
    tabular: Tabular | None = None
    table: Mapping[int, date] | None = None
    adopts: tuple[Method, ...] = ()
    note: str = ""
    summary: str = ""
    rests_on: tuple[Criterion, ...] = ()

    @property
    def in_words(self) -> str:
        """What is asked, era by era, as the parts of the method print themselves."""
        if self.tabular is not None:
            return f"arithmetic: {self.tabular.name}"
        if self.table is not None:
            return "a table of month starts"
        if self.adopts:
            return "the first to begin a month of: " + ", ".join(each.title for each in self.adopts)
        if len(self.eras) == 1:
            return str(self.eras[0].condition)
        return "; ".join(f"from {era.first // 12 + 1} AH on, {era.condition}" for era in self.eras)

    def months(
        self, first_year: int, last_year: int, decisions: Mapping[int, Decision] = MappingProxyType({})
    ) -> tuple[Month, ...]:
        """The months of Hijri years ``first_year`` to ``last_year``, both included.

        ``decisions`` (by month ordinal) override what the method expects, and months that are reckoned from
        evening to evening follow on from them.
        Raises RequestError where the method cannot answer for one of them.
        """
        first, last = (first_year - 1) * 12, last_year * 12 - 1
        if self.eras:
            return self._computed(first, last, decisions)
        if self.tabular is not None:
            months = tuple(self._arithmetic(self.tabular, ordinal) for ordinal in range(first, last + 1))
        elif self.table is not None:
            months = self._tabulated(self.table, first, last)
        else:
            months = self._adopted(first_year, last_year)
        return _overridden(months, decisions)

    def starts(self, first_year: int, last_year: int) -> tuple[date, ...]:
        """The first days of the months of those years, without decisions and without evidence."""
        if not self.eras:
            return tuple(month.starts for month in self.months(first_year, last_year))
        _, steps = walk(self.eras, (first_year - 1) * 12, last_year * 12 - 1)
        return tuple(date.fromordinal(step.start) for step in steps[-12 * (last_year - first_year + 1) - 1 : -1])

    @property
    def standing(self) -> Standing:
        return "settled" if self.decided_by == "calculation" else "expected"

    def _month(
        self, ordinal: int, starts: date, length: int, basis: Basis, evidence: Evidence
    ) -> Month:
        return Month(
            ordinal // 12 + 1, ordinal % 12 + 1, starts, length, basis, self.standing, self.name, FIXED, evidence
        )

    def _arithmetic(self, tabular: Tabular, ordinal: int) -> Month:
        year, month = ordinal // 12 + 1, ordinal % 12 + 1
        starts = tabular.month_start(year, month)
        before = tabular.month_start(ordinal // 12 + (month > 1), (month - 2) % 12 + 1) if ordinal else None
        evening = (before + timedelta(days=28)) if before else starts - timedelta(days=1)
        return self._month(
            ordinal, starts, tabular.month_length(year, month), "arithmetic", Evidence(evening, None)
        )

    def _tabulated(self, table: Mapping[int, date], first: int, last: int) -> tuple[Month, ...]:
        missing = [n for n in range(first, last + 2) if n not in table]
        if missing:
            n = missing[0]
            raise RequestError(
                f"the table of {self.title} has no month {n // 12 + 1}-{n % 12 + 1:02d}",
                "add it (the month after the last one too, which ends it), or ask for fewer years",
            )
        out = []
        for n in range(first, last + 1):
            evening = table.get(n - 1, table[n] - timedelta(days=29)) + timedelta(days=28)
            length = (table[n + 1] - table[n]).days
            out.append(self._month(n, table[n], length, "tabulated", Evidence(evening, None)))
        return tuple(out)

    def _adopted(self, first_year: int, last_year: int) -> tuple[Month, ...]:
        per_authority = [authority.months(first_year, last_year) for authority in self.adopts]
        chosen = [min(same, key=lambda month: month.starts) for same in zip(*per_authority, strict=True)]
        titles = {authority.name: authority.title for authority in self.adopts}
        out = []
        for month in chosen:
            note = Note("Adopted from %(authority)s.", {"authority": titles[month.policy]})
            out.append(replace(
                month, basis="adopted", standing=self.standing, policy=self.name,
                evidence=replace(month.evidence, notes=(note, *month.evidence.notes)),
            ))
        return tuple(out)

    def _computed(self, first: int, last: int, decisions: Mapping[int, Decision]) -> tuple[Month, ...]:
        decided = {ordinal: decision.starts.toordinal() for ordinal, decision in decisions.items()}
        questions, steps = walk(self.eras, first, last, decided)
        lead_in = first - steps[0].ordinal
        spans = windows(questions, steps, decided)[lead_in:] if self.decided_by == "record" else None
        steps = steps[lead_in:]
        found = _evidence(questions, [step.ordinal for step in steps[:-1]], [step.evening for step in steps])
        out = []
        for step, after, (why, margin) in zip(steps, steps[1:], found, strict=False):
            starts = date.fromordinal(step.start)
            month = self._month(
                step.ordinal, starts, after.start - step.start, "calculated" if step.met else "completed", why
            )
            notes = _notes(step) + uncertainty_note(margin, starts)
            out.append(replace(
                month, margin=margin, evidence=replace(why, met=step.met, notes=(*why.notes, *notes)),
                window=spans[step.ordinal - first] if spans else (starts, starts),
            ))
        return tuple(_by_decision(month, decisions.get(month.ordinal)) for month in out)

    def on_evenings(self, asked: Sequence[tuple[int, date]]) -> list[tuple[Evidence, Margin]] | None:
        """What the test finds for the months of the ordinals on the evenings of the dates given with them.

        None where the method does not look at the sky.
        """
        if not self.eras or not asked:
            return None if not self.eras else []
        ordinals = [ordinal for ordinal, _ in asked]
        questions = Questions(self.eras, min(ordinals), max(ordinals))
        return _evidence(questions, ordinals, [day.toordinal() for _, day in asked])


def _by_decision(month: Month, decision: Decision | None) -> Month:
    """The month with the standing and basis that a decision gives it."""
    if decision is None:
        return month
    starts = decision.starts
    return replace(
        month, starts=starts, basis=decision.basis, standing="settled", window=(starts, starts), decision=decision
    )


def _overridden(months: tuple[Month, ...], decisions: Mapping[int, Decision]) -> tuple[Month, ...]:
    """Months reckoned ahead, single ones moved by decisions; lengths follow from where the next one begins."""
    moved = [_by_decision(month, decisions.get(month.ordinal)) for month in months]
    end = months[-1].ends + timedelta(days=1)
    starts = [*(month.starts for month in moved[1:]), end]
    return tuple(
        replace(month, length=(after - month.starts).days) for month, after in zip(moved, starts, strict=True)
    )


def _evidence(
    questions: Questions, ordinals: Sequence[int], days: Sequence[int]
) -> list[tuple[Evidence, Margin]]:
    """Evidence and margin for the month of each ordinal on the evening of the day beside it, era by era."""
    eras = np.searchsorted([era.first for era in questions.eras], ordinals, side="right") - 1
    out: dict[int, tuple[Evidence, Margin]] = {}
    for era in np.unique(eras):
        indices = np.flatnonzero(eras == era)
        rows = np.array(ordinals)[indices] - int(questions.moons.ordinal[0])
        evenings = questions.evenings(rows, np.array(days)[indices][:, None])
        found = evidence(questions.eras[era].condition, evenings)
        out.update(zip(indices.tolist(), found, strict=True))
    return [out[index] for index in range(len(ordinals))]


def _notes(step: Step) -> tuple[Note, ...]:
    """What the walk had to do against the sky."""
    if step.met and step.met_28th:
        return (Note(
            "The test was met on the 28th evening already. A month has at least 29 days, so the month before "
            "was given 29.",
        ),)
    if not step.met_30th:
        return (Note(
            "The test is not met on the 30th evening either. A month has at most 30 days, so the month begins "
            "all the same.",
        ),)
    return ()
