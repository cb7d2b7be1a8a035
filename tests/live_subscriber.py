"""A subscriber that this project did not write: vdirsyncer fetches feeds over HTTP, khal reads what it fetched."""

from __future__ import annotations

import functools
import http.server
import os
import subprocess
import threading
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path


class _Quiet(http.server.SimpleHTTPRequestHandler):
    def log_message(self, format: str, *args: object) -> None:
        pass


@dataclass(frozen=True)
class Subscriber:
    """Set up once for some feeds, each a calendar of its own; vdirsyncer puts hashes in place of their UIDs."""

    home: Path
    feeds: Sequence[str]

    def look(self, feed: str, since: str = "2026-06-01", days: int = 400) -> list[tuple[str, str]]:
        """Fetch all, and give what one calendar then shows: titles and beginnings, in order."""
        self.run("vdirsyncer", "-c", str(self.home / "vdirsyncer.conf"), "sync", "--force-delete")
        listed = self.run(
            "khal", "-c", str(self.home / "khal.conf"), "list", "-a", _name(feed), "--once", "--notstarted",
            "--day-format", "", "--format", "{start-long}|{title}", since, f"{days}d",
        )
        lines = [line.partition("|") for line in listed.splitlines() if line]
        return [(title.strip(), start) for start, _, title in lines]

    def run(self, *command: str) -> str:
        done = subprocess.run(
            command, env={**os.environ, "HOME": str(self.home), "XDG_DATA_HOME": str(self.home), "LC_ALL": "C.UTF-8"},
            capture_output=True, encoding="utf-8", timeout=120,
        )
        assert done.returncode == 0, f"{command[0]}: {done.stdout}\n{done.stderr}"
        return done.stdout


def _name(feed: str) -> str:
    return feed.removesuffix(".ics").replace("/", "_")


@contextmanager
def subscribed(site: Path, home: Path, feeds: Sequence[str]) -> Iterator[Subscriber]:
    """Serve a built site on loopback, and subscribe to feeds of it (paths below ``feeds/``)."""
    handler = functools.partial(_Quiet, directory=str(site))
    server = http.server.ThreadingHTTPServer(("127.0.0.1", 0), handler)
    threading.Thread(target=server.serve_forever, daemon=True).start()
    at = f"http://127.0.0.1:{server.server_address[1]}/feeds/"
    pairs, calendars = "", ""
    for feed in feeds:
        name = _name(feed)
        (home / name).mkdir(parents=True)
        pairs += (
            f'[pair {name}]\na = "{name}_site"\nb = "{name}_phone"\ncollections = null\n'
            f'conflict_resolution = "a wins"\n[storage {name}_site]\ntype = "http"\nurl = "{at}{feed}"\n'
            f'[storage {name}_phone]\ntype = "filesystem"\npath = "{home}/{name}/"\nfileext = ".ics"\n'
        )
        calendars += f"[[{name}]]\npath = {home}/{name}\nreadonly = True\n"
    (home / "vdirsyncer.conf").write_text(f'[general]\nstatus_path = "{home}/status/"\n{pairs}', encoding="utf-8")
    (home / "khal.conf").write_text(
        f"[calendars]\n{calendars}"
        "[locale]\nlocal_timezone = Australia/Melbourne\ndefault_timezone = Australia/Melbourne\n"
        "timeformat = %H:%M\ndateformat = %Y-%m-%d\nlongdateformat = %Y-%m-%d\n"
        "datetimeformat = %Y-%m-%d %H:%M\nlongdatetimeformat = %Y-%m-%d %H:%M\n"
        f"[sqlite]\npath = {home}/khal.db\n",
        encoding="utf-8",
    )
    subscriber = Subscriber(home, feeds)
    subscriber.run("vdirsyncer", "-c", str(home / "vdirsyncer.conf"), "discover")
    try:
        yield subscriber
    finally:
        server.shutdown()
        server.server_close()
