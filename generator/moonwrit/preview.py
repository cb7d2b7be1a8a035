"""The preview: the site of a content folder on loopback, built again whenever the content or the theme changes.

Nothing is written to the journal or to the output folder; the site lives in a temporary folder.
"""

from __future__ import annotations

import http.server
import tempfile
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from datetime import date
from functools import partial
from http import HTTPStatus
from pathlib import Path
from urllib.parse import urlsplit

from moonwrit.building import assembled, content_of, held, now
from moonwrit.errors import MoonwritError, RequestError
from moonwrit.journal import SilentChangeError, hold_against
from moonwrit.resources import themes_folder

HOST = "127.0.0.1"


class _Handler(http.server.SimpleHTTPRequestHandler):
    """Files of the site and nothing else, to this machine and no page of another name (DNS rebinding)."""

    extensions_map = {  # noqa: RUF012
        **http.server.SimpleHTTPRequestHandler.extensions_map,
        ".ics": "text/calendar; charset=utf-8", ".atom": "application/atom+xml", ".json": "application/json",
        ".js": "text/javascript", ".html": "text/html; charset=utf-8", ".css": "text/css; charset=utf-8",
    }

    def send_head(self):  # type: ignore[no-untyped-def]
        if urlsplit(f"//{self.headers.get('Host', '')}").hostname not in (HOST, "localhost"):
            self.send_error(HTTPStatus.FORBIDDEN, "This preview answers to 127.0.0.1 and localhost only")
            return None
        wanted = Path(self.translate_path(self.path)).resolve()
        if not wanted.is_relative_to(Path(self.directory).resolve()):
            self.send_error(HTTPStatus.NOT_FOUND)
            return None
        return super().send_head()

    def end_headers(self) -> None:
        self.send_header("Cache-Control", "no-store")
        super().end_headers()

    def list_directory(self, path):  # type: ignore[no-untyped-def]
        self.send_error(HTTPStatus.NOT_FOUND)

    def log_message(self, format: str, *args: object) -> None:
        pass


def build(folder: Path, output: Path, as_of: date | None) -> list[str]:
    """Build the site for looking at; what ``publish`` would object to is returned. Raises MoonwritError."""
    from moonwrit.publish.site import publish as put

    said = []
    content = content_of(folder)
    almanacs = assembled(content, as_of)
    try:
        ledger = held(content, folder, almanacs, as_of)
    except SilentChangeError as fault:
        said.append(f"publish would stop: {fault}")
        ledger = hold_against((), almanacs, (), now())
    put(almanacs, replace(ledger, added=()), output, own=content.own)
    return said


def serve(
    folder: Path, port: int, as_of: date | None, say: Callable[[str], None], stop: threading.Event | None = None
) -> None:
    """Serve and rebuild until ``stop`` is set or the user interrupts. Raises RequestError where the port is taken."""
    from watchfiles import watch

    from moonwrit.publish.pieces import forget

    with tempfile.TemporaryDirectory(prefix="moonwrit-") as made:
        output = Path(made) / "site"
        try:
            _try(folder, output, as_of, say)
            with _server(output, port) as server:
                say(f"http://{HOST}:{server.server_address[1]}/ shows {folder}; it is built again when a file changes")
                for _ in watch(folder, themes_folder(), stop_event=stop, raise_interrupt=False):
                    _try(folder, output, as_of, say)
        finally:
            forget(output)


@contextmanager
def _server(output: Path, port: int) -> Iterator[http.server.ThreadingHTTPServer]:
    try:
        server = http.server.ThreadingHTTPServer((HOST, port), partial(_Handler, directory=str(output)))
    except OSError as fault:
        raise RequestError(f"port {port} cannot be used ({fault.strerror})", "name another with --port") from None
    threading.Thread(target=server.serve_forever, daemon=True).start()
    try:
        yield server
    finally:
        server.shutdown()
        server.server_close()


def _try(folder: Path, output: Path, as_of: date | None, say: Callable[[str], None]) -> None:
    """A fault of the content is said, and the last good site stays."""
    try:
        said = build(folder, output, as_of)
    except MoonwritError as fault:
        say(f"moonwrit: {fault}")
    else:
        for each in said:
            say(f"moonwrit: {each}")
        say("built")


__all__ = ["build", "serve"]
