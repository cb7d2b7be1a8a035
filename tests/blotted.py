"""JSON by its structure alone."""

from __future__ import annotations

from typing import Any


def shape(value: Any) -> Any:
    """A JSON value with every text blotted out."""
    if isinstance(value, dict):
        return {key: shape(below) for key, below in value.items()}
    if isinstance(value, list):
        return [shape(below) for below in value]
    return "" if isinstance(value, str) else value
