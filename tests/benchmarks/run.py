"""How long a century takes, beside peers in the same run: ``make benchmarks``, alone on the machine.

A century is 1,240 conjunctions and two evenings after each at one place: sunset, moonset, best time, and
altitude and azimuth of Sun and Moon then. Each figure is the median of several runs (least in brackets).
Runs of this package and of its peers take turns, so that a busy machine slows both.
"""

from __future__ import annotations

import platform
import shutil
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass
from importlib.metadata import version
from pathlib import Path

import astronomy
import ephem
import numpy as np
import numpy.typing as npt
from skyfield import almanac
from skyfield.api import wgs84

from moonwrit.sky import Circumstances, Lunations, Places, ephemeris, lunations

ROOT = Path(__file__).resolve().parent.parent.parent
PYTHON = sys.executable

Array = npt.NDArray[np.float64]

LATITUDE, LONGITUDE = -6.2, 106.83
FIRST, LAST = 17037 - 600, 17037 + 639
"""July 1951 to August 2051."""
EVENINGS = 2
EPHEM_EPOCH = 2415020.0


@dataclass(frozen=True)
class Timing:
    median_s: float
    least_s: float

    def __str__(self) -> str:
        return f"{_seconds(self.median_s)} ({_seconds(self.least_s)})"


def _seconds(value: float) -> str:
    return f"{value * 1000:.2f} ms" if value < 0.1 else f"{value:.2f} s"


