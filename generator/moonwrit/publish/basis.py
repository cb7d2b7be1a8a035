"""Months and differences as JSON: the published form of what a date rests on. ``schemas`` describes it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from datetime import datetime
from typing import TYPE_CHECKING, Any

from moonwrit.files import json_bytes
from moonwrit.policy.months import Finding, Margin, Month

if TYPE_CHECKING:
    from moonwrit.content.models import Site
    from moonwrit.policy import Method
    from moonwrit.policy.differ import Beside

VERSION = 1
"""Of every JSON that is ours: keys are added within a version, none is dropped or given another meaning."""


def month_json(month: Month) -> dict[str, Any]:
    """One month as in ``feeds/basis.json`` and ``moonwrit months --json``."""
    evidence = month.evidence
    earliest, latest = month.window or (month.starts, month.starts)
    return {
        "year": month.year,
        "month": month.month,
        "starts": month.starts.isoformat(),
        "eve": month.eve.isoformat(),
        "length": month.length,
        "standing": month.standing,
        "basis": month.basis,
        "window": {"earliest": earliest.isoformat(), "latest": latest.isoformat()},
        "margin": margin_json(month.margin),
        "policy": month.policy,
        "evidence": {
            "evening": evidence.evening.isoformat(),
            "met": evidence.met,
            "place": evidence.place,
            "conjunction_utc": utc(evidence.conjunction),
            "findings": [finding_json(finding) for finding in evidence.findings],
            "circumstances": dict(evidence.circumstances),
            "notes": [str(note) for note in evidence.notes],
        },
    }


def margin_json(margin: Margin) -> dict[str, Any]:
    return asdict(margin)


def finding_json(finding: Finding) -> dict[str, Any]:
    return asdict(finding)


def beside_json(beside: Beside) -> dict[str, Any]:
    """One policy beside the community's, as ``moonwrit differ --json`` prints it."""
    return {
        "policy": beside.method.name,
        "title": beside.method.title,
        "months": len(beside.months),
        "agreement": round(beside.agreement, 4),
        "differences": [
            {
                "year": one.ours.year,
                "month": one.ours.month,
                "ours": one.ours.starts.isoformat(),
                "theirs": one.theirs.starts.isoformat(),
                "days": one.days,
                "reason": str(one.reason),
            }
            for one in beside.differences
        ],
    }


def utc(moment: datetime | None) -> str | None:
    return None if moment is None else moment.strftime("%Y-%m-%dT%H:%M:%SZ")


def basis_feed(site: Site, calendar: str, method: Method, months: Sequence[Month]) -> bytes:
    """``feeds/basis.json``: every month of a calendar with its full evidence; the same in every language."""
    return json_bytes({
        "$schema": site.address.rstrip("/") + "/feeds/schema/basis.schema.json",
        "version": VERSION,
        "calendar": calendar,
        "site": site.address,
        "policy": {"name": method.name, "title": method.title, "source": method.source, "note": method.note},
        "months": [month_json(month) for month in months],
    })
