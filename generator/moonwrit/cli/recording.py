"""``record``: reports and decisions, added to the record's files."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Any

import click

from moonwrit.cli.options import content_at, shared, today_of
from moonwrit.errors import RequestError

if TYPE_CHECKING:
    from pathlib import Path

    from moonwrit.content import Content


@click.group()
def record() -> None:
    """Add a report or a decision to the record; what is missing is asked for on a terminal."""


@record.command()
@shared("content")
@click.option("--evening", metavar="DATE", help="The evening's civil date.")
@click.option("--place", help="A place of the content.")
@click.option("--outcome", help="seen, not-seen or could-not-look.")
@click.option("--time", metavar="HH:MM", help="When, by the place's clock.")
@click.option("--aid", help="naked-eye, binoculars, telescope or camera.")
@click.option("--observers", type=int, help="How many looked.")
@click.option("--sky", help="clear, haze, part-cloud, cloud or rain.")
@click.option("--note", help="Anything else worth keeping.")
@click.option("--name", "names", multiple=True, help="An observer's name; never published unless --names-public.")
@click.option("--names-public", is_flag=True, help="The observers agree that their names are published.")
def report(folder: Path, **given: Any) -> None:
    """What one group of observers says of one evening."""
    from moonwrit.content.models import in_language
    from moonwrit.content.record import Report
    from moonwrit.record import weighed
    from moonwrit.record.appending import append, tried

    content = content_at(folder)
    given["evening"] = _asked_for(given["evening"], "Evening (year-month-day)")
    given["place"] = _asked_for(given["place"], f"Place ({', '.join(content.places)})")
    given["outcome"] = _asked_for(given["outcome"], "Outcome (seen, not-seen, could-not-look)")
    if given["outcome"] == "seen":
        given["aid"] = _asked_for(given["aid"], "Aid (naked-eye, binoculars, telescope, camera)")
    file, entry = folder / "record/reports.yaml", _entry({**given, "recorded": _stamp(content)})
    made, _ = tried(file, Report, entry, content)
    names = {name: in_language(place.name, content.site.language) for name, place in content.places.items()}
    (one,) = weighed([made], content.places, names)
    append(file, entry)
    click.echo(f"recorded; weighed against the sky, as advice only: {one.weight}")
    for advice in one.advice:
        click.echo(f"  {advice}")


@record.command()
@shared("content")
@click.option("--month", metavar="YEAR-MONTH", help="The lunar month, for instance 1448-09.")
@click.option("--starts", metavar="DATE", help="Its first day.")
@click.option("--basis", help="sighted, completed, calculated or adopted.")
@click.option("--by", help="Who decided.")
@click.option("--at", metavar="MOMENT", help="When, with time zone; now unless said.")
@click.option("--text", help="The decision in words.")
@click.option("--adopted-from", help="The authority that the date is taken from.")
@click.option("--knowingly", is_flag=True, help="The community knows that the rules or the sky speak against it.")
def decision(folder: Path, **given: Any) -> None:
    """The community's word on when a month begins."""
    from dataclasses import replace

    from moonwrit.almanac import assemble
    from moonwrit.content.record import Decision
    from moonwrit.record.appending import append, tried

    content = content_at(folder)
    given["month"] = _asked_for(given["month"], "Lunar month (year-month)")
    given["starts"] = _asked_for(given["starts"], "First day (year-month-day)")
    given["basis"] = _asked_for(given["basis"], "Basis (sighted, completed, calculated, adopted)")
    given["by"] = _asked_for(given["by"], "Decided by")
    if given["basis"] == "adopted":
        given["adopted_from"] = _asked_for(given["adopted_from"], "Adopted from")
    given["at"] = given["at"] or _stamp(content)
    file, entry = folder / "record/decisions.yaml", _entry(given)
    made, document = tried(file, Decision, entry, content)
    years, year = content.site.years, made.ordinal // 12 + 1
    if not years.first <= year <= years.last:
        raise RequestError(f"{made.month} is none of the months published, {years.first} to {years.last} AH",
                           "correct it, or change the years in site.yaml")
    documents = {**content.documents, "record/decisions.yaml": document}
    assemble(replace(content, decisions=(*content.decisions, made), documents=documents), today_of(content))
    append(file, entry)
    click.echo(f"recorded: {made.month} begins on {made.starts:%A %Y-%m-%d}; publish to tell the public")


def _asked_for(given: str | None, what: str) -> str:
    """The value given, or asked for on a terminal."""
    if given:
        return given
    if sys.stdin.isatty() and sys.stderr.isatty():
        return str(click.prompt(what, err=True))
    raise click.UsageError(f"{what} is missing; see --help")


def _stamp(content: Content) -> str:
    from moonwrit.building import now, zone

    return now().astimezone(zone(content)).replace(microsecond=0).isoformat()


def _entry(given: dict[str, Any]) -> dict[str, Any]:
    """What was given, as it is written down: what was not given is left out."""
    return {key: value for key, value in given.items() if value not in (None, (), False, "")}
