"""Fuzzes every target for its share of SECONDS, guided by coverage: ``python tests/fuzz/guided.py SECONDS``.

Needs atheris, which ``make fuzz`` installs. Inputs that reach new code go to .fuzz/<target>/ and are taken up again by
the next run; one that breaks a target is named at the end. Put it into corpus/<target>/ with the mend.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import atheris

HERE = Path(__file__).resolve().parent
FOUND = HERE.parent.parent / ".fuzz"


def alone(name: str, seconds: int) -> None:
    """Fuzz one target in this process, which libFuzzer ends."""
    with atheris.instrument_imports(include=["moonwrit", "yaml", "icalendar", "markdown", "babel.messages"]):
        from targets import CORPUS, TARGETS
    found = FOUND / name
    found.mkdir(parents=True, exist_ok=True)
    options = [f"-max_total_time={seconds}", "-max_len=2000", "-timeout=20", f"-artifact_prefix={FOUND}/{name}-"]
    atheris.Setup([sys.argv[0], *options, str(found), str(CORPUS / name)], TARGETS[name])
    atheris.Fuzz()


def main() -> int:
    if len(sys.argv) == 3:
        alone(sys.argv[1], int(sys.argv[2]))
        return 0
    names = sorted(folder.name for folder in (HERE / "corpus").iterdir())
    share = max(1, int(sys.argv[1]) // len(names))
    broken = [name for name in names if subprocess.run([sys.executable, __file__, name, str(share)]).returncode]
    print(f"broken: {', '.join(broken)}; see {FOUND}" if broken else "nothing found")
    return len(broken)


if __name__ == "__main__":
    sys.exit(main())
