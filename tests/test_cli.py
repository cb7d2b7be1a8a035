"""The command: what each of its words prints, with which exit code, and what it says of things that cannot be."""

from __future__ import annotations

import errno
import json
import os
import re
import shlex
import shutil
import subprocess
import sys
from dataclasses import dataclass
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import click
import jsonschema
import pytest
from click.testing import CliRunner, Result

from demonstration import one_language
from moonwrit import __version__
from moonwrit.cli import main
from moonwrit.content import yaml
from moonwrit.publish.schemas import schemas

ROOT = Path(__file__).resolve().parent.parent
NOW = "1796810400"  # 2026-12-09, 21:00 in Melbourne
ABOUT_EVENING = ("--evening", "2026-12-09", "--place", "wattle-harbour")
ABOUT_MONTH = ("--month", "1448-07", "--by", "Calendar Committee")


@dataclass(frozen=True)
class Desk:
    """A folder with a copy of the demonstration content in it, in which the command is run."""

    folder: Path

    def run(self, *words: str) -> Result:
        return CliRunner(env={"SOURCE_DATE_EPOCH": NOW}).invoke(main, words, catch_exceptions=False)

    def json(self, *words: str) -> Any:
        """What a command prints with --json; it must succeed and print nothing else."""
        done = self.run(*words, "--json")
        assert (done.exit_code, done.stderr) == (0, "")
        return json.loads(done.stdout)

    def refused(self, *words: str, code: int = 1) -> str:
        """The one message of a request that cannot be met; nothing is printed beside it, and nothing is written."""
        before = self.files()
        done = self.run(*words)
        assert (done.exit_code, done.stdout) == (code, ""), done.output
        assert self.files() == before
        assert done.stderr.startswith("moonwrit: ")
        message = done.stderr.removeprefix("moonwrit: ").removesuffix("\n")
        assert code == 3 or "\n" not in message
        return message

    def files(self) -> dict[str, bytes]:
        return {str(path): path.read_bytes() for path in sorted(self.folder.rglob("*")) if path.is_file()}

    def edit(self, file: str, old: str, new: str) -> int:
        """Replace a text that stands in a content file; returns the line on which the new one begins."""
        path = self.folder / "content" / file
        before, found, after = path.read_text(encoding="utf-8").partition(old)
        assert found, f"{file} no longer holds {old!r}"
        path.write_text(before + new + after, encoding="utf-8")
        return before.count("\n") + 1


@pytest.fixture
def desk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Desk:
    shutil.copytree(ROOT / "content", tmp_path / "content")
    one_language(tmp_path / "content")
    monkeypatch.chdir(tmp_path)
    return Desk(tmp_path)


# --- what is printed -----------------------------------------------------------------------------------


def test_check_says_a_word_where_all_is_well(desk: Desk) -> None:
    """Expected: one line with counts of what was read, exit 0, nothing written."""
    before = desk.files()
    done = desk.run("check")
    assert (done.exit_code, done.stderr) == (0, "")
    assert done.stdout == "content: all is well (3 places, 3 policies, 16 observances)\n"
    assert desk.files() == before


def _dates(month: dict[str, Any]) -> tuple[date, date]:
    return date.fromisoformat(month["eve"]), date.fromisoformat(month["starts"])


def test_months_as_json(desk: Desk) -> None:
    """Expected: one array; each month as the published schema says, its day after its eve, the next month after it."""
    found = desk.json("months", "--policy", "umm-al-qura", "--from", "1447", "--to", "1448")
    assert [(one["year"], one["month"]) for one in found] == [(y, m) for y in (1447, 1448) for m in range(1, 13)]
    jsonschema.Draft202012Validator(schemas()["months.schema.json"]).validate(found)
    promised = {"year", "month", "starts", "eve", "length", "standing", "basis", "margin", "policy", "evidence"}
    for one, after in zip(found, [*found[1:], None], strict=True):
        assert promised <= set(one)
        eve, starts = _dates(one)
        assert starts == eve + timedelta(days=1)
        assert after is None or _dates(after)[1] == starts + timedelta(days=one["length"])
        assert one["policy"] == "umm-al-qura"


