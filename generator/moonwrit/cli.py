"""The command ``moonwrit``: reads the words, asks the packages, prints. Slow imports wait for their command."""

from __future__ import annotations

import json
import os
import re
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from moonwrit import __version__
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.errors import MoonwritError, RequestError, did_you_mean

if TYPE_CHECKING:

    from moonwrit.content import Content
    from moonwrit.content.models import OtherCalendar
    from moonwrit.content.record import Decision
    from moonwrit.policy import Method, Month, NamedPlace
    from moonwrit.publish.sheets import Paper


class _Commands(click.Group):
    """A group in which every error that a user can mend is one message and its own exit code."""

    def invoke(self, ctx: click.Context) -> Any:
        try:
            return super().invoke(ctx)
        except MoonwritError as fault:
            click.echo(f"moonwrit: {fault}", err=True)
            ctx.exit(fault.exit_code)


def _date(_: click.Context, __: click.Parameter, value: str | None) -> date | None:
    if value is None:
        return None
    try:
        return date.fromisoformat(value)
    except ValueError:
        raise click.BadParameter(f'"{value}" is not a date; write for instance 2026-12-01') from None


_OPTIONS: dict[str, list[Callable[[Callable[..., None]], Callable[..., None]]]] = {
    "content": [click.option(
        "--content", "folder", type=click.Path(path_type=Path), default=Path("content"), show_default=True,
        help="Folder of content files.",
    )],
    "json": [click.option("--json", "as_json", is_flag=True, help="Print JSON.")],
    "as_of": [click.option("--as-of", metavar="DATE", callback=_date, help='The date to take for "today".')],
    "years": [
        click.option("--from", "first", type=click.IntRange(min=1), metavar="YEAR", help="First Hijri year."),
        click.option("--to", "last", type=click.IntRange(min=1), metavar="YEAR", help="Last Hijri year, included."),
    ],
    "policy": [click.option("--policy", metavar="P", help="A policy of the content, or a published one.")],
    "place": [click.option(
        "--place", "places", multiple=True, metavar="PLACE",
        help='A place of the content, or "name,lat,lon[,elevation[,zone]]".',
    )],
}


def _shared(*names: str) -> Callable[[Callable[..., None]], Callable[..., None]]:
    """The options that several commands share, each written once."""

    def wrap(command: Callable[..., None]) -> Callable[..., None]:
        for name in reversed(names):
            for option in reversed(_OPTIONS[name]):
                command = option(command)
        return command

    return wrap


@click.group(cls=_Commands, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="moonwrit")
def main() -> None:
    """Publish a community's lunar (Hijri) calendar: every date with its basis, as pages and as feeds."""


@main.command()
@click.option("--content", "folders", type=click.Path(path_type=Path), multiple=True, default=[Path("content")],
              show_default="content", help="Folder of content files; of several, each is built into its own name.")
@_shared("as_of")
@click.option("--output", type=click.Path(path_type=Path), default=Path("output"), show_default=True,
              help="Folder of the built site, or of the sites.")
@click.option("--workers", type=click.IntRange(1, 256), default=os.cpu_count() or 1, metavar="N",
              help="How many processes of this machine: for content folders side by side, or the pages of one.")
@click.option("--pdf", "paper", type=click.Choice(["a4", "letter"]),
              help="Sheets to print too: years, months and evenings as PDF.")
@click.option("--scheduler", metavar="ADDRESS", help="A Dask cluster on which to build several content folders.")
@click.pass_context
def publish(
    ctx: click.Context, folders: tuple[Path, ...], output: Path, as_of: date | None, workers: int,
    paper: Paper | None, scheduler: str | None,
) -> None:
    """Build the site and its feeds."""
    from moonwrit.building import publish as build
    from moonwrit.building import publish_many

    if len(folders) == 1:
        click.echo(f"{build(folders[0], output, as_of, paper, _progress, workers)} files in {output}")
        return
    worst = 0
    for outcome in publish_many(folders, output, as_of, paper, workers, scheduler):
        failed = outcome.exit_code != 0
        click.echo(f"{outcome.folder.name}: {outcome.said}", err=failed)
        worst = max(worst, outcome.exit_code)
    ctx.exit(worst)


