"""Where the files lie that are not Python: the themes, and the starter content."""

from __future__ import annotations

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent


def themes_folder() -> Path:
    """The folder of themes: inside an installed package, or at the top of a checkout."""
    return _folder("_themes", "themes")


def starter_folder() -> Path:
    """The content that a new community starts from, which is also the demonstration."""
    return _folder("_starter", "content")


def _folder(installed: str, checkout: str) -> Path:
    inside = _PACKAGE / installed
    return inside if inside.is_dir() else _PACKAGE.parent.parent / checkout
