"""The inputs that fuzzing found interesting, replayed without the fuzzer."""

from __future__ import annotations

from pathlib import Path

import pytest
from targets import CORPUS, TARGETS

KEPT = sorted(file for target in TARGETS for file in (CORPUS / target).iterdir())


@pytest.mark.parametrize("file", KEPT, ids=[f"{file.parent.name}-{file.name}" for file in KEPT])
def test_what_was_found_stays_mended(file: Path) -> None:
    """Expected: taken, or refused in one line; the targets say what else must hold."""
    TARGETS[file.parent.name](file.read_bytes())


def test_every_target_has_a_corpus() -> None:
    """Expected: a few small inputs for each, to begin from."""
    for target in TARGETS:
        sizes = [file.stat().st_size for file in (CORPUS / target).iterdir()]
        assert len(sizes) >= 2, target
        assert sum(sizes) < 100_000, target