def test_months_as_a_table(desk: Desk) -> None:
    """Expected: a line for each month, with the first days of other calendars where asked for."""
    done = desk.run("months", "--policy", "tabular-16-civil", "--from", "1447", "--to", "1447", "--also", "julian")
    assert done.exit_code == 0
    lines = [line for line in done.stdout.splitlines() if re.match(r"\s+1447-\d\d ", line)]
    assert len(lines) == 12
    # Julian dates are thirteen days behind from 1900 to 2099.
    starts = [date.fromisoformat(re.findall(r"\d{4}-\d\d-\d\d", line)[0]) for line in lines]
    for day, line in zip(starts, lines, strict=True):
        other = day - timedelta(days=13)
        assert other.isoformat() in line or f"{other.day} {other:%B} {other.year}" in line, line


def test_published_policies_need_no_content(desk: Desk) -> None:
    """Expected: the same months with and without a content folder, at a place given by its coordinates."""
    asked = ("--policy", "yallop-b", "--place", "Rabat,34.02,-6.84,75,Africa/Casablanca", "--from", "1447")
    beside = desk.json("months", *asked, "--to", "1447")
    assert desk.json("months", *asked, "--content", "nowhere") == beside
    assert {one["evidence"]["place"] for one in beside} == {"Rabat"}


def test_evening_as_json(desk: Desk) -> None:
    """Expected: an object for each place; every number has its unit in its key, every instant is UTC."""
    found = desk.json("evening", "2026-12-09")
    jsonschema.Draft202012Validator(schemas()["evening.schema.json"]).validate(found)
    assert [one["place"] for one in found] == ["Wattle Harbour", "Gannet Harbour", "Lantern Harbour"]
    unitless = {"yallop_q", "odeh_v"}
    for one in found:
        assert one["date"] == "2026-12-09"
        assert one["timezone"] == "Australia/Melbourne"
        for key, value in one.items():
            if isinstance(value, float | int):
                assert key in unitless or key.rsplit("_", 1)[1] in ("deg", "m", "min", "h", "percent", "arcmin"), key
            if key.endswith("_utc"):
                assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", value), key
        assert one["sunset_utc"] < one["best_time_utc"] < one["moonset_utc"]


def test_what_does_not_happen_is_null(desk: Desk) -> None:
    """Expected: at the North Pole in June (from common knowledge) the Sun does not set, and that is said."""
    (found,) = desk.json("evening", "2026-06-15", "--place", "North Pole,90,0")
    assert found["sunset_utc"] is None
    assert found["sun"] != "sets"


def test_evening_without_a_date_is_the_next_29th(desk: Desk) -> None:
    """Expected: 1448/6 began on 2026-11-11 by decision, so its 29th is 2026-12-09; that very day still counts."""
    for today, expected in (("2026-11-11", "2026-12-09"), ("2026-12-09", "2026-12-09"), ("2026-12-10", "2027-01-")):
        assert desk.json("evening", "--as-of", today)[0]["date"].startswith(expected)
    assert desk.json("evening")[0]["date"] == "2026-12-09", "without --as-of, SOURCE_DATE_EPOCH says what today is"


def test_evening_warns_of_the_sun(desk: Desk) -> None:
    """Expected: wherever people are told where to look, the warning stands too."""
    assert "Never point optics at or near the Sun" in desk.run("evening", "2026-12-09").stdout


@pytest.mark.parametrize("what", ["1447-10", "2026-03-22", "eid-al-fitr-1447"])
def test_why_finds_the_month_of_a_month_a_date_and_an_observance(desk: Desk, what: str) -> None:
    """Expected: all three rest on Shawwal 1447, which begins on 2026-03-22 by decision; words and JSON agree."""
    found = desk.json("why", what)
    assert (found["year"], found["month"], found["starts"]) == (1447, 10, "2026-03-22")
    assert found["standing"] == "settled"
    words = desk.run("why", what).stdout
    assert "Shawwal 1447 begins at sunset on Saturday, 21 March 2026" in words
    assert "Sunday, 22 March 2026" in words


