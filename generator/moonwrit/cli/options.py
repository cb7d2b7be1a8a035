"""What the commands share: their options, and how they read what is given and print what is found."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from datetime import date
from typing import TYPE_CHECKING

import click

from moonwrit.errors import RequestError, did_you_mean

if TYPE_CHECKING:
    from pathlib import Path

    from moonwrit.content import Content
    from moonwrit.content.record import Decision
    from moonwrit.policy import Method, NamedPlace


class _Path(click.ParamType):  # type: ignore[type-arg]
    """A path. The command's help needs none, and does not wait for them."""

    name = "path"

    def convert(self, value: str | Path, param: click.Parameter | None, ctx: click.Context | None) -> Path:
        from pathlib import Path

        return Path(value)


PATH = _Path()
PROCESSORS = os.cpu_count() or 1


def date_given(_: click.Context, __: click.Parameter, value: str | None) -> date | None:
    if value is None:
        return None
    try:
        return date.fromisoformat(value)
    except ValueError:
        raise click.BadParameter(f'"{value}" is not a date; write for instance 2026-12-01') from None


_OPTIONS: dict[str, list[Callable[[Callable[..., None]], Callable[..., None]]]] = {
    "content": [click.option(
        "--content", "folder", type=PATH, default="content", show_default=True,
        help="Folder of content files.",
    )],
    "json": [click.option("--json", "as_json", is_flag=True, help="Print JSON.")],
    "as_of": [click.option("--as-of", metavar="DATE", callback=date_given, help='The date to take for "today".')],
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


def shared(*names: str) -> Callable[[Callable[..., None]], Callable[..., None]]:
    """The options that several commands share, each written once."""

    def wrap(command: Callable[..., None]) -> Callable[..., None]:
        for name in reversed(names):
            for option in reversed(_OPTIONS[name]):
                command = option(command)
        return command

    return wrap


# --- content and policies -----------------------------------------------------------------------------


def content_at(folder: Path) -> Content:
    from moonwrit.building import content_of

    return content_of(folder)


def today_of(content: Content) -> date:
    from moonwrit.building import now, today

    return today(content, now())


def is_folder(folder: Path) -> bool:
    return (folder / "site.yaml").exists()


def content_if_there(folder: Path, policy: str | None) -> Content | None:
    """The content; a published policy can do without where the folder is not there."""
    from moonwrit.policy import published_names

    if policy is None or is_folder(folder):
        return content_at(folder)
    if policy not in published_names():
        raise RequestError(f'policy "{policy}" is not a published one, and {folder} is no content folder',
                           did_you_mean(policy, published_names()))
    return None


def method_of(content: Content | None, policy: str | None, places: tuple[str, ...]) -> Method:
    from moonwrit.policy import method

    if policy is None:
        assert content is not None
        policy = next(iter(content.site.calendars.values())).policy
    if len(places) > 1:
        raise click.UsageError("give one --place; a policy that wants several names them in the content")
    return method(policy, content, place_of(content, places[0]) if places else None)


def place_of(content: Content | None, text: str) -> NamedPlace:
    from moonwrit.policy import named_place
    from moonwrit.policy.evening import place_from_text

    if content is not None and text in content.places:
        return named_place(content, text)
    return place_from_text(text, content.places if content else ())


def on_record(content: Content | None, method: Method, as_of: date | None) -> dict[int, Decision]:
    """The decisions in force for a policy that one of the content's calendars follows; none for any other."""
    from moonwrit.record import in_force

    if content is None or method.name not in {calendar.policy for calendar in content.site.calendars.values()}:
        return {}
    from moonwrit.building import end_of

    return in_force(content.decisions, None if as_of is None else end_of(as_of, content))


def years_of(content: Content | None, first: int | None, last: int | None) -> tuple[int, int]:
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


# --- printing -------------------------------------------------------------------------------------------


def print_json(value: object) -> None:
    import json

    click.echo(json.dumps(value, ensure_ascii=False, indent=2))


def table(title: str, head: tuple[str, ...], rows: list[tuple[str, ...]]) -> None:
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
def counted(what: str) -> Iterator[Callable[[int, int], None]]:
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
def progress(what: str) -> Iterator[None]:
    """A spinner on standard error, where that is a terminal."""
    if not sys.stderr.isatty():
        yield
        return
    from rich.console import Console

    with Console(stderr=True).status(what):
        yield
