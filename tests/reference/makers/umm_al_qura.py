"""Writes ../umm_al_qura.csv from ICU (through Node.js) and java.time, and refuses if they differ."""

from __future__ import annotations

import json
import subprocess
from pathlib import Path

HERE = Path(__file__).parent


def printed(*command: str | Path) -> str:
    words = [str(word) for word in command]
    return subprocess.run(words, check=True, capture_output=True, encoding="utf-8").stdout


def main() -> None:
    icu = json.loads(printed("node", HERE / "umm_al_qura.js"))
    java_source, *java_rows = printed("java", HERE / "UmmAlQura.java").splitlines()
    rows = [f"{year},{month},{starts}" for year, month, starts in icu["rows"]]
    differences = sorted(set(rows) ^ set(java_rows))
    if differences:
        raise SystemExit(f"ICU and java.time differ: {differences}")
    header = [
        "# First civil day of each month of the Umm al-Qura calendar, Hijri years 1300-1600.",
        f"# Source: {icu['source']}: calendar islamic-umalqura.",
        f"# Source: {java_source.removeprefix('# ')}. Both give the same dates.",
        "# Written by makers/umm_al_qura.py.",
        "year,month,starts",
    ]
    (HERE.parent / "umm_al_qura.csv").write_text("\n".join([*header, *rows]) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