def test_differ_as_json(desk: Desk) -> None:
    """Expected: for each other policy its share of equal months, and each difference with days and reason."""
    found = desk.json("differ", "--from", "1447", "--to", "1447")
    jsonschema.Draft202012Validator(schemas()["differences.schema.json"]).validate(found)
    assert [one["policy"] for one in found] == ["umm-al-qura", "tabular"]
    for one in found:
        assert one["months"] == 12
        assert one["agreement"] == pytest.approx(1 - len(one["differences"]) / 12, abs=1e-4)
        assert one["differences"], f"{one['policy']} differs in 1447"
        for each in one["differences"]:
            days = date.fromisoformat(each["theirs"]) - date.fromisoformat(each["ours"])
            assert each["days"] == days.days != 0
            assert each["reason"].endswith(".")
    chosen = desk.json("differ", "--policy", "umm-al-qura", "--from", "1447", "--to", "1447")
    assert chosen == found[:1]
    assert "Umm al-Qura: " in desk.run("differ", "--from", "1447", "--to", "1447").stdout


def test_as_of_leaves_out_what_was_decided_later(desk: Desk) -> None:
    """Expected: 1447/5 was decided on 2025-10-22, a day earlier than the calculation expected until then."""
    for command in (("months", "--from", "1447", "--to", "1447"), ("why", "1447-5")):
        before, after = (desk.json(*command, "--as-of", day) for day in ("2025-10-21", "2025-10-22"))
        one, other = (months[4] if isinstance(months, list) else months for months in (before, after))
        assert (one["starts"], one["standing"]) == ("2025-10-24", "expected")
        assert (other["starts"], other["standing"]) == ("2025-10-23", "settled")
    ours = [desk.json("differ", "--as-of", day)[0]["differences"] for day in ("2025-10-21", "2025-10-22")]
    assert ours[0] != ours[1]


# --- what is written -----------------------------------------------------------------------------------


def test_publish_builds_and_keeps_the_journal(desk: Desk) -> None:
    """Expected: as many files as it says; the journal only grows, and a second build adds nothing."""
    journal = desk.folder / "content/record/journal.jsonl"
    before = journal.read_bytes()
    done = desk.run("publish")
    assert (done.exit_code, done.stderr) == (0, "")
    built = [path for path in (desk.folder / "output").rglob("*") if path.is_file() and path.name != ".moonwrit"]
    assert done.stdout == f"{len(built)} files in output\n"
    after = journal.read_bytes()
    assert after.startswith(before)
    assert desk.run("publish").exit_code == 0
    assert journal.read_bytes() == after


def test_publish_as_of_is_a_look_back_that_leaves_the_content_alone(desk: Desk) -> None:
    """Expected: the site of that day; nothing in the content folder changes."""
    before = desk.files()
    assert desk.run("publish", "--as-of", "2025-10-21", "--output", "then").exit_code == 0
    assert {name: text for name, text in desk.files().items() if "/then/" not in name} == before
    months = json.loads((desk.folder / "then/feeds/basis.json").read_text(encoding="utf-8"))["months"]
    assert (months[4]["starts"], months[4]["standing"]) == ("2025-10-24", "expected")


def test_a_published_date_never_changes_silently(desk: Desk) -> None:
    """Expected: exit 3, each date that would change with both days, and neither site nor journal touched."""
    desk.edit("observances.yaml", "when: {month: 10, day: 1}", "when: {month: 10, day: 2}")
    message = desk.refused("publish", code=3)
    first, *changes, last = message.splitlines()
    assert re.fullmatch(r"\d+ published dates? would change without a recorded reason:", first)
    assert len(changes) == int(first.split()[0])
    moved = "  eid-al-fitr-1447: was 2026-03-22 (settled) -> would be 2026-03-23 (settled)"
    assert any(change.startswith(moved) for change in changes)
    assert "moonwrit record decision" in last


