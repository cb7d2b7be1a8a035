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


def program_files(own_theme: Path | None) -> list[Path]:
    """Every file that pages are made by: the program, its themes, and a community's own, in a lasting order."""
    folders = [_PACKAGE, themes_folder(), *([own_theme] if own_theme else [])]
    return [
        file for folder in folders for file in sorted(folder.rglob("*"))
        if file.is_file() and file.suffix != ".pyc"
    ]


def _folder(installed: str, checkout: str) -> Path:
    inside = _PACKAGE / installed
    return inside if inside.is_dir() else _PACKAGE.parent.parent / checkout
