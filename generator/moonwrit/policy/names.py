"""The names of published criteria and policies, and nothing else: importing this loads no numpy."""

from __future__ import annotations

from moonwrit.calendars import TABULAR_NAMES

CRITERIA: dict[str, tuple[str, ...]] = {
    "yallop-1997": ("A", "B", "C", "D", "E"),
    "odeh-2004": ("A", "B", "C"),
    "fotheringham-1910": (),
    "maunder-1911": (),
    "schoch-1930": (),
    "bruin-1977": (),
    "saao-2001-probable": (),
    "saao-2001-possible": (),
    "ilyas-1988": (),
    "rgo-sheet-6": (),
    "babylonian": (),
    "lag-48": (),
    "shaukat": (),
    "danjon-7": (),
    "mabims-1995": (),
    "mabims-2021": (),
    "istanbul-5-8": (),
    "moon-up-after-conjunction": (),
    "conjunction-before-sunset": (),
    "moonset-after-sunset": (),
    "moonset-5-minutes": (),
}
"""Criterion -> the labels of its classes or zones, best first; none where it is met or not met."""

WHOLE_POLICIES = ("umm-al-qura", "umm-al-qura-table", "istanbul-1978", "istanbul-2016")
"""Published policies that name their own place or scope."""


def graded_name(criterion: str, label: str) -> str:
    """The policy that accepts a criterion's classes down to ``label``: yallop-1997, B -> yallop-b."""
    return f"{criterion.split('-')[0]}-{label.lower()}"


def published_names() -> tuple[str, ...]:
    """Every published policy's name."""
    tests = [
        name for criterion, labels in CRITERIA.items()
        for name in ([graded_name(criterion, label) for label in labels] or [criterion])
    ]
    return (*WHOLE_POLICIES, *TABULAR_NAMES, *tests)