def test_a_report_is_written_down_and_weighed(desk: Desk) -> None:
    """Expected: a sighting 9 hours after conjunction is written down all the same, with advice."""
    file = desk.folder / "content/record/reports.yaml"
    before = file.read_bytes()
    done = desk.run("record", "report", *ABOUT_EVENING, "--outcome", "seen", "--aid", "naked-eye", "--time", "20:50")
    assert (done.exit_code, done.stderr) == (0, "")
    assert "recorded; weighed against the sky, as advice only: against the sky" in done.stdout
    assert file.read_bytes().startswith(before)
    assert desk.run("check").exit_code == 0


def test_a_decision_is_written_down_and_published(desk: Desk) -> None:
    """Expected: what is recorded is in force at once, for months and for the next build."""
    done = desk.run("record", "decision", *ABOUT_MONTH, "--starts", "2026-12-11", "--basis", "completed")
    assert (done.exit_code, done.stderr) == (0, "")
    assert done.stdout == "recorded: 1448-07 begins on Friday 2026-12-11; publish to tell the public\n"
    found = desk.json("why", "1448-7")
    assert (found["starts"], found["standing"], found["basis"]) == ("2026-12-11", "settled", "completed")


def test_begin_writes_content_that_is_sound(desk: Desk) -> None:
    """Expected: a copy without the demonstration's record and journal, which checks; a second time it is refused."""
    done = desk.run("begin", "ours")
    assert (done.exit_code, done.stderr) == (0, "")
    assert sorted(path.name for path in (desk.folder / "ours").iterdir()) == [
        "logo.svg", "look.yaml", "notices", "observances.yaml", "pages", "places.yaml", "policies.yaml", "regions.yaml",
        "schema", "site.yaml",
    ]
    assert desk.run("check", "--content", "ours").exit_code == 0
    assert "ours is there already and not empty" in desk.refused("begin", "ours")
    assert "is there already" in desk.refused("begin", "ours/site.yaml")
    assert "cannot be written" in desk.refused("begin", "ours/site.yaml/below")


def test_begin_brings_schemas_that_editors_find(desk: Desk) -> None:
    """Expected: each file begins with the line by which a YAML editor finds its schema, which is one and which the
    file keeps; the record's schemas are there for when it is begun."""
    assert desk.run("begin", "ours").exit_code == 0
    folder = desk.folder / "ours"
    files = sorted(folder.glob("*.yaml"))
    assert len(files) == 6
    for file in files:
        match = re.match(r"# yaml-language-server: \$schema=(\S+)\n", file.read_text(encoding="utf-8"))
        assert match, file
        schema = json.loads((folder / match[1]).read_text(encoding="utf-8"))
        jsonschema.Draft202012Validator.check_schema(schema)
        value = yaml.read(file).value
        jsonschema.Draft202012Validator(schema).validate(value)
        with pytest.raises(jsonschema.ValidationError):
            jsonschema.Draft202012Validator(schema).validate([value])
    assert {file.stem for file in (folder / "schema").glob("*.json")} > {"reports.schema", "decisions.schema"}


# --- content at fault ----------------------------------------------------------------------------------

FAULTS = {
    "unknown key": ("places.yaml", "latitude: -38.10", "latitud: -38.10", 'unknown key "latitud"; did you mean'),
    "wrong type": ("places.yaml", "latitude: -38.10", "latitude: south", 'latitude is "south", which is not a number'),
    "off the Earth": ("places.yaml", "latitude: -38.10", "latitude: -98.10", "latitude is -98.1, which is below -90"),
    "unknown zone": ("places.yaml", "timezone: Australia/Melbourne", "timezone: Australia/Melborne",
                     'time zone "Australia/Melborne" is unknown; did you mean "Australia/Melbourne"?'),
    "impossible date": ("record/decisions.yaml", "starts: '2025-06-28'", "starts: '2025-06-31'",
                        'starts: "2025-06-31" is not a date'),
    "impossible month": ("record/decisions.yaml", "month: 1447-01", "month: 1447-13", '"1447-13" is not a lunar month'),
    "unknown policy": ("site.yaml", "policy: harbour-sighting", "policy: harbor-sighting",
                       'policy "harbor-sighting" is not defined; did you mean "harbour-sighting"?'),
    "unknown published policy": ("policies.yaml", "published: umm-al-qura", "published: umm-al-kura",
                                 'published policy "umm-al-kura" is not defined; did you mean "umm-al-qura"?'),
    "unknown criterion": ("policies.yaml", "criterion: yallop-1997", "criterion: yalop-1997",
                          'criterion "yalop-1997" is not defined; did you mean "yallop-1997"?'),
    "unknown place": ("regions.yaml", "[wattle-harbour,", "[watle-harbour,", 'did you mean "wattle-harbour"?'),
    "two faults at once": ("places.yaml", "latitude: -38.10", "latitude: x\n  longitud: 1", "(and "),
    "repeated key": ("site.yaml", "language: en", "language: en\nlanguage: tr", "language"),
    "no YAML": ("site.yaml", "language: en", "language: [en", ""),
}