@main.command()
@_shared("content", "as_of")
@click.option("--port", type=click.IntRange(0, 65535), default=8000, show_default=True, help="Of this machine only.")
def preview(folder: Path, as_of: date | None, port: int) -> None:
    """Serve the site on this machine and build it again on every change; nothing is published."""
    from moonwrit.preview import serve

    _content(folder)
    serve(folder, port, as_of, lambda text: click.echo(text, err=True))


@main.command()
@_shared("content")
def check(folder: Path) -> None:
    """Check the content files; says nothing but a word where all is well."""
    content = _content(folder)
    if content.own.theme is not None:
        from moonwrit.publish.language import Language
        from moonwrit.publish.render import Renderer

        Renderer(content.site, Language(content.site.language), content.own).check()
    click.echo(
        f"{folder}: all is well ({len(content.places)} places, {len(content.policies)} policies, "
        f"{len(content.observances)} observances)"
    )
    from moonwrit.publish.catalogue import untranslated

    for code in content.site.all_languages:
        if missing := untranslated(code):
            click.echo(f'{code}: {len(missing)} texts are not translated and stand in English, such as "{missing[0]}"')


@main.command()
@_shared("content", "policy", "place", "years", "as_of", "json")
@click.option("--also", "calendars", multiple=True, metavar="CALENDAR", type=click.Choice(sorted(TITLES)),
              help=f"The first days in another calendar too: {', '.join(sorted(TITLES))}; may be repeated.")
def months(
    folder: Path, policy: str | None, places: tuple[str, ...], first: int | None, last: int | None,
    as_of: date | None, as_json: bool, calendars: tuple[OtherCalendar, ...],
) -> None:
    """Month starts as a table."""
    content = _content_if_there(folder, policy)
    method = _method(content, policy, places)
    years = _years(content, first, last)
    with _progress("Computing months"):
        found = method.months(*years, _on_record(content, method, as_of))
    from moonwrit.publish.basis import month_json

    also = [{calendar: in_calendar(month.starts, calendar) for calendar in calendars} for month in found]
    if as_json:
        _print_json([
            {**month_json(month), **({"also": other} if other else {})}
            for month, other in zip(found, also, strict=True)
        ])
        return
    _table(
        f"{method.title}, {years[0]}-{years[1]} AH",
        ("month", "starts", *(TITLES[calendar] for calendar in calendars), "days", "standing", "basis",
         "deciding quantity", "margin", "how close"),
        [
            (
                f"{m.year}-{m.month:02d}", f"{m.starts:%a %Y-%m-%d}", *(day or "-" for day in other.values()),
                str(m.length), m.standing, m.basis, m.margin.quantity,
                "" if m.margin.margin is None else f"{m.margin.margin:+g} {m.margin.unit}".strip(),
                m.margin.closeness,
            )
            for m, other in zip(found, also, strict=True)
        ],
    )


@main.command()
@click.argument("on", metavar="[DATE]", callback=_date, required=False)
@_shared("content", "place", "as_of", "json")
def evening(
    on: date | None, folder: Path, places: tuple[str, ...], as_of: date | None, as_json: bool
) -> None:
    """Circumstances of the evening of a civil date at places.

    Without DATE, the next 29th evening of the community's calendar.
    """
    content = _content(folder) if on is None or not places or _is_folder(folder) else None
    from moonwrit.policy import named_place
    from moonwrit.policy.evening import evening_at

    if places:
        chosen = [_place(content, text) for text in places]
    else:
        assert content is not None
        chosen = [named_place(content, place_id) for place_id in content.places]
    if on is None:
        assert content is not None
        on = _next_evening(content, as_of)
    rows = evening_at(on, chosen)
    if as_json:
        _print_json(rows)
        return
    keys = [key for key in rows[0] if key not in ("date", "place")]
    _table(
        f"Evening of {on:%A %Y-%m-%d}",
        ("", *(str(row["place"]) for row in rows)),
        [(key, *("-" if row[key] is None else str(row[key]) for row in rows)) for key in keys],
    )
    from moonwrit.publish.labels import EYES

    click.echo(EYES)


