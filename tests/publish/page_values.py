"""What tests of the built site share."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent.parent


def build(content: Path, output: Path, **environment: str) -> Path:
    """The site of a content folder as of 1 December 2026, built by the command."""
    done = subprocess.run(
        [sys.executable, "-m", "moonwrit.cli", "publish", "--as-of", "2026-12-01",
         "--content", str(content), "--output", str(output)],
        capture_output=True, encoding="utf-8", env={**os.environ, **environment},
    )
    assert (done.returncode, done.stderr) == (0, ""), done.stderr
    return output