READERS = [
    ("check",), ("publish",), ("months",), ("evening",), ("why", "1447-9"), ("differ",),
    ("record", "report", *ABOUT_EVENING, "--outcome", "not-seen"),
    ("record", "decision", *ABOUT_MONTH, "--starts", "2026-12-11", "--basis", "completed"),
]


@pytest.mark.parametrize("fault", FAULTS)
def test_a_fault_of_the_content_is_one_message_with_file_and_line(desk: Desk, fault: str) -> None:
    """Expected: exit 1 and one line: file:line, what is wrong, how to mend it."""
    file, old, new, said = FAULTS[fault]
    line = desk.edit(file, old, new)
    message = desk.refused("check")
    where, _, what = message.partition(": ")
    named, _, number = where.rpartition(":")
    assert named == f"content/{file}"
    # A fault of grammar is seen where it ends, one of a pair at the second.
    assert line <= int(number) <= line + (4 if fault in ("no YAML", "repeated key") else 0)
    assert said in what
    assert "; " in what, "how to mend it follows"


@pytest.mark.parametrize("words", READERS, ids=lambda words: " ".join(words[:2]))
def test_every_command_that_reads_content_says_the_same(desk: Desk, words: tuple[str, ...]) -> None:
    """Expected: whatever is asked, the same one message; no site, no record, no journal is written."""
    line = desk.edit("places.yaml", "latitude: -38.10", "latitude: south")
    assert desk.refused(*words).startswith(f'content/places.yaml:{line}: latitude is "south"')


@pytest.mark.parametrize("years", ["from: 1316, to: 1318", "from: 1475, to: 1476", "from: 9998, to: 9999"])
def test_years_outside_the_ephemeris_are_a_fault_of_site_yaml(desk: Desk, years: str) -> None:
    """Expected: DE421 in skyfield-data covers 1899-07-28 to 2053-10-08; the message names file, line and span."""
    line = desk.edit("site.yaml", "years: {from: 1447, to: 1449}", f"years: {{{years}}}")
    for folder in ("record", "notices", "pages"):  # they speak of the years of the demonstration
        shutil.rmtree(desk.folder / "content" / folder)
    message = desk.refused("publish")
    assert message.startswith(f"content/site.yaml:{line}: ")
    assert "1318 to 1475 AH" in message


@pytest.mark.parametrize("file", ["site.yaml", "places.yaml", "observances.yaml"])
def test_a_missing_file_is_named(desk: Desk, file: str) -> None:
    """Expected: the file as a whole, without a line."""
    (desk.folder / "content" / file).unlink()
    assert desk.refused("check").startswith(f"content/{file}: the file is missing; add it")


def test_a_file_that_is_not_utf_8_is_named_with_its_line(desk: Desk) -> None:
    """Expected: the line of the first byte that is none, as Latin-1 editors leave them."""
    line = desk.edit("places.yaml", "name: Gannet Harbour", "name: Hafen G")
    path = desk.folder / "content/places.yaml"
    path.write_bytes(path.read_bytes().replace(b"Hafen G", "Möwenhafen".encode("latin-1")))
    assert desk.refused("check") == f"content/places.yaml:{line}: a character is not UTF-8; save the file as UTF-8"


def test_a_missing_folder_is_named(desk: Desk) -> None:
    """Expected: for every command that reads content."""
    for words in READERS:
        assert desk.refused(*words, "--content", "nowhere").startswith("nowhere: there is no such content folder")


