"""``survey``: long-run studies of policies."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from moonwrit.cli.options import (
    PATH,
    PROCESSORS,
    content_at,
    content_if_there,
    counted,
    is_folder,
    place_of,
    progress,
    shared,
    years_of,
)

if TYPE_CHECKING:
    from pathlib import Path

    from moonwrit.content import Content


@click.command()
@shared("content")
@click.option("--policy", "policies", multiple=True, metavar="P",
              help="A policy of the content, or a published one; may be repeated. Default: all of the content.")
@shared("place")
@click.option("--grid", metavar="DEGREES", type=click.FloatRange(0.05, 60),
              help="Instead of places, a grid of this step between 60 S and 60 N.")
@shared("years")
@click.option("--ephemeris", default="", metavar="FILE",
              help="A JPL kernel in place of DE421 (1899-2053), or long-range: DE440 (1550-2650), an extra.")
@click.option("--output", type=PATH, default="survey", show_default=True,
              help="Folder of the units and results; what is finished there is not done again.")
@click.option("--workers", type=click.IntRange(1, 256), default=PROCESSORS, metavar="N",
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
    if is_folder(folder) or not (places or grid):
        content: Content | None = content_at(folder)
    else:
        content = [content_if_there(folder, policy) for policy in policies or (None,)][-1]
    years = years_of(content, first, last)
    from moonwrit.survey import parquet
    from moonwrit.survey.page import page
    from moonwrit.survey.plan import plan
    from moonwrit.survey.results import gather
    from moonwrit.survey.running import run, write

    if as_parquet:
        parquet.library()
    with progress("Looking at what is asked"):
        asked = plan(policies, [place_of(content, text) for text in places], grid, *years, ephemeris,
                     None if content is None else folder.resolve())
    with counted("Units") as each:
        done = run(asked, output, workers, scheduler, each)
    with counted("Parts gathered") as each:
        results = gather(asked, output, workers, each)
    if as_parquet:
        with progress("Writing Parquet"):
            parquet.write_parquet(output)
    write(output / "survey.html", page(results))
    click.echo(f"{done} units computed, {asked.unit_count - done} were there; results in {output / 'survey.html'}")
    if results.seams:
        click.echo(f"{results.seams} joints of two runs of years do not meet (unsettled_seams): do not count on month "
                   "lengths there", err=True)
