"""The record: decisions in force, what speaks against them, and reports weighed against the sky."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from moonwrit.record.decisions import in_force, superseded

if TYPE_CHECKING:
    from moonwrit.record.reports import Weighed, weighed

__all__ = ["Weighed", "in_force", "superseded", "weighed"]


def __getattr__(name: str) -> Any:
    if name not in ("Weighed", "weighed"):
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from moonwrit.record import reports

    return getattr(reports, name)