# --- requests at fault ---------------------------------------------------------------------------------

PLACE = "--policy yallop-b --from 1447 --place"


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ("months --policy umm-al-qurra", 'policy "umm-al-qurra" is not known; did you mean "umm-al-qura"?'),
        ("months --policy umm-al-qurra --content nowhere", 'did you mean "umm-al-qura"?'),
        ("why 1447-9 --policy harbor-sighting", 'did you mean "harbour-sighting"?'),
        ("differ --policy odeh-d", 'did you mean "odeh-'),
        ("months --policy yallop-b", "leaves the place open; give one: --place"),
        ("months --from 1317 --to 1318", "1318 to 1475 AH, and the year 1317 was asked for"),
        ("months --from 1475 --to 1476", "1318 to 1475 AH, and the year 1476 was asked for"),
        ("months --from 1448 --to 1447", "--to 1447 comes before --from 1448"),
        ("differ --from 1476 --to 1476", "the year 1476 was asked for"),
        ("evening 1899-07-01", "the ephemeris covers 1899-07-28 to 2053-10-08"),
        ("evening 2053-10-09", "the ephemeris covers 1899-07-28 to 2053-10-08"),
        ("evening --as-of 2040-01-01", "no 29th evening is left in the years of site.yaml"),
        (f"months {PLACE} Rabat,94,-6.84", "lies off the Earth"),
        (f"months {PLACE} Rabat,34,-186.84", "lies off the Earth"),
        (f"months {PLACE} Rabat,34,-6.84,9001", "lies off the Earth"),
        (f"months {PLACE} Rabat,nan,-6.84", "lies off the Earth"),
        (f"months {PLACE} Rabat,north,-6.84", "latitude, longitude and elevation are numbers"),
        (f"months {PLACE} Rabat", 'place "Rabat" is not known'),
        (f"months {PLACE} watle-harbour", 'did you mean "wattle-harbour"?'),
        (f"months {PLACE} Rabat,34,-6.84,75,Africa/Casablanka",
         'time zone "Africa/Casablanka" is unknown; did you mean "Africa/Casablanca"?'),
        (f"months {PLACE} Rabat,34,-6.84,75,localtime", 'time zone "localtime" is unknown'),
        (f"months {PLACE} Rabat,34,-6.84,75,../../etc/passwd", "is unknown"),
        ("why 1447-13", "there is no month 13"),
        ("why 0-1 --policy tabular", "there is no year 0"),
        ("why 2026-02-30", "2026-02-30 is not a date"),
        ("why eid-al-fitra-1447", 'did you mean "eid-al-fitr-1447"?'),
        ("why tomorrow", '"tomorrow" is neither a lunar month, a civil date nor an observance'),
        ("publish --output content", "holds files that moonwrit did not write"),
        ("publish --output content/site.yaml/site", "site.yaml/site cannot be written"),
        ("record report --evening 2026-12-39 --place wattle-harbour --outcome not-seen", '"2026-12-39" is not a date'),
        ("record report --evening 2100-12-09 --place wattle-harbour --outcome not-seen", "the ephemeris covers"),
        ("record report --evening 2026-12-09 --place watle-harbour --outcome not-seen", "did you mean"),
        ("record report --evening 2026-12-09 --place wattle-harbour --outcome seem --aid camera", "did you mean"),
        ("record decision --by Us --month 1448-07 --starts 2026-12-15 --basis completed", "would have 34 days"),
        ("record decision --by Us --month 1448-7 --starts 2026-12-11 --basis completed", "is not a lunar month"),
        ("record decision --by Us --month 1450-07 --starts 2028-11-19 --basis completed",
         "1450-07 is none of the months published, 1447 to 1449 AH"),
        ("record decision --by Us --month 1448-07 --starts 2026-12-11 --basis completed --at 2026-12-09",
         "has no time zone"),
    ],
)  # fmt: skip
def test_a_request_that_cannot_be_met_is_one_message(desk: Desk, words: str, said: str) -> None:
    """Expected: exit 1 and one line that says how to mend it; nothing is written."""
    message = desk.refused(*words.split())
    assert said in message
    assert "; " in message


