"""Message catalogues by a translator who means harm, or broken ones: text stays text, and what is broken is refused."""

from __future__ import annotations

import json
import re
import time
from collections.abc import Callable, Iterator
from html.parser import HTMLParser
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest
from babel.messages.catalog import Catalog
from babel.messages.pofile import read_po, write_po

from blotted import shape
from demonstration import desk_of_one_year
from moonwrit.errors import ContentError
from moonwrit.publish import catalogue

HARM = (
    "</script></title></style><script>alert(1)</script>\"'><img src=x onerror=alert(1)><!-- ]]> --> &lt;b&gt; "
    "{{ 7*191 }} {# #} ${7*191} {0} `id` $(id) =cmd|' /C calc'!A0 ../../../etc/passwd "
    "C:\\n\\N\\ \\, \\; javascript:alert(1) END:VEVENT SUMMARY;X=\"y\":injected \",\"injected\":[{\"a\":1}]//*/"
)
TAME = re.sub(r"\W", "x", HARM)


def translated(folder: Path, said: str) -> None:
    """A catalogue of German in which every text is followed by what is ``said``."""
    out = Catalog("de", charset="utf-8", fuzzy=False)
    with (catalogue.folder() / "messages.pot").open("rb") as file:
        for message in read_po(file):
            if message.id:
                forms = [f"{text}{said}" for text in ([message.id] if isinstance(message.id, str) else message.id)]
                out.add(message.id, forms[0] if isinstance(message.id, str) else forms)
    folder.mkdir()
    with (folder / "de.po").open("wb") as made:
        write_po(made, out, width=0)
    (folder / "messages.pot").write_bytes((catalogue.folder() / "messages.pot").read_bytes())


@pytest.fixture(scope="module")
def sites(tmp_path_factory: pytest.TempPathFactory) -> Iterator[dict[str, dict[str, bytes]]]:
    """A site in English and German with a plain catalogue, and with one that means harm."""
    built = {}
    for name, said in (("tame", TAME), ("harm", HARM)):
        folder = tmp_path_factory.mktemp(name)
        translated(folder / "locale", said)
        desk = desk_of_one_year(folder)
        desk.change("site.yaml", "# one language", "languages: [de]")
        with pytest.MonkeyPatch.context() as patched:
            patched.setattr(catalogue, "folder", lambda at=folder: at / "locale")
            catalogue.translations.cache_clear()
            desk.publish("2026-12-01T09:00:00+11:00")
        found = (path for path in desk.output.rglob("*") if path.is_file())
        built[name] = {path.relative_to(desk.output).as_posix(): path.read_bytes() for path in found}
    yield built
    catalogue.translations.cache_clear()