@main.command()
@click.argument("what")
@_shared("content", "policy", "place", "as_of", "json")
def why(
    what: str, folder: Path, policy: str | None, places: tuple[str, ...], as_of: date | None, as_json: bool
) -> None:
    """The basis of one date, in words.

    WHAT is a lunar month (1447-9), a civil date (2026-02-19), or an observance and its year
    (eid-al-fitr-1447).
    """
    from moonwrit.publish.basis import month_json
    from moonwrit.publish.words import why_paragraphs

    content = _content_if_there(folder, policy)
    method = _method(content, policy, places)
    month, about = _asked(what, method, content, _on_record(content, method, as_of))
    if as_json:
        _print_json(month_json(month))
        return
    for paragraph in [*about, *why_paragraphs(month)]:
        click.echo(paragraph)


@main.command()
@_shared("content")
@click.option("--policy", "policies", multiple=True, metavar="P",
              help="A policy to put beside the community's; may be repeated. Default: all others of the content.")
@_shared("place", "years", "as_of", "json")
def differ(
    folder: Path, policies: tuple[str, ...], places: tuple[str, ...], first: int | None, last: int | None,
    as_of: date | None, as_json: bool,
) -> None:
    """Policies side by side: month starts, and the computed reason for each difference."""
    from moonwrit.policy.differ import beside
    from moonwrit.publish.basis import beside_json

    content = _content(folder)
    main_policy = next(iter(content.site.calendars.values())).policy
    ours = _method(content, None, ())
    others = [_method(content, name, places) for name in policies or content.policies if name != main_policy]
    if not others:
        raise RequestError("there is no other policy to put beside the community's", "name one with --policy")
    years = _years(content, first, last)
    with _progress("Computing policies"):
        months = ours.months(*years, _on_record(content, ours, as_of))
        found = [beside(other, months, ours) for other in others]
    if as_json:
        _print_json([beside_json(one) for one in found])
        return
    _table(
        f"{years[0]}-{years[1]} AH",
        ("month", ours.title, *(one.method.title for one in found)),
        [
            (f"{m.year}-{m.month:02d}", f"{m.starts:%a %Y-%m-%d}", *(
                "same" if one.months[i].starts == m.starts else f"{(one.months[i].starts - m.starts).days:+d} d"
                for one in found
            ))
            for i, m in enumerate(months)
        ],
    )
    for one in found:
        click.echo(f"{one.method.title}: {one.agreement:.0%} of {len(months)} months begin on the same day.")
        for each in one.differences:
            click.echo(f"  {each.ours.year}-{each.ours.month:02d}: {each.days:+d} d. {each.reason}")


@main.command()
@_shared("content")
@click.option("--policy", "policies", multiple=True, metavar="P",
              help="A policy of the content, or a published one; may be repeated. Default: all of the content.")
@_shared("place")
@click.option("--grid", metavar="DEGREES", type=click.FloatRange(0.05, 60),
              help="Instead of places, a grid of this step between 60 S and 60 N.")
@_shared("years")
@click.option("--ephemeris", default="", metavar="FILE",
              help="A JPL kernel in place of DE421 (1899-2053), or long-range: DE440 (1550-2650), an extra.")
@click.option("--output", type=click.Path(path_type=Path), default=Path("survey"), show_default=True,
              help="Folder of the units and results; what is finished there is not done again.")
@click.option("--workers", type=click.IntRange(1, 256), default=os.cpu_count() or 1, metavar="N",
              help="How many processes of this machine.")
@click.option("--scheduler", metavar="ADDRESS", help="A Dask cluster to work on instead.")
@click.option("--parquet", "as_parquet", is_flag=True, help="The tables as Parquet also (extra parquet).")
def survey(
    folder: Path, policies: tuple[str, ...], places: tuple[str, ...], grid: float | None, first: int | None,
    last: int | None, ephemeris: str, output: Path, workers: int, scheduler: str | None, as_parquet: bool,
) -> None:
    """A long-run study: how often policies agree, how long months run, how close the calls are.

    Places without --place or --grid are those of the content's region. A survey that was interrupted is carried on.
    """
    if _is_folder(folder) or not (places or grid):
        content: Content | None = _content(folder)
    else:
        content = [_content_if_there(folder, policy) for policy in policies or (None,)][-1]
    years = _years(content, first, last)
    from moonwrit.survey import parquet
    from moonwrit.survey.page import page
    from moonwrit.survey.plan import plan
    from moonwrit.survey.results import gather
    from moonwrit.survey.running import run, write

    if as_parquet:
        parquet.library()
    with _progress("Looking at what is asked"):
        asked = plan(policies, [_place(content, text) for text in places], grid, *years, ephemeris,
                     None if content is None else folder.resolve())
    with _counted("Units") as each:
        done = run(asked, output, workers, scheduler, each)
    with _counted("Parts gathered") as each:
        results = gather(asked, output, workers, each)
    if as_parquet:
        with _progress("Writing Parquet"):
            parquet.write_parquet(output)
    write(output / "survey.html", page(results))
    click.echo(f"{done} units computed, {asked.unit_count - done} were there; results in {output / 'survey.html'}")
    if results.seams:
        click.echo(f"{results.seams} joints of two runs of years do not meet (unsettled_seams): do not count on month "
                   "lengths there", err=True)