@pytest.mark.parametrize("words", ["record report", "record decision"])
def test_what_is_wrong_with_an_entry_is_placed_where_it_would_stand(desk: Desk, words: str) -> None:
    """Expected: the line after the last of the file on which the faulty value would have been written."""
    file, value = {
        "record report": ("reports.yaml", (*ABOUT_EVENING, "--outcome", "seem")),
        "record decision": ("decisions.yaml", ("--month", "1448-07", "--starts", "2026-12-11", "--basis", "sited",
                                               "--by", "Us")),
    }[words]
    lines = (desk.folder / "content/record" / file).read_text(encoding="utf-8").count("\n")
    # An empty line, then evening, place, outcome, or month, starts, basis.
    assert desk.refused(*words.split(), *value).startswith(f"content/record/{file}:{lines + 4}: ")


def test_an_entry_is_not_added_to_a_file_that_it_would_break(desk: Desk) -> None:
    """Expected: to a list in brackets nothing can be appended; it is refused, and the file stays as it is."""
    (desk.folder / "content/record/reports.yaml").write_text("[]\n", encoding="utf-8")
    assert desk.run("check").exit_code == 0
    message = desk.refused("record", "report", *ABOUT_EVENING, "--outcome", "not-seen")
    assert message.startswith("content/record/reports.yaml:")


def test_a_read_only_output_is_one_message(desk: Desk, monkeypatch: pytest.MonkeyPatch) -> None:
    """Expected: the system's reason, what to do, and exit 1; no half-built site is left."""

    def refuse(self: Path, *_: object, **__: object) -> None:
        raise OSError(errno.EROFS, os.strerror(errno.EROFS), str(self))

    monkeypatch.setattr(Path, "mkdir", refuse)
    assert "output cannot be written (Read-only file system); " in desk.refused("publish")


@pytest.mark.parametrize("epoch", ["yesterday", "99999999999999", "1e3"])
def test_a_source_date_epoch_that_is_none_is_one_message(desk: Desk, epoch: str) -> None:
    """Expected: the variable's value, and what to write instead."""
    done = CliRunner(env={"SOURCE_DATE_EPOCH": epoch}).invoke(main, ["publish"], catch_exceptions=False)
    assert (done.exit_code, done.stdout) == (1, "")
    assert done.stderr == f'moonwrit: SOURCE_DATE_EPOCH is "{epoch}"; give whole seconds since 1970\n'


@pytest.mark.parametrize(
    "words",
    [
        "nonsense", "check --nonsense", "check extra", "months --from x", "months --from 0", "months --from -1447",
        "months --also nonsense", "publish --as-of 2026-13-01", "months --as-of yesterday", "evening 2026-02-30",
        "why", "begin", "record", "record nonsense", "record report", "record decision --month 1448-07",
        "months --policy yallop-b --place a,1,2 --place b,1,2", "months --policy umm-al-qura --content nowhere",
    ],
)  # fmt: skip
def test_wrong_usage(desk: Desk, words: str) -> None:
    """Expected: exit 2, a usage line and the error on standard error, nothing written."""
    before = desk.files()
    done = desk.run(*words.split())
    assert (done.exit_code, done.stdout) == (2, "")
    assert "Usage: " in done.stderr
    assert desk.files() == before


# --- as a process, and as the documents say ------------------------------------------------------------


def _process(*words: str, **environment: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "moonwrit.cli", *words], capture_output=True, encoding="utf-8", timeout=120,
        stdin=subprocess.DEVNULL, env={**os.environ, "SOURCE_DATE_EPOCH": NOW, **environment},
    )


def test_the_process_ends_with_the_same_codes_and_no_traceback(desk: Desk) -> None:
    """Expected: 0, 1, 2 and 3 of the process itself, and on standard error the message alone."""
    assert _process("check").returncode == 0
    assert _process("check", "--nonsense").returncode == 2
    desk.edit("observances.yaml", "when: {month: 10, day: 1}", "when: {month: 10, day: 2}")
    silent = _process("publish")
    assert silent.returncode == 3
    line = desk.edit("places.yaml", "latitude: -38.10", "latitude: south")
    fault = _process("publish")
    assert (fault.returncode, fault.stdout) == (1, "")
    assert fault.stderr.startswith(f"moonwrit: content/places.yaml:{line}: ")
    assert "Traceback" not in silent.stderr + fault.stderr
    assert not (desk.folder / "output").exists()


