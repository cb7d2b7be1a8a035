"""``publish``, ``preview``, ``check`` and ``begin``: from a content folder to its site."""

from __future__ import annotations

from datetime import date
from typing import TYPE_CHECKING

import click

from moonwrit.cli.options import PATH, PROCESSORS, content_at, progress, shared
from moonwrit.errors import RequestError

if TYPE_CHECKING:
    from pathlib import Path

    from moonwrit.publish.sheets import Paper


@click.command()
@click.option("--content", "folders", type=PATH, multiple=True, default=["content"],
              show_default=True, help="Folder of content files; of several, each is built into its own name.")
@shared("as_of")
@click.option("--output", type=PATH, default="output", show_default=True,
              help="Folder of the built site, or of the sites.")
@click.option("--workers", type=click.IntRange(1, 256), default=PROCESSORS, metavar="N",
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
        files = build(
            folders[0], output, as_of, paper, progress, workers, lambda said: click.echo(f"note: {said}", err=True)
        )
        click.echo(f"{files} files in {output}")
        return
    worst = 0
    for outcome in publish_many(folders, output, as_of, paper, workers, scheduler):
        failed = outcome.exit_code != 0
        click.echo(f"{outcome.folder.name}: {outcome.said}", err=failed)
        worst = max(worst, outcome.exit_code)
    ctx.exit(worst)


@click.command()
@shared("content", "as_of")
@click.option("--port", type=click.IntRange(0, 65535), default=8000, show_default=True, help="Of this machine only.")
def preview(folder: Path, as_of: date | None, port: int) -> None:
    """Serve the site on this machine and build it again on every change; nothing is published."""
    from moonwrit.preview import serve

    content_at(folder)
    serve(folder, port, as_of, lambda text: click.echo(text, err=True))


@click.command()
@shared("content")
def check(folder: Path) -> None:
    """Check the content files; says nothing but a word where all is well."""
    content = content_at(folder)
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


@click.command()
@click.argument("folder", metavar="DIR", type=PATH)
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
