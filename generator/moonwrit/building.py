"""From a content folder to a published site, once or for many communities, and the moments that it hangs on."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass, replace
from datetime import UTC, date, datetime, timedelta
from functools import partial
from multiprocessing import get_context
from pathlib import Path
from typing import TYPE_CHECKING
from zoneinfo import ZoneInfo

from moonwrit.cluster import connected
from moonwrit.content import Content, load
from moonwrit.errors import MoonwritError, RequestError
from moonwrit.policy.names import CRITERIA, published_names

if TYPE_CHECKING:
    from moonwrit.almanac import Almanac
    from moonwrit.journal import Ledger
    from moonwrit.publish.sheets import Paper

Progress = Callable[[str], AbstractContextManager[None]]


def content_of(folder: Path) -> Content:
    """The content of a folder. Raises ContentError."""
    return load(folder, published_names(), CRITERIA)


def now() -> datetime:
    """The present moment; SOURCE_DATE_EPOCH instead of the clock where it is set. Raises RequestError."""
    epoch = os.environ.get("SOURCE_DATE_EPOCH")
    try:
        return datetime.fromtimestamp(int(epoch), UTC) if epoch else datetime.now(UTC)
    except (ValueError, OverflowError, OSError):
        raise RequestError(f'SOURCE_DATE_EPOCH is "{epoch}"', "give whole seconds since 1970") from None


def zone(content: Content) -> ZoneInfo:
    """The time zone of the community: that of its region's first place."""
    region = content.regions[next(iter(content.site.calendars.values())).region]
    return content.places[region.places[0]].zone


def today(content: Content, moment: datetime) -> date:
    return moment.astimezone(zone(content)).date()


def end_of(day: date, content: Content) -> datetime:
    """The last second of a civil date in the community."""
    return datetime(day.year, day.month, day.day, 23, 59, 59, tzinfo=zone(content))


def assembled(content: Content, as_of: date | None) -> tuple[Almanac, ...]:
    """The almanacs of the content; ``as_of``: as it was known on that day. Raises ContentError or RequestError."""
    from moonwrit.almanac import assemble

    if as_of is None:
        return assemble(content, today(content, now()))
    return assemble(content, as_of, end_of(as_of, content))


def held(content: Content, folder: Path, almanacs: Sequence[Almanac], as_of: date | None) -> Ledger:
    """What almanacs change of what a folder's journal says was published; ``as_of``: until that day.

    Raises ContentError for a damaged journal, SilentChangeError for a change without a reason.
    """
    from moonwrit import journal

    until = None if as_of is None else end_of(as_of, content)
    seen = [entry for entry in journal.read(folder) if until is None or entry.at <= until]
    return journal.hold_against(seen, almanacs, content.amendments, until or now())


def publish(
    folder: Path, output: Path, as_of: date | None, paper: Paper | None = None,
    progress: Progress = lambda _: nullcontext(), processes: int = 1, note: Callable[[str], None] = lambda _: None,
) -> int:
    """Build the site of a content folder, put it in place, and write down what was published; the number of files.

    ``paper``: with PDF sheets of that size. ``processes``: how many of this machine may make pages. ``note`` is told
    what the officer should know. A replay (``as_of``) leaves the record alone. Raises MoonwritError, and then nothing
    has changed.
    """
    from moonwrit import clocks, journal
    from moonwrit.publish.site import publish as put
    from moonwrit.publish.writing import MARKER

    content = content_of(folder)
    if as_of is None:
        journal.recover(folder, output / MARKER, content.site.address)
    with progress("Computing months and observances"):
        almanacs = assembled(content, as_of)
        ledger = held(content, folder, almanacs, as_of)
    if as_of is None and ledger.added:
        _refuse_earlier_than(max(entry.at for entry in ledger.history), now())
    with progress("Writing the site"):
        # A replay leaves nothing in the site for the journal to recover.
        told = ledger if as_of is None else replace(ledger, added=())
        files = put(almanacs, told, output, paper, content.own, processes)
    if as_of is None:
        journal.append(folder, ledger.added)
        then, now_told = clocks.read(folder), clocks.clocks(almanacs)
        for said in clocks.notes(then, now_told):
            note(said)
        clocks.keep(folder, then, now_told)
    return files


def _refuse_earlier_than(last: datetime, moment: datetime) -> None:
    """What is published now must not seem older than what was published before: its reasons would not count."""
    if moment < last - timedelta(days=1):
        raise RequestError(
            f"the clock says {moment.isoformat(timespec='seconds')}, and the journal was last written "
            f"{last.astimezone(UTC).isoformat()}", "set the clock, or SOURCE_DATE_EPOCH",
        )


@dataclass(frozen=True, slots=True)
class Outcome:
    """How the build of one of many folders ended: ``exit_code`` 0 with a count, or another with a message."""

    folder: Path
    said: str
    exit_code: int


def publish_many(
    folders: Sequence[Path], output: Path, as_of: date | None, paper: Paper | None, workers: int,
    scheduler: str | None = None,
) -> Iterable[Outcome]:
    """Build each folder into ``output/<its name>``, side by side; one that fails does not stop the others.

    In processes of this machine, or on the Dask cluster at ``scheduler``, whose workers see the same folders. Outcomes
    come in the order of the folders. Raises RequestError where two folders have one name.
    """
    names = [folder.resolve().name for folder in folders]
    if twice := {name for name in names if names.count(name) > 1}:
        raise RequestError(f'two content folders are called "{min(twice)}"', "rename one: each is built into its name")
    epoch = os.environ.get("SOURCE_DATE_EPOCH")
    job = partial(_outcome, output=output.resolve(), as_of=as_of, paper=paper, epoch=epoch)
    places = [folder.resolve() for folder in folders]
    if scheduler is None:
        with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
            yield from pool.map(job, places)
        return
    with connected(scheduler) as client:
        yield from client.gather(client.map(job, places, pure=False))


def _outcome(folder: Path, output: Path, as_of: date | None, paper: Paper | None, epoch: str | None) -> Outcome:
    if epoch is not None:
        os.environ["SOURCE_DATE_EPOCH"] = epoch
    try:
        notes: list[str] = []
        files = publish(folder, output / folder.name, as_of, paper, note=notes.append)
    except MoonwritError as fault:
        return Outcome(folder, str(fault), fault.exit_code)
    return Outcome(folder, "; ".join([f"{files} files in {output / folder.name}", *notes]), 0)


__all__ = ["Outcome", "assembled", "content_of", "end_of", "held", "now", "publish", "publish_many", "today", "zone"]
