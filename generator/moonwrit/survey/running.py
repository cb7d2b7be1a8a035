"""The units of a survey carried out: here or on a cluster, each kept as a file as soon as it is finished."""

from __future__ import annotations

import json
import os
from collections import deque
from collections.abc import Callable, Generator, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from concurrent.futures.process import BrokenProcessPool
from contextlib import closing, contextmanager
from functools import partial
from itertools import islice
from multiprocessing import get_context
from pathlib import Path
from typing import TypeVar

from moonwrit.cluster import connected
from moonwrit.errors import RequestError
from moonwrit.files import json_bytes
from moonwrit.survey.plan import Plan, Unit
from moonwrit.survey.unit import computed

PLAN = "plan.json"
_AHEAD = 4
"""Pieces handed out at a time for each worker: enough that none waits, few enough to hold in memory."""

Finished = Generator[tuple[Unit, bytes], None, None]

_Asked = TypeVar("_Asked")
_Told = TypeVar("_Told")


def run(
    plan: Plan, output: Path, workers: int = 1, scheduler: str | None = None,
    each: Callable[[int, int], None] = lambda done, of: None,
) -> int:
    """Carry out what is not in the folder ``output`` yet; how many units that was.

    ``each`` is told how many units are done, of how many. However this ends, a finished unit is kept, and the next run
    goes on from there. Raises RequestError where the folder holds something else, or a worker ends without an answer.
    """
    begin(plan, output)
    todo = [unit for unit in plan.units() if not (output / unit.file).exists()]
    count = plan.unit_count
    each(count - len(todo), count)
    finished = _here(plan, todo, workers) if scheduler is None else _on_cluster(plan, todo, scheduler)
    with closing(finished):
        for done, (unit, data) in enumerate(finished, count - len(todo) + 1):
            write(output / unit.file, data)
            each(done, count)
    return len(todo)


def begin(plan: Plan, output: Path) -> None:
    """Make the folder this survey's, or find that it is. Raises RequestError where it is not."""
    mine, kept = plan.as_json(), output / PLAN
    if kept.exists():
        try:
            theirs = json.loads(kept.read_bytes())
        except ValueError:
            theirs = {}
        changed = [key for key in mine if theirs.get(key) != mine[key]]
        if changed:
            raise RequestError(f"{output} holds another survey (other {', '.join(changed)})",
                               "name another folder with --output, or ask the same to carry it on")
    elif output.exists() and (not output.is_dir() or any(output.iterdir())):
        raise RequestError(f"{output} is there and holds no survey", "name an empty or a new folder with --output")
    else:
        write(kept, json_bytes(mine))


def write(path: Path, data: bytes) -> None:
    """The file whole or not at all: written aside, then renamed."""
    aside = path.with_name(f".{path.name}.{os.getpid()}")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        aside.write_bytes(data)
        os.replace(aside, path)
    except OSError as fault:
        raise RequestError(f"{path} cannot be written ({fault.strerror or fault})",
                           "free space, or name another folder with --output; what is finished is kept") from None


def _here(plan: Plan, todo: list[Unit], workers: int) -> Finished:
    """In this process, or in several of this machine."""
    if workers == 1 or len(todo) < 2:
        for unit in todo:
            yield unit, computed(plan, unit)
        return
    waiting = iter(todo)
    with _processes(workers) as pool:
        under_way: dict[Future[bytes], Unit] = {}
        while True:
            for unit in islice(waiting, workers * _AHEAD - len(under_way)):
                under_way[pool.submit(computed, plan, unit)] = unit
            if not under_way:
                return
            for future in wait(under_way, return_when=FIRST_COMPLETED).done:
                yield under_way.pop(future), future.result()


def in_order(job: Callable[[_Asked], _Told], todo: Sequence[_Asked], workers: int) -> Generator[_Told, None, None]:
    """What the job says of each, one after the other, worked out here or in several processes of this machine."""
    if workers == 1 or len(todo) < 2:
        yield from map(job, todo)
        return
    with _processes(workers) as pool:
        under_way: deque[Future[_Told]] = deque()
        for asked in todo:
            under_way.append(pool.submit(job, asked))
            if len(under_way) == workers * _AHEAD:
                yield under_way.popleft().result()
        while under_way:
            yield under_way.popleft().result()


@contextmanager
def _processes(workers: int) -> Iterator[ProcessPoolExecutor]:
    """What nobody has begun is let go at the end."""
    pool = ProcessPoolExecutor(workers, mp_context=get_context("spawn"))
    try:
        yield pool
    except BrokenProcessPool:
        raise RequestError("a worker ended without an answer", "run again: what is finished is kept") from None
    finally:
        pool.shutdown(cancel_futures=True)


def _on_cluster(plan: Plan, todo: list[Unit], scheduler: str) -> Finished:
    """On the Dask cluster at the address. What a lost worker had under way is given to another."""
    client = connected(scheduler)
    from distributed import KilledWorker, as_completed

    job = partial(computed, plan)
    waiting = iter(todo)
    with client:
        def more(under_way: int) -> list[Future[bytes]]:
            threads = max(1, sum(client.nthreads().values()))
            units = islice(waiting, max(1, threads * _AHEAD - under_way))
            return [client.submit(_labelled, job, unit, pure=False) for unit in units]

        finished = as_completed(more(0))
        try:
            for future in finished:
                yield future.result()
                future.release()
                for added in more(finished.count()):
                    finished.add(added)
        except KilledWorker as fault:
            raise RequestError(f"one unit ended several workers ({fault})",
                               "give them more memory, and run again: what is finished is kept") from None


def _labelled(job: Callable[[Unit], bytes], unit: Unit) -> tuple[Unit, bytes]:
    return unit, job(unit)
