"""The preview: on loopback only, rebuilt on every change, and nothing published by it."""

from __future__ import annotations

import shutil
import socket
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from http.client import HTTPConnection
from pathlib import Path

import pytest

from demonstration import one_language
from moonwrit.errors import RequestError
from moonwrit.preview import serve

ROOT = Path(__file__).resolve().parent.parent


@dataclass
class Previewed:
    content: Path
    said: list[str] = field(default_factory=list)

    def wait(self, wanted: Callable[[str], bool], since: int = 0) -> str:
        """The first thing said after ``since`` others that is ``wanted``."""
        end = time.monotonic() + 60
        while time.monotonic() < end:
            for text in self.said[since:]:
                if wanted(text):
                    return text
            time.sleep(0.05)
        raise AssertionError(f"not said: {self.said}")

    @property
    def port(self) -> int:
        return int(self.wait(lambda text: text.startswith("http://")).split("/")[2].rpartition(":")[2])

    def get(self, path: str, host: str | None = None) -> tuple[int, bytes, str]:
        connection = HTTPConnection("127.0.0.1", self.port, timeout=30)
        connection.putrequest("GET", path, skip_host=host is not None)
        if host is not None:
            connection.putheader("Host", host)
        connection.endheaders()
        answer = connection.getresponse()
        return answer.status, answer.read(), answer.headers.get("Content-Type", "")


@pytest.fixture(scope="module")
def previewed(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Previewed]:
    content = tmp_path_factory.mktemp("previewed") / "content"
    shutil.copytree(ROOT / "content", content)
    one_language(content)
    site = (content / "site.yaml").read_text(encoding="utf-8")
    site = site.replace("{from: 1447, to: 1449}", "{from: 1448, to: 1448}")
    (content / "site.yaml").write_text(site, encoding="utf-8")
    shutil.rmtree(content / "record")
    (content.parent / "secret.txt").write_text("secret", encoding="utf-8")
    made = Previewed(content)
    stop = threading.Event()
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("MOONWRIT_CACHE", str(content.parent / "cache"))
        thread = threading.Thread(target=serve, args=(content, 0, None, made.said.append, stop), daemon=True)
        thread.start()
        yield made
        stop.set()
        thread.join(30)
    assert not thread.is_alive()
    assert list((content.parent / "cache/sites").iterdir()) == [], "nothing is kept of the folder that went"


def test_the_site_is_served_with_its_types(previewed: Previewed) -> None:
    status, body, kind = previewed.get("/")
    assert (status, kind) == (200, "text/html; charset=utf-8")
    assert b"Three Harbours" in body
    assert previewed.get("/feeds/observances.ics")[2] == "text/calendar; charset=utf-8"


@pytest.mark.parametrize(
    "path", ["/../secret.txt", "/%2e%2e/secret.txt", "/..%2fsecret.txt", "//etc/passwd", "/feeds/", "/....//secret.txt"]
)
def test_path_tricks_and_folders_without_a_page_lead_nowhere(previewed: Previewed, path: str) -> None:
    status, body, _ = previewed.get(path)
    assert status == 404
    assert b"secret" not in body
    assert b"root:" not in body


def test_another_name_for_this_machine_is_refused(previewed: Previewed) -> None:
    """A page of another site cannot reach the preview by a name of its own that leads here."""
    assert previewed.get("/", host="evil.example")[0] == 403
    assert previewed.get("/", host=f"localhost:{previewed.port}")[0] == 200


def test_it_listens_on_loopback_only(previewed: Previewed) -> None:
    here = {info[4][0] for info in socket.getaddrinfo(socket.gethostname(), None, socket.AF_INET)} - {"127.0.0.1"}
    for address in here:
        with socket.socket() as tried:
            tried.settimeout(2)
            if str(address).startswith("127."):
                continue
            assert tried.connect_ex((str(address), previewed.port)) != 0


def test_a_change_is_shown_and_a_fault_is_said_while_the_site_stays(previewed: Previewed) -> None:
    site = previewed.content / "site.yaml"
    text = site.read_text(encoding="utf-8")
    since = len(previewed.said)
    site.write_text(text.replace("community: Three", "community: Four"), encoding="utf-8")
    previewed.wait(lambda said: said == "built", since)
    assert b"Four Harbours" in previewed.get("/")[1]
    since = len(previewed.said)
    site.write_text(text + "\nnonsense: 1\n", encoding="utf-8")
    assert "site.yaml" in previewed.wait(lambda said: said.startswith("moonwrit:"), since)
    assert b"Four Harbours" in previewed.get("/")[1]
    assert not (previewed.content / "record").exists(), "a preview publishes nothing"


def test_a_port_that_is_taken_is_one_message(previewed: Previewed) -> None:
    with pytest.raises(RequestError, match="cannot be used"):
        serve(previewed.content, previewed.port, None, lambda _: None)
