"""Reading the published values in tests/reference/sky (sources in the README there), and places to try."""

from __future__ import annotations

import csv
from datetime import UTC, date, datetime
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np

from moonwrit.sky import Circumstances, Places, lunations

REFERENCE = Path(__file__).resolve().parent.parent / "reference" / "sky"

PLACES: dict[str, tuple[float, float, str]] = {
    # latitude, longitude, time zone; town centres to 0.01 degree, from memory: any point would do
    "Jakarta": (-6.20, 106.83, "Asia/Jakarta"),
    "Mecca": (21.42, 39.83, "Asia/Riyadh"),
    "Istanbul": (41.01, 28.98, "Europe/Istanbul"),
    "Vigo": (42.24, -8.72, "Europe/Madrid"),  # clocks 2.6 h ahead of the Sun in summer
    "Kashgar": (39.47, 75.99, "Asia/Shanghai"),  # 2.9 h
    "London": (51.50, -0.13, "Europe/London"),
    "Honolulu": (21.31, -157.86, "Pacific/Honolulu"),
    "Kiritimati": (1.87, -157.40, "Pacific/Kiritimati"),  # a day ahead of Honolulu at the same longitude
    "Apia": (-13.83, -171.77, "Pacific/Apia"),
    "Pago Pago": (-14.28, -170.70, "Pacific/Pago_Pago"),
    "Suva": (-18.14, 178.44, "Pacific/Fiji"),
    "Cape Town": (-33.92, 18.42, "Africa/Johannesburg"),
    "Melbourne": (-37.81, 144.96, "Australia/Melbourne"),
    "Dunedin": (-45.87, 170.50, "Pacific/Auckland"),
    "Ushuaia": (-54.80, -68.30, "America/Argentina/Ushuaia"),
    "Oslo": (59.91, 10.75, "Europe/Oslo"),
    "Trondheim": (63.43, 10.40, "Europe/Oslo"),
    "Reykjavik": (64.15, -21.94, "Atlantic/Reykjavik"),
    "Nome": (64.50, -165.41, "America/Nome"),
    "Oulu": (65.01, 25.47, "Europe/Helsinki"),
    "Rovaniemi": (66.50, 25.73, "Europe/Helsinki"),
    "Murmansk": (68.97, 33.08, "Europe/Moscow"),
    "Tromso": (69.65, 18.96, "Europe/Oslo"),
    "McMurdo": (-77.85, 166.67, "Antarctica/McMurdo"),
    "Longyearbyen": (78.22, 15.63, "Arctic/Longyearbyen"),
}


def rows(name: str) -> list[dict[str, str]]:
    with (REFERENCE / name).open(encoding="utf-8", newline="") as file:
        found = list(csv.DictReader(file))
    assert found, f"{name} is empty"
    return found


def sexagesimal(text: str) -> float:
    """``-22:31:05.17`` in units of its first part."""
    parts = [float(part) for part in text.lstrip("+-").split(":")]
    size = parts[0] + sum(part / 60.0**power for power, part in enumerate(parts[1:], start=1))
    return -size if text.startswith("-") else size


def julian(text: str) -> float:
    """The Julian date, in the text's own time scale, of ``2022-01-02T18:33`` or ``2022-01-02T18:33:05.25``."""
    midnight, clock = text.split("T")
    return date.fromisoformat(midnight).toordinal() + 1721424.5 + sexagesimal(clock) / 24


def utc(text: str) -> datetime:
    return datetime.fromisoformat(text).replace(tzinfo=UTC)


def places(*names: str, zoned: bool = False) -> Places:
    """The places named, or all of them."""
    return Places.of([
        (latitude, longitude, 0.0, ZoneInfo(zone) if zoned else None)
        for latitude, longitude, zone in (PLACES[name] for name in names or PLACES)
    ])


def evening(day: date, where: Places) -> Circumstances:
    """The evening of one civil date at places, in the window of the nearest lunation; [1, 1, place]."""
    near = lunations(*_around(day))
    at = [int(np.argmin(np.abs(near.day - day.toordinal())))]
    assert -1 <= day.toordinal() - near.day[at[0]] <= 2, "outside the window of any lunation"
    return Circumstances(
        near.ephemeris, near.windows[np.array(at)], near.conjunction_tt[at], np.array([[day.toordinal()]]), where
    )


def _around(day: date) -> tuple[int, int]:
    k = round((day - date(2000, 1, 6)).days / 29.530589)
    return 17037 + k - 1, 17037 + k + 1
