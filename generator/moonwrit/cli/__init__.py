"""The command ``moonwrit``: reads the words, asks the packages, prints. Slow imports wait for their command."""

from __future__ import annotations

from typing import Any

import click

from moonwrit import __version__
from moonwrit.cli.asking import differ, evening, months, why
from moonwrit.cli.building import begin, check, preview, publish
from moonwrit.cli.recording import record
from moonwrit.cli.surveying import survey
from moonwrit.errors import MoonwritError


class _Commands(click.Group):
    """A group in which every error that a user can mend is one message and its own exit code."""

    def invoke(self, ctx: click.Context) -> Any:
        try:
            return super().invoke(ctx)
        except MoonwritError as fault:
            click.echo(f"moonwrit: {fault}", err=True)
            ctx.exit(fault.exit_code)


@click.group(cls=_Commands, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="moonwrit")
def main() -> None:
    """Publish a community's lunar (Hijri) calendar: every date with its basis, as pages and as feeds."""


for _command in (publish, preview, check, months, evening, why, differ, survey, record, begin):
    main.add_command(_command)

__all__ = ["main"]
