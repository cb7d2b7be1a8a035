"""How long things take, beside peers in the same run: ``make benchmarks``, alone on the machine.

A century is 1,240 conjunctions and two evenings after each at one place: sunset, moonset, best time, and
altitude and azimuth of Sun and Moon then. Each figure is the median of several runs (least in brackets).
Runs of this package and of its peers take turns, so that a busy machine slows both.

The large site has 10 Hijri years, 6 languages and 2 calendars. The cache (``MOONWRIT_CACHE``) is a folder of the run's
own, and off where the table says "from nothing".
"""

from __future__ import annotations

import json
import os
import platform
import re
import resource
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
from typing import Any
from unittest.mock import patch

import astronomy
import ephem
import numpy as np
import numpy.typing as npt
from skyfield import almanac
from skyfield.api import wgs84

from moonwrit.almanac import assemble
from moonwrit.building import assembled, content_of, held
from moonwrit.policy import method
from moonwrit.publish.site import publish
from moonwrit.publish.writing import put_in_place
from moonwrit.sky import Circumstances, Evenings, Lunations, Places, ephemeris, horizon, lunations
from moonwrit.sky.criteria import criterion, cubic
from moonwrit.sky.ephemeris import series
from moonwrit.sky.maps import Grid, over, spanned

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
    return float(alone("print(run.timed(run.century))", cache="off"))


def from_disk(cache: str) -> float:
    """The same with the windows read from the cache."""
    return float(alone("print(run.timed(run.century))", cache=cache))


def century() -> None:
    settings_of(lunations(FIRST, LAST), here())


def alone(statement: str, cache: str) -> str:
    """What a statement about this module prints, in a process that has done nothing else."""
    text = f"import sys; sys.path.insert(0, {str(Path(__file__).parent)!r}); import run; {statement}"
    return subprocess.run(
        [PYTHON, "-c", text], stdout=subprocess.PIPE, text=True, check=True, env={**os.environ, "MOONWRIT_CACHE": cache}
    ).stdout