def test_output_does_not_depend_on_the_terminal(desk: Desk) -> None:
    """Expected: the same bytes in a narrow terminal without colours or UTF-8 in its name, and in a wide one."""
    words = ("months", "--policy", "tabular", "--from", "1447", "--to", "1447")
    narrow = _process(*words, COLUMNS="30", TERM="dumb", NO_COLOR="1")
    wide = _process(*words, COLUMNS="300", TERM="xterm-256color", FORCE_COLOR="")
    assert narrow.returncode == wide.returncode == 0
    assert narrow.stdout == wide.stdout
    assert len(narrow.stdout.splitlines()) > 12


def test_two_builds_at_once_both_end_well(desk: Desk) -> None:
    """Expected: both say how many files they wrote, and the site that stands is the one that a lone build makes."""
    desk.edit("site.yaml", "years: {from: 1447, to: 1449}", "years: {from: 1448, to: 1448}")
    shutil.rmtree(desk.folder / "content/record")
    words = [sys.executable, "-m", "moonwrit.cli", "publish"]
    started = [subprocess.Popen(words, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env={
        **os.environ, "SOURCE_DATE_EPOCH": NOW}) for _ in range(2)]
    said = [build.communicate(timeout=120) for build in started]
    assert [build.returncode for build in started] == [0, 0], said
    assert said[0] == said[1]
    together = {path.relative_to("output"): path.read_bytes() for path in Path("output").rglob("*.html")}
    assert _process("publish", "--output", "alone").returncode == 0
    assert together == {path.relative_to("alone"): path.read_bytes() for path in Path("alone").rglob("*.html")}


def _commands(group: click.Group, *before: str) -> set[str]:
    names = set()
    for name, command in group.commands.items():
        names |= _commands(command, *before, name) if isinstance(command, click.Group) else {" ".join((*before, name))}
    return names


def _in_readme() -> list[list[str]]:
    blocks = re.findall(r"```\n(.*?)```", (ROOT / "README.md").read_text(encoding="utf-8"), re.DOTALL)
    lines = [shlex.split(line, comments=True) for block in blocks for line in block.splitlines()]
    return [line[1:] for line in lines if line[:1] == ["moonwrit"]]


def test_every_command_is_in_the_readme() -> None:
    """Expected: README shows each command at least once, and shows or names none that does not exist."""
    shown = _in_readme()
    for command in _commands(main):
        assert any(" ".join(line).startswith(command) for line in shown), f"README shows no moonwrit {command}"
    named = set(re.findall(r"`moonwrit ([a-z]+)", (ROOT / "README.md").read_text(encoding="utf-8")))
    assert named <= set(main.commands)


def test_what_the_readme_shows_works_in_its_order(desk: Desk) -> None:
    """Expected: each line of README that begins with moonwrit ends with 0, on the evening of which it speaks.

    But for the preview, which serves until it is stopped: tests/test_preview.py.
    """
    for words in (line for line in _in_readme() if line[0] != "preview"):
        done = desk.run(*words)
        assert done.exit_code == 0, f"moonwrit {' '.join(words)}: {done.output}"


def test_help_names_every_command_and_option(desk: Desk) -> None:
    """Expected: a sentence for each command, and for each option of each but --help."""
    overview = desk.run("--help").stdout

    def helped(command: click.Command, *words: str) -> None:
        said = desk.run(*words, "--help")
        assert said.exit_code == 0
        for option in (one for one in command.params if isinstance(one, click.Option)):
            assert option.help, f"{words} {option.name}"
            assert option.opts[-1] in said.stdout
        if isinstance(command, click.Group):
            for name, below in command.commands.items():
                assert below.help
                helped(below, *words, name)

    helped(main)
    assert all(f"\n  {name} " in overview for name in main.commands)
    assert desk.run("--version").stdout == f"moonwrit, version {__version__}\n"