@main.group()
def record() -> None:
    """Add a report or a decision to the record; what is missing is asked for on a terminal."""


@record.command()
@_shared("content")
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

    content = _content(folder)
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
@_shared("content")
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
    from moonwrit.almanac import assemble
    from moonwrit.content.record import Decision
    from moonwrit.record.appending import append, tried

    content = _content(folder)
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
    assemble(replace(content, decisions=(*content.decisions, made), documents=documents), _today(content))
    append(file, entry)
    click.echo(f"recorded: {made.month} begins on {made.starts:%A %Y-%m-%d}; publish to tell the public")


@main.command()
@click.argument("folder", metavar="DIR", type=click.Path(path_type=Path))
def begin(folder: Path) -> None:
    """Write a new, commented content folder to start from."""
    from moonwrit.beginning import begin as write

    if folder.exists() and any(folder.iterdir() if folder.is_dir() else [folder]):
        raise RequestError(f"{folder} is there already and not empty", "name a new folder")
    try:
        write(folder)
    except OSError as fault:
        raise RequestError(f"{folder} cannot be written ({fault.strerror})", "name another folder") from None
    click.echo(f"{folder} is yours to change: begin with {folder / 'site.yaml'}")
    click.echo(f"then: moonwrit check --content {folder}")


# --- the record -----------------------------------------------------------------------------------


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


# --- what the commands share ----------------------------------------------------------------------


def _content(folder: Path) -> Content:
    from moonwrit.building import content_of

    return content_of(folder)


def _today(content: Content) -> date:
    from moonwrit.building import now, today

    return today(content, now())


def _next_evening(content: Content, as_of: date | None) -> date:
    """The first 29th evening from today on, by the community's own policy and record."""
    method, today = _method(content, None, ()), as_of or _today(content)
    years = content.site.years
    for month in method.months(years.first, years.last, _on_record(content, method, as_of)):
        if month.evidence.evening >= today:
            return month.evidence.evening
    raise RequestError("no 29th evening is left in the years of site.yaml", "give a DATE, or add years")


def _is_folder(folder: Path) -> bool:
    return (folder / "site.yaml").exists()


def _content_if_there(folder: Path, policy: str | None) -> Content | None:
    """The content; a published policy can do without where the folder is not there."""
    from moonwrit.policy import published_names

    if policy is None or _is_folder(folder):
        return _content(folder)
    if policy not in published_names():
        raise RequestError(f'policy "{policy}" is not a published one, and {folder} is no content folder',
                           did_you_mean(policy, published_names()))
    return None


def _method(content: Content | None, policy: str | None, places: tuple[str, ...]) -> Method:
    from moonwrit.policy import method

    if policy is None:
        assert content is not None
        policy = next(iter(content.site.calendars.values())).policy
    if len(places) > 1:
        raise click.UsageError("give one --place; a policy that wants several names them in the content")
    return method(policy, content, _place(content, places[0]) if places else None)


def _place(content: Content | None, text: str) -> NamedPlace:
    from moonwrit.policy import named_place
    from moonwrit.policy.evening import place_from_text

    if content is not None and text in content.places:
        return named_place(content, text)
    return place_from_text(text, content.places if content else ())


