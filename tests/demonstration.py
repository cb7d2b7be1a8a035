"""The demonstration community, made smaller for tests that build it often."""

from __future__ import annotations

import re
from pathlib import Path


def one_language(content: Path) -> None:
    """Only the default language; the lines of the file keep their numbers."""
    site = content / "site.yaml"
    text = site.read_text(encoding="utf-8")
    site.write_text(re.sub(r"(?m)^languages:.*$", "# one language", text), encoding="utf-8")