def timed(work: Callable[[], object]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def taking_turns(works: dict[str, Callable[[], float]], runs: int) -> dict[str, Timing]:
    """Each of ``works`` returns the seconds that it took."""
    taken: dict[str, list[float]] = {name: [] for name in works}
    for _ in range(runs):
        for name, work in works.items():
            taken[name].append(work())
    return {name: Timing(statistics.median(each), min(each)) for name, each in taken.items()}


# --- the work ----------------------------------------------------------------------------------------


def settings_of(moons: Lunations, where: Places) -> tuple[Array, Array]:
    """Sunset and moonset in UT, [lunation, evening, place]; all the century's quantities are computed."""
    day = moons.day[:, None] + np.arange(EVENINGS)
    c = Circumstances(moons.ephemeris, moons.windows, moons.conjunction_tt, day, where)
    best = c.best
    for value in (c.lag_min, best.sun_altitude_deg, best.sun_azimuth_deg, best.moon_altitude_topo_deg,
                  best.moon_azimuth_deg):
        assert value.shape == c.sunset_tt.shape
    return moons.ephemeris.ut(c.sunset_tt), moons.ephemeris.ut(c.moonset_tt)


def here() -> Places:
    return Places.of([(LATITUDE, LONGITUDE, 0.0, None)])


def anywhere(count: int) -> Places:
    random = np.random.default_rng(20261201)
    return Places.of([(random.uniform(-55, 55), random.uniform(-180, 180), 0.0, None) for _ in range(count)])


def from_nothing() -> float:
    """In a process of its own: kernel opened, windows and conjunctions computed, then the evenings."""
    return float(alone("print(run.timed(run.century))"))


def century() -> None:
    settings_of(lunations(FIRST, LAST), here())


def alone(statement: str) -> str:
    """What a statement about this module prints, in a process that has done nothing else."""
    text = f"import sys; sys.path.insert(0, {str(Path(__file__).parent)!r}); import run; {statement}"
    return subprocess.run([PYTHON, "-c", text], capture_output=True, text=True, check=True).stdout


def noons_ut(conjunction_ut: float) -> list[float]:
    """Mean noons of the evenings that follow a conjunction, for the peers: what ``Circumstances.noon_tt`` is."""
    day = np.floor(conjunction_ut - 0.5) + 0.5
    return [float(day + evening + 0.5 - LONGITUDE / 360) for evening in range(EVENINGS)]


def pyephem() -> tuple[Array, Array]:
    observer = ephem.Observer()
    observer.lat, observer.lon, observer.pressure, observer.horizon = str(LATITUDE), str(LONGITUDE), 0, "-0:34"
    sun, moon = ephem.Sun(), ephem.Moon()
    now, out = ephem.Date("1951/6/20"), []
    for _ in range(LAST - FIRST + 1):
        conjunction = ephem.next_new_moon(now)
        now = ephem.Date(conjunction + 20)
        for noon in noons_ut(conjunction + EPHEM_EPOCH):
            observer.date = noon - EPHEM_EPOCH
            sunset, moonset = observer.next_setting(sun), observer.next_setting(moon)
            observer.date = sunset + 4 / 9 * max(moonset - sunset, 0)
            sun.compute(observer)
            moon.compute(observer)
            out.append((sunset, moonset, sun.alt, sun.az, moon.alt, moon.az))
    settings = np.array(out)[:, :2].reshape(-1, EVENINGS, 2) + EPHEM_EPOCH
    return settings[..., 0], settings[..., 1]


def astronomy_engine() -> None:
    observer = astronomy.Observer(LATITUDE, LONGITUDE, 0)
    now = astronomy.Time.Make(1951, 6, 20, 0, 0, 0)
    for _ in range(LAST - FIRST + 1):
        conjunction = astronomy.SearchMoonPhase(0, now, 40)
        now = conjunction.AddDays(20)
        for noon in noons_ut(conjunction.ut + 2451545):
            start = astronomy.Time(noon - 2451545)
            sunset, moonset = (
                astronomy.SearchRiseSet(body, observer, astronomy.Direction.Set, start, 2)
                for body in (astronomy.Body.Sun, astronomy.Body.Moon)
            )
            best = sunset.AddDays(4 / 9 * max(moonset.ut - sunset.ut, 0))
            for body in (astronomy.Body.Sun, astronomy.Body.Moon):
                seen = astronomy.Equator(body, best, observer, True, True)
                astronomy.Horizon(best, observer, seen.ra, seen.dec, astronomy.Refraction.Airless)


def skyfield() -> None:
    """Its own vectorised searches over the whole century; altitudes and azimuths at the evenings' best times."""
    sky = ephemeris()
    kernel, ts = sky.kernel, sky.timescale
    observer = kernel["earth"] + wgs84.latlon(LATITUDE, LONGITUDE)  # type: ignore[index]
    start, end = ts.utc(1951, 6, 20), ts.utc(2051, 9, 20)  # type: ignore[attr-defined]
    t, phase = almanac.find_discrete(start, end, almanac.moon_phases(kernel))
    conjunctions = t.ut1[phase == 0]
    noons = np.array([noons_ut(conjunction) for conjunction in conjunctions[: LAST - FIRST + 1]]).ravel()
    sunsets, moonsets = (
        almanac.find_settings(observer, kernel[body], start, end)[0].ut1  # type: ignore[index]
        for body in ("sun", "moon")
    )
    sunset, moonset = (each[np.searchsorted(each, noons)] for each in (sunsets, moonsets))
    best = observer.at(ts.ut1_jd(sunset + 4 / 9 * np.maximum(moonset - sunset, 0)))  # type: ignore[attr-defined]
    for body in ("sun", "moon"):
        best.observe(kernel[body]).apparent().altaz()  # type: ignore[index]


def same_answers() -> None:
    """That the work compared is the same: PyEphem's settings within 5 s (its Sun has another size, its delta-T
    another future)."""
    mine = settings_of(lunations(FIRST, LAST), here())
    for ours, theirs in zip(mine, pyephem(), strict=True):
        apart = np.abs(ours[..., 0] - theirs).max() * 86400
        if not apart < 5:
            sys.exit(f"the answers differ by {apart:.1f} s: nothing here can be compared")


# --- whole programs ----------------------------------------------------------------------------------


def program(*words: str) -> tuple[float, str]:
    """Seconds of a whole run of the command, and why it failed (empty where it did not)."""
    start = time.perf_counter()
    done = subprocess.run(
        [PYTHON, "-c", "from moonwrit.cli import main; main()", *words], capture_output=True, text=True, cwd=ROOT
    )
    taken = time.perf_counter() - start
    return taken, "" if done.returncode == 0 else (done.stderr.strip().splitlines() or ["no reason given"])[-1]


def months_of_a_century() -> tuple[float, str]:
    return program(
        "months", "--policy", "yallop-b", "--place", f"Jakarta,{LATITUDE},{LONGITUDE},0,Asia/Jakarta",
        "--from", "1371", "--to", "1470", "--json",
    )


def demonstration_site() -> tuple[float, str]:
    """Built from a copy: publishing writes its journal beside the content."""
    with tempfile.TemporaryDirectory() as folder:
        content = Path(folder) / "content"
        shutil.copytree(ROOT / "content", content)
        return program("publish", "--content", str(content), "--output", str(Path(folder) / "output"))


# --- the table ---------------------------------------------------------------------------------------

Row = tuple[str, Timing, str, Timing | None]
"""What, how long, beside which peer, how long that took."""


def main() -> None:
    print(f"{platform.platform()}, {platform.machine()}, Python {platform.python_version()}, " + ", ".join(
        f"{name} {version(name)}" for name in ("numpy", "skyfield", "ephem", "astronomy-engine")
    ))
    same_answers()
    moons, one, fifty = lunations(FIRST, LAST), here(), anywhere(50)
    found = taking_turns(
        {
            "nothing": from_nothing,
            "cached": lambda: timed(lambda: settings_of(moons, one)),
            "fifty": lambda: timed(lambda: settings_of(moons, fifty)),
            "ephem": lambda: timed(pyephem),
        },
        runs=7,
    )
    found |= taking_turns(
        {"astronomy": lambda: timed(astronomy_engine), "skyfield": lambda: timed(skyfield)}, runs=3
    )
    further = Timing(
        (found["fifty"].median_s - found["cached"].median_s) / 49,
        (found["fifty"].least_s - found["cached"].least_s) / 49,
    )
    rows: list[Row] = [
        ("century at one place, from nothing", found["nothing"], "PyEphem loop", found["ephem"]),
        ("", found["nothing"], "skyfield, whole century at once", found["skyfield"]),
        ("", found["nothing"], "astronomy-engine loop", found["astronomy"]),
        ("century at one place, windows at hand", found["cached"], "PyEphem loop", found["ephem"]),
        ("century at each further place of 50", further, "PyEphem loop", found["ephem"]),
    ]
    for title, work, runs in (
        ("moonwrit months, Yallop A-B, 100 years, whole process", months_of_a_century, 5),
        ("moonwrit publish, the demonstration site", demonstration_site, 3),
    ):
        _, fault = work()
        if fault:
            print(f"left out: {title}: {fault}")
            continue
        taken = taking_turns({"work": lambda work=work: work()[0]}, runs)["work"]  # type: ignore[misc]
        months = "months" in title
        rows.append((title, taken, "PyEphem loop" if months else "", found["ephem"] if months else None))
    _table(rows)


def _table(rows: list[Row]) -> None:
    cells = [("what", "median (least)", "beside", "median (least)", "times as fast")]
    cells += [
        (title, str(mine), peer, str(theirs or ""), f"{theirs.median_s / mine.median_s:.1f}" if theirs else "")
        for title, mine, peer, theirs in rows
    ]
    widths = [max(len(row[column]) for row in cells) for column in range(5)]
    for row in cells:
        print("  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip())


if __name__ == "__main__":
    main()