def _on_record(content: Content | None, method: Method, as_of: date | None) -> dict[int, Decision]:
    """The decisions in force for a policy that one of the content's calendars follows; none for any other."""
    from moonwrit.record import in_force

    if content is None or method.name not in {calendar.policy for calendar in content.site.calendars.values()}:
        return {}
    from moonwrit.building import end_of

    return in_force(content.decisions, None if as_of is None else end_of(as_of, content))


def _asked(
    what: str, method: Method, content: Content | None, decisions: dict[int, Decision]
) -> tuple[Month, list[str]]:
    """The month on which the thing asked for rests, and a line that dates the thing itself."""
    from moonwrit.calendars import Tabular, month_name

    if match := re.fullmatch(r"(\d{1,4})-(\d{1,2})", what):
        year, number = int(match[1]), int(match[2])
        if not 1 <= number <= 12:
            raise RequestError(f"there is no month {number}", "lunar months are 1 to 12")
        if year < 1:
            raise RequestError("there is no year 0", "Hijri years begin with 1")
        return method.months(year, year, decisions)[number - 1], []
    if re.fullmatch(r"\d{4}-\d{2}-\d{2}", what):
        try:
            day = date.fromisoformat(what)
        except ValueError:
            raise RequestError(f"{what} is not a date", "write year-month-day") from None
        near = Tabular().from_date(day)
        for year in (near.year, near.year + (1 if near.month > 6 else -1)):
            for month in method.months(year, year, decisions):
                if month.starts <= day <= month.ends:
                    lunar = f"{(day - month.starts).days + 1} {month_name(month.month)} {month.year}"
                    return month, [f"{day:%A %d %B %Y} is {lunar}."]
    if content is not None and (match := re.fullmatch(r"([a-z0-9-]+?)-(\d{3,4})(-\d{2})*", what)):
        from moonwrit.observances import occurrences

        year = int(match[2])
        found = method.months(year, year, decisions)
        dated = {one.key: one for one in occurrences(content.observances, found)}
        if what in dated:
            one = dated[what]
            run = f"{one.starts:%A %d %B %Y}" + ("" if one.starts == one.ends else f" to {one.ends:%A %d %B %Y}")
            return found[one.month - 1], [f"{what}: {run}."]
        raise RequestError(f'"{what}" is nothing that is dated here', did_you_mean(what, dated))
    raise RequestError(
        f'"{what}" is neither a lunar month, a civil date nor an observance',
        "write 1447-9, 2026-02-19 or eid-al-fitr-1447",
    )


def _years(content: Content | None, first: int | None, last: int | None) -> tuple[int, int]:
    if content is None and (first is None or last is None):
        if first is None and last is None:
            raise click.UsageError("say which years: --from YEAR --to YEAR")
        first = last = first if first is not None else last
    span = content.site.years if content else None
    begin_year = first if first is not None else (span.first if span else 0)
    end_year = last if last is not None else (max(span.last, begin_year) if span else begin_year)
    if end_year < begin_year:
        raise RequestError(f"--to {end_year} comes before --from {begin_year}", "swap them")
    return begin_year, end_year


def _print_json(value: object) -> None:
    click.echo(json.dumps(value, ensure_ascii=False, indent=2))


def _table(title: str, head: tuple[str, ...], rows: list[tuple[str, ...]]) -> None:
    from rich import box
    from rich.console import Console
    from rich.table import Table

    table = Table(title=title, title_justify="left", box=box.SIMPLE_HEAD)
    for column in head:
        table.add_column(column, overflow="fold")
    for row in rows:
        table.add_row(*row)
    width = None if sys.stdout.isatty() else 140
    Console(width=width, highlight=False, markup=False).print(table)


@contextmanager
def _counted(what: str) -> Iterator[Callable[[int, int], None]]:
    """A bar on standard error, where that is a terminal, that is told how many are done of how many."""
    if not sys.stderr.isatty():
        yield lambda done, of: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

    columns = TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn(), TimeRemainingColumn()
    with Progress(*columns, console=Console(stderr=True)) as bar:
        task = bar.add_task(what, total=None)
        yield lambda done, of: bar.update(task, completed=done, total=of)


@contextmanager
def _progress(what: str) -> Iterator[None]:
    """A spinner on standard error, where that is a terminal."""
    if not sys.stderr.isatty():
        yield
        return
    from rich.console import Console

    with Console(stderr=True).status(what):
        yield


if __name__ == "__main__":
    main()