def floor(moons: Lunations, where: Places) -> Callable[[], object]:
    """As many evaluations of Chebyshev series as the century asks for, all in one call of numpy."""
    count = 0

    def counted(coefficients: Array, x: Array) -> Array:
        nonlocal count
        count += x.size
        return series(coefficients, x)

    def vector(coefficients: Array, x: Array) -> tuple[Array, ...]:
        return tuple(counted(coefficients[:, axis], x) for axis in range(3))

    with patch.object(horizon, "series", counted), patch.object(horizon, "vector", vector):
        settings_of(moons, where)
    x = np.random.default_rng(1).uniform(-1, 1, (len(moons), count // len(moons)))
    return lambda: series(moons.windows.gast_rad, x)


def anywhere_over_a_century() -> None:
    """The month starts of 1371 to 1470 AH by the criterion of Istanbul, 2016: anywhere on Earth, with two clauses."""
    method("istanbul-2016", content_of(ROOT / "content")).starts(1371, 1470)


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


# --- maps of one evening ------------------------------------------------------------------------------

MAPPED = 17353
"""The lunation whose map is drawn: of July 2025."""
SAMPLE = 24
"""Points of a map that skyfield computes; its time for the whole map is scaled up from them."""


def map_of_q(step_deg: float) -> tuple[Grid, Array]:
    """Yallop's q over the Earth between 60 S and 60 N on the evening after the conjunction's date."""
    moons = lunations(MAPPED, MAPPED)
    quantity = criterion("yallop-1997").quantity
    assert quantity is not None
    grid = Grid.over(-180, -60, 180, 60, step_deg)
    evening = Evenings(moons.ephemeris, moons.windows, moons.conjunction_tt, moons.day[:, None] + 1)
    return grid, over(grid, spanned(evening), quantity.of)[0]


def skyfield_q(latitude: float, longitude: float, noon_ut: float) -> float:
    """Sunset and moonset by skyfield's own search, and q at best time from its apparent places."""
    sky = ephemeris()
    kernel, ts = sky.kernel, sky.timescale
    earth = kernel["earth"]  # type: ignore[index]
    start, end = ts.ut1_jd(noon_ut), ts.ut1_jd(noon_ut + 0.9)  # type: ignore[attr-defined]
    sunset, moonset = (
        almanac.find_settings(earth + wgs84.latlon(latitude, longitude), kernel[body], start, end)[0].ut1[0]  # type: ignore[index]
        for body in ("sun", "moon")
    )
    t = ts.ut1_jd(sunset + 4 / 9 * max(moonset - sunset, 0))  # type: ignore[attr-defined]
    phi, turn = np.radians(latitude), np.radians(15 * t.gast + longitude)
    zenith = np.array([np.cos(phi) * np.cos(turn), np.cos(phi) * np.sin(turn), np.sin(phi)])
    sun, moon = (t.M @ earth.at(t).observe(kernel[body]).apparent().xyz.km for body in ("sun", "moon"))  # type: ignore[index]
    far = float(np.linalg.norm(moon))
    sun, moon = sun / np.linalg.norm(sun), moon / far
    altitude, parallax = np.arcsin(moon @ zenith), np.arcsin(6378.137 / far)
    width = np.degrees(0.27245 * parallax * (1 + np.sin(altitude) * np.sin(parallax)) * (1 - sun @ moon)) * 60
    return float((np.degrees(altitude - np.arcsin(sun @ zenith)) - cubic(width, 11.8371)) / 10)


def point_by_skyfield() -> float:
    """Seconds for a point of the map; its q must be the map's within 1e-4 (its search stops at some hundredths of a
    second)."""
    grid, q = map_of_q(1.0)
    noon = float(lunations(MAPPED, MAPPED).day[0]) + 1 + 1721424.5 + 0.5
    rows, columns = np.unravel_index(np.linspace(0, q.size - 1, SAMPLE).astype(int), q.shape)
    points = [
        (float(grid.latitude_deg[row]), float(grid.longitude_deg[column]))
        for row, column in zip(rows, columns, strict=True)
    ]
    found: list[float] = []
    taken = timed(lambda: found.extend(skyfield_q(lat, lon, noon - lon / 360) for lat, lon in points))
    apart = np.abs(q[rows, columns] - np.array(found)).max()
    if not apart < 1e-4:
        sys.exit(f"the maps differ by {apart:.2g} in q: nothing here can be compared")
    return taken / SAMPLE


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


def imported(what: str) -> float:
    """Seconds of a process, with byte code kept as where the package is installed."""
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
    return timed(lambda: subprocess.run([PYTHON, "-c", what], capture_output=True, check=True, env=environment))


# --- sites ---------------------------------------------------------------------------------------------

def large(folder: Path, languages: str) -> Path:
    """The demonstration content with ten years and two calendars, in ``folder``."""
    shutil.copytree(ROOT / "content", folder)
    site = folder / "site.yaml"
    text = site.read_text(encoding="utf-8").replace("years: {from: 1447, to: 1449}", "years: {from: 1447, to: 1456}")
    text += "  second: {name: Second calendar, policy: umm-al-qura, region: three-harbours}\n"
    site.write_text(re.sub(r"(?m)^languages:.*$", f"languages: [{languages}]", text), encoding="utf-8")
    content = content_of(folder)
    assert (content.site.years.first, content.site.years.last, len(content.site.calendars)) == (1447, 1456, 2)
    return folder


def site(folder: Path) -> dict[str, Any]:
    """Seconds for assembling, for the site, and for writing the same bytes; how many pages, megabytes, and the peak of
    this process and of the largest of those that it started."""
    content = content_of(folder)
    start = time.perf_counter()
    almanacs = assembled(content, None)
    ledger = held(content, folder, almanacs, None)
    ready = time.perf_counter()
    output = folder.parent / f"{folder.name}-built"
    publish(almanacs, ledger, output, own=content.own, processes=os.cpu_count() or 1)
    built, peak = time.perf_counter(), _peak_mb()
    files = {path.relative_to(output).as_posix(): path.read_bytes() for path in output.rglob("*.*") if path.is_file()}
    read = time.perf_counter()
    put_in_place(files, folder.parent / f"{folder.name}-written")
    written = time.perf_counter()
    return {
        "assembling": ready - start, "building": built - ready, "writing": written - read,
        "pages": sum(name.endswith(".html") for name in files), "MB": sum(map(len, files.values())) / 1e6,
        "peak": peak, "child": resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024,
    }


def _peak_mb() -> float:
    """Of this program alone: what ``getrusage`` tells on Linux counts the program that started it too."""
    status = Path("/proc/self/status")
    if status.exists():
        return float(status.read_text(encoding="utf-8").partition("VmHWM:")[2].split()[0]) / 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def decide(folder: Path) -> None:
    """One decision more: the first expected month of the main calendar begins as expected."""
    content = content_of(folder)
    month = next(one for one in assemble(content, max(d.starts for d in content.decisions))[0].months
                 if one.standing == "expected")
    with (folder / "record/decisions.yaml").open("a", encoding="utf-8") as file:
        file.write(f"""
- month: {month.year}-{month.month:02d}
  starts: '{month.starts}'
  basis: calculated
  by: A benchmark
  at: '{month.eve}T21:30:00+10:00'
""")


def sites(cache: str) -> None:
    """The table of sites: each figure from one run in a process of its own."""
    with tempfile.TemporaryDirectory() as place:
        rows = []
        for title, languages in (("1 language", ""), ("6 languages", "ar, tr, ur, id, fr")):
            folder = large(Path(place) / title.replace(" ", "-"), languages)
            ask = f"import json, pathlib; print(json.dumps(run.site(pathlib.Path({str(folder)!r}))))"
            found = json.loads(alone(ask, cache))
            rows.append((
                f"10 years, 2 calendars, {title}", f"{found['pages']}", f"{found['MB']:.0f}",
                _seconds(found["assembling"]), _seconds(found["building"]),
                f"{found['pages'] / found['building']:.0f}", f"{found['building'] / found['writing']:.1f}",
                f"{found['peak']:.0f} + {found['child']:.0f}",
            ))
        _columns([
            ("site", "pages", "MB", "assembling", "building", "pages/s", "x writing the same bytes", "peak MB"), *rows
        ])
        words = ("publish", "--content", str(folder), "--output", str(Path(place) / "output"))
        full, fault = program(*words)
        if fault:
            sys.exit(fault)
        decide(folder)
        again, fault = program(*words)
        if fault:
            sys.exit(fault)
        print(f"rebuild after one decision: {again:.2f} s, {again / full:.2f} of the full build's {full:.2f} s")


# --- the table ---------------------------------------------------------------------------------------

Row = tuple[str, Timing, str, Timing | None]
"""What, how long, beside which peer, how long that took."""


def main() -> None:
    print(f"{platform.platform()}, {platform.machine()}, Python {platform.python_version()}, " + ", ".join(
        f"{name} {version(name)}" for name in ("numpy", "skyfield", "ephem", "astronomy-engine")
    ))
    with tempfile.TemporaryDirectory() as cache:
        os.environ["MOONWRIT_CACHE"] = cache
        century_table(cache)
        print()
        sites(cache)


def century_table(cache: str) -> None:
    same_answers()
    moons, one, hundred = lunations(FIRST, LAST), here(), anywhere(100)
    least = floor(moons, one)
    found = taking_turns(
        {
            "nothing": from_nothing,
            "disk": lambda: from_disk(cache),
            "cached": lambda: timed(lambda: settings_of(moons, one)),
            "hundred": lambda: timed(lambda: settings_of(moons, hundred)),
            "floor": lambda: timed(least),
            "ephem": lambda: timed(pyephem),
            "help": lambda: imported("from moonwrit.cli import main; main(['--help'])"),
            "import": lambda: imported("import skyfield.api"),
        },
        runs=7,
    )
    found |= taking_turns(
        {
            "astronomy": lambda: timed(astronomy_engine),
            "skyfield": lambda: timed(skyfield),
            "anywhere": lambda: timed(anywhere_over_a_century),
        },
        runs=3,
    )
    further = Timing(
        (found["hundred"].median_s - found["cached"].median_s) / 99,
        (found["hundred"].least_s - found["cached"].least_s) / 99,
    )
    rows: list[Row] = [
        ("century at one place, from nothing", found["nothing"], "PyEphem loop", found["ephem"]),
        ("", found["nothing"], "skyfield, whole century at once", found["skyfield"]),
        ("", found["nothing"], "astronomy-engine loop", found["astronomy"]),
        ("century at one place, from the cache on disk", found["disk"], "PyEphem loop", found["ephem"]),
        ("century at one place, windows at hand", found["cached"], "PyEphem loop", found["ephem"]),
        ("", found["cached"], "numpy, as many series at once", found["floor"]),
        ("century at each further place of 100", further, "PyEphem loop", found["ephem"]),
        ("century of month starts, anywhere on Earth (Istanbul 2016)", found["anywhere"], "PyEphem loop, one place",
         found["ephem"]),
        ("moonwrit --help", found["help"], "import skyfield.api", found["import"]),
    ]
    point = taking_turns({"point": point_by_skyfield}, runs=3)["point"]
    for step in (1.0, 0.5):
        size = map_of_q(step)[1].size
        mine = taking_turns({"map": lambda step=step: timed(lambda: map_of_q(step))}, runs=7)["map"]  # type: ignore[misc]
        rows.append((
            f"q of one evening over the Earth, {step:g} degree, {size:,} points", mine,
            f"skyfield, scaled from {SAMPLE}", Timing(point.median_s * size, point.least_s * size),
        ))
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
    _columns([
        ("what", "median (least)", "beside", "median (least)", "times as fast"),
        *(
            (title, str(mine), peer, str(theirs or ""), f"{theirs.median_s / mine.median_s:.1f}" if theirs else "")
            for title, mine, peer, theirs in rows
        ),
    ])


def _columns(cells: list[tuple[str, ...]]) -> None:
    widths = [max(map(len, column)) for column in zip(*cells, strict=True)]
    for row in cells:
        print("  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip())


if __name__ == "__main__":
    main()
