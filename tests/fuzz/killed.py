"""Kills builds at random moments: ``python tests/fuzz/killed.py COUNT [SEED]``; prints what went wrong, and fails then.

Each time a year's site stands, a decision moves a month, and the build that is to publish it is killed: after a random
part of the time that a build takes, alone or with its processes. Expected: the old site or the new one is whole, in its
place or beside it; and the next build leaves the site and the journal of a build that nobody disturbed.
"""

from __future__ import annotations

import os
import random
import shutil
import signal
import subprocess
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

from demonstration import desk_of_one_year

MARKER = ".moonwrit"
NOW = {"SOURCE_DATE_EPOCH": "1784113500"}  # 15 July 2026


def files(folder: Path) -> dict[str, bytes]:
    found = (path for path in folder.rglob("*") if path.is_file() and path.name != MARKER)
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in found}


def build(place: Path) -> subprocess.Popen[bytes]:
    words = ["publish", "--content", str(place / "content"), "--output", str(place / "output"), "--workers", "2"]
    return subprocess.Popen(
        [sys.executable, "-m", "moonwrit.cli", *words], env={**os.environ, **NOW}, start_new_session=True,
        stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
    )


def journal(place: Path) -> list[str]:
    return sorted((place / "content/record/journal.jsonl").read_text(encoding="utf-8").splitlines())


def main(count: int, seed: int) -> int:
    chance, wrong, reached = random.Random(seed), 0, {"old": 0, "new": 0, "beside": 0}
    with tempfile.TemporaryDirectory() as folder:
        os.environ["MOONWRIT_CACHE"] = f"{folder}/cache"
        start, place = Path(folder) / "start", Path(folder) / "place"
        desk = desk_of_one_year(start)
        desk.publish("2026-05-01T00:00:00Z")
        desk.decide("2026-07-15T21:00:00+10:00", "1448-02", "2026-07-16", "sighted")
        shutil.copytree(start, place)
        began = time.monotonic()
        assert build(place).wait() == 0
        taken = time.monotonic() - began
        old, new, lines = files(start / "output"), files(place / "output"), journal(place)
        assert old != new
        for number in range(count):
            shutil.rmtree(place)
            shutil.copytree(start, place)
            one = build(place)
            time.sleep(chance.uniform(0, 1.1) * taken)
            if chance.random() < 0.5:
                os.kill(one.pid, signal.SIGKILL)
            else:
                os.killpg(one.pid, signal.SIGKILL)
            one.wait()
            stands = files(place / "output") if (place / "output").is_dir() else {}
            how = "old" if stands == old else "new" if stands == new else "beside"
            reached[how] += 1
            aside = [files(path) for path in place.iterdir() if path.name.startswith(".")]
            whole = how != "beside" or old in aside or new in aside
            again = build(place).wait()
            left = [path.name for path in place.iterdir()]
            if not (whole and again == 0 and files(place / "output") == new and journal(place) == lines
                    and sorted(left) == ["content", "output"]):
                wrong += 1
                print(f"kill {number}: {how}, whole {whole}, exit {again}, left {left}")
    print(f"{count} builds of about {taken:.1f} s killed; found then {reached}; {wrong} wrong")
    return min(wrong, 1)


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]), int(sys.argv[2]) if len(sys.argv) > 2 else 1))