class Tags(HTMLParser):
    """Tags with the names of their attributes, and the values of those that lead somewhere or do something."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.found: list[object] = []
        self.feed(page)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        telling = ("href", "src", "action", "style", "id", "class", "rel", "type")
        self.found.append((tag, [(name, value if name in telling else "") for name, value in attrs]))

    def handle_endtag(self, tag: str) -> None:
        self.found.append(tag)

    def handle_comment(self, data: str) -> None:
        self.found.append("<!--")


READ: dict[str, Callable[[str], object]] = {
    ".html": lambda text: Tags(text).found,
    ".ics": lambda text: [re.split("[:;]", line, maxsplit=1)[0] for line in text.replace("\r\n ", "").split("\r\n")],
    ".json": lambda text: shape(json.loads(text)),
    ".atom": lambda text: [(one.tag, sorted(one.attrib)) for one in ET.fromstring(text).iter()],
    ".js": lambda text: re.subn("const data = .*;", "", text),
    ".txt": lambda text: text.count("\n"),
}


@pytest.mark.parametrize("ending", READ)
def test_what_a_translation_says_stays_text(sites: dict[str, dict[str, bytes]], ending: str) -> None:
    """Expected: the same files, tags, properties of feeds, keys and lines as with a plain catalogue."""
    tame, harm = sites["tame"], sites["harm"]
    assert tame.keys() == harm.keys()
    paths = [path for path in tame if path.endswith(ending)]
    differing = [path for path in paths if tame[path] != harm[path]]
    assert differing
    for path in differing:
        assert READ[ending](tame[path].decode()) == READ[ending](harm[path].decode()), path


HEAD = ('msgid ""\nmsgstr ""\n"Content-Type: text/plain; charset=utf-8\\n"\n'
        '"Plural-Forms: nplurals=2; plural={};\\n"\n\n')
GOOD = HEAD.format("n>1")
TEXT = GOOD + 'msgid "a %(x)s"\nmsgstr "{}"\n'

REFUSED: dict[str, tuple[str | bytes, str]] = {
    "50 MB": (b"#" * 50 * 1024 * 1024, ": the catalogue is larger than 2 MB; shorten it"),
    "UTF-16": (GOOD.encode("utf-16"), ":1: a character is not UTF-8; save the file as UTF-8"),
    "Latin-1": (GOOD.encode() + 'msgid "é"\n'.encode("latin-1"), ":6: a character is not UTF-8"),
    "no catalogue": ("hello\n", ":1: this is no catalogue ("),
    "a quote alone": ('"\n', ":1: this is no catalogue ("),
    "code in the plural": (HEAD.format("__import__('os').system('id')"), ": this is no catalogue (invalid token"),
    "division by zero": (HEAD.format("1/(n-7)"), ": this is no catalogue (integer division or modulo by zero)"),
    "deep plural": (HEAD.format("(" * 5000 + "n" + ")" * 5000), ": this is no catalogue (plural form expre"),
    "no plural": (HEAD.format(""), ": this is no catalogue ("),
    "a form too many": (HEAD.format("n"), ": Plural-Forms names a form that there is not; "),
    "forms without end": (GOOD.replace("s=2", 's="\n"99999999'), ": this is no catalogue (more than 6 plural forms"),
    "forms below zero": (GOOD.replace("s=2", "s=-2"), ": Plural-Forms names a form that there is not"),
    "language of a path": (GOOD.replace('""\n"', '""\n"Language: ../../x\\n"\n"'), ": this is no catalogue ("),
    "another charset": (GOOD.replace("utf-8", "rot13"), ": this is no catalogue (its charset is rot13, not utf-8)"),
    "a charset in parts": (GOOD.replace("utf-8", 'ut"\n"f-7'), ": this is no catalogue (its charset is utf-7, "),
    "an unknown place": (TEXT.format("%(y)s"), ':6: the place "%(y)s" is not in the original; write'),
    "a number's place": (TEXT.format("%(x)d"), ':6: the place "%(x)d" is not in the original'),
    "a wide place": (TEXT.format("%(x)99999999s"), ':6: the place "%(x)9" is not in the original'),
    "a bare place": (TEXT.format("%s"), ':6: the place "%s" is not in the original'),
    "half a place": (TEXT.format("%(x"), ':6: the place "%(" is not in the original'),
    "a percent sign": (TEXT.format("5 %"), ':6: the place "%" is not in the original'),
    "a line": (TEXT.format("a\\nEND:VEVENT"), ":6: the translation has several lines; "),
    "CR": (TEXT.format("a\\rEND:VEVENT"), ":6: the character U+000D is written here; remove it"),
    "NUL": (TEXT.format("a\0b"), ":6: the character U+0000 is written here; remove it"),
    "override": (TEXT.format("a\u202eb"), ":6: the character U+202E is written here; remove it"),
    "an isolate left open": (TEXT.format("a\u2067b"), ":6: the writing is turned and not turned back; "),
}


@pytest.mark.parametrize("case", REFUSED)
def test_a_broken_catalogue_is_one_message(tmp_path: Path, case: str) -> None:
    """Expected: the file, the line where there is one, and how to mend it; within seconds."""
    data, said = REFUSED[case]
    file = tmp_path / "fr.po"
    file.write_bytes(data if isinstance(data, bytes) else data.encode())
    began = time.process_time()
    with pytest.raises(ContentError) as caught:
        catalogue.read(file)
    assert str(caught.value).startswith(f"{file}{said}")
    assert caught.value.mend
    assert time.process_time() - began < 5
