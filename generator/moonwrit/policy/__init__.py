"""Policies: from circumstances of the sky to month starts with their reasons.

``method`` and ``Method`` load numpy and skyfield when first used; the rest of this package's names do not.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from moonwrit.policy.months import (
    FIXED,
    Basis,
    Closeness,
    Evidence,
    Finding,
    Margin,
    Month,
    Note,
    Standing,
)
from moonwrit.policy.names import published_names

if TYPE_CHECKING:
    from moonwrit.policy.declared import method, named_place
    from moonwrit.policy.methods import Method
    from moonwrit.policy.published import NamedPlace

__all__ = [
    "FIXED", "Basis", "Closeness", "Evidence", "Finding", "Margin", "Method", "Month", "NamedPlace", "Note",
    "Standing", "method", "named_place", "published_names",
]

_LATE = {
    "method": "declared", "named_place": "declared", "Method": "methods", "NamedPlace": "published",
}


def __getattr__(name: str) -> Any:
    if name not in _LATE:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from importlib import import_module

    return getattr(import_module(f"{__name__}.{_LATE[name]}"), name)
