"""A community's own templates: what they may do, and where they end."""

from __future__ import annotations

import shutil
import time
from collections.abc import Callable
from datetime import date
from pathlib import Path

import pytest
from page_values import ROOT

from demonstration import one_language
from moonwrit.building import assembled, content_of, held
from moonwrit.content.own import Own
from moonwrit.errors import ContentError
from moonwrit.publish.language import Language
from moonwrit.publish.render import Renderer
from moonwrit.publish.site import publish


def files_of(site: Path) -> dict[str, bytes]:
    return {path.relative_to(site).as_posix(): path.read_bytes() for path in site.rglob("*") if path.is_file()}


NEST = "{% for a in r %}{% for b in r %}{% for c in r %}{% endfor %}{% endfor %}{% endfor %}"
SECONDS = 20

REFUSED = {
    "class": "{{ ''.__class__.__mro__[1].__subclasses__() }}",
    "class as a key": "{{ ''['__class__']['__mro__'] }}",
    "class by filter": "{{ ''|attr('__class__') }}",
    "class by map": "{{ ['']|map(attribute='__class__')|first }}",
    "class by format": "{{ '{0.__class__.__init__.__globals__}'.format(site) }}",
    "class by format_map": "{{ '{a.__class__}'.format_map({'a': site}) }}",
    "globals of a method": "{{ site.__init__.__globals__ }}",
    "globals of a function": "{{ words.month_title.__globals__ }}",
    "globals of a filter": "{{ (x|default(cycler)).__init__.__globals__.os.popen('id').read() }}",
    "globals of lipsum": "{{ lipsum.__globals__['os'].system('id') }}",
    "the template itself": "{{ self._TemplateReference__context }}",
    "a code object": "{{ say.__code__ }}",
    "a module of a module": "{{ words.re.compile('x') }}",
    "a class of a module": "{{ words.Language('../../x').gettext('x') }}",
    "a class made": "{{ words.date.today() }}",
    "a file read": "{{ own.theme.read_text() }}",
    "a file written": "{{ (own.theme / '../harm').write_text('x') }}",
    "a file linked": "{{ own.theme.parent.joinpath('harm').symlink_to('/etc/passwd') }}",
    "a pickle": "{{ site.parse_raw('x', content_type='application/pickle', allow_pickle=true) }}",
    "a file parsed": "{{ site.parse_file('/etc/passwd') }}",
    "a value changed": "{% set x = site.calendars.clear() %}{{ x }}",
    "include above": "{% include '../../site.yaml' %}",
    "include from the root": "{% include '/etc/passwd' %}",
    "include of a list": "{% include ['../site.yaml', '../../../../../../etc/passwd'] %}",
    "include of the theme's": "{% include 'moonwrit/../../content/site.yaml' %}",
    "import": "{% import '../site.yaml' as x %}{{ x }}",
    "import from": "{% from '/etc/passwd' import root %}",
    "extends": "{% extends '../../../../../../etc/passwd' %}",
    "a huge range": "{% for a in range(10 ** 9) %}{% endfor %}",
    "a range of ranges": "{% for a in range(99999) %}{% for b in range(99999) %}{% endfor %}{% endfor %}",
    "a range used again": "{% set r = range(2000) %}" + NEST,
    "a text used again": "{% set r = 'x' * 9999 %}" + NEST,
    "a loop in itself": "{% for a in [1, 2] recursive %}{{ loop([1, 2]) }}{% endfor %}",
    "a macro without end": "{% macro m() %}{{ m() }}{% endmacro %}{{ m() }}",
    "a macro that doubles": "{% macro m(n) %}{% if n %}{{ m(n - 1) ~ m(n - 1) }}{% endif %}{% endmacro %}{{ m(60) }}",
    "itself": "{% include 'parts/it.html' %}",
    "a power": "{{ 9 ** (9 ** 9) }}",
    "a long text": "{{ 'x' * 10 ** 9 }}",
    "a long list": "{{ [0] * 10 ** 9 }}",
    "long figures": "{{ " + "9" * 5000 + " }}",
    "deep brackets": "{{ " + "(" * 50_000 + "1" + ")" * 50_000 + " }}",
    "deep blocks": "{% for a in [1] %}" * 300 + "{% endfor %}" * 300,
    "a comment without end": "{{ 1 }}{#% include",
    "a control": "{% \0 %}",
}


@pytest.fixture
def rendered(tmp_path: Path) -> Callable[[str], str]:
    """A template of one's own, rendered."""
    site = content_of(ROOT / "content").site

    def made(template: str) -> str:
        file = tmp_path / "theme/parts/it.html"
        file.parent.mkdir(parents=True, exist_ok=True)
        file.write_text(template, encoding="utf-8")
        return Renderer(site, Language("en"), Own(theme=tmp_path / "theme")).text("parts/it.html", {}).decode()

    return made


@pytest.mark.parametrize("case", REFUSED)
def test_a_template_does_nothing_but_write_its_page(
    rendered: Callable[[str], str], tmp_path: Path, case: str
) -> None:
    """Expected: one line with the file, the line and how to mend it, within seconds; nothing read, run or written.
    The limit: loops and calls are counted, files are bounded; memory is not."""
    before, began = sorted(tmp_path.parent.rglob("*")), time.process_time()
    with pytest.raises(ContentError) as caught:
        rendered(REFUSED[case])
    said = str(caught.value)
    assert said.startswith(f"{tmp_path}/theme/parts/it.html:1: the template fails (")
    assert said.endswith("; mend it, or remove the file to have the theme's own")
    assert len(said) < 500
    assert "root:" not in said
    assert time.process_time() - began < SECONDS
    new = set(tmp_path.parent.rglob("*")) - set(before)
    assert new <= {tmp_path / "theme", tmp_path / "theme/parts", tmp_path / "theme/parts/it.html"}


@pytest.mark.parametrize(("template", "text"), [
    ("{{ 'a'.upper() }}{{ '{:>3}'.format(7) }}{{ [1, 2]|map('string')|join('-') }}", "A  71-2"),
    ("{% set n = namespace(x=1) %}{% for a in 'abc' %}{% set n.x = n.x * 2 %}{% endfor %}{{ n.x }}", "8"),
    ("{% for a in [1, 2] %}{{ loop.cycle('a', 'b') }}{{ loop.length }}{{ loop.last }}{% endfor %}", "a2Falseb2True"),
    ("{% macro m(x) %}<{{ x }}>{{ caller() }}{% endmacro %}{% call m('<') %}!{% endcall %}", "<&lt;>!"),
    ("{{ _('settled') }} {{ site.address }}", "settled https://calendar.three-harbours.example/"),
    ("{{ say(site.community) }} {{ labels.OUTCOMES|length > 1 }}", "Three Harbours Council True"),
    ("{{ dict(a=1).get('a') }}{{ range(3)|list }}{{ own.look.colours.given().keys()|list }}", "1[0, 1, 2]"),
    ("<script>alert(1)</script>", "<script>alert(1)</script>"),
])
def test_what_a_page_needs_is_there(rendered: Callable[[str], str], template: str, text: str) -> None:
    """Expected: values, their methods, macros and loops work; markup, script too, is the template's to write."""
    assert rendered(template).startswith(text)


def test_the_sandbox_takes_nothing_from_the_theme(tmp_path: Path) -> None:
    """Expected: the theme as a theme of one's own makes the same bytes."""
    content, today = tmp_path / "content", date(2026, 12, 1)
    shutil.copytree(ROOT / "content", content)
    one_language(content)
    read = content_of(content)
    almanacs = assembled(read, today)
    ledger = held(read, content, almanacs, today)
    publish(almanacs, ledger, content.parent / "plain", own=read.own)
    shutil.copytree(ROOT / "themes/moonwrit", content / "theme", ignore=shutil.ignore_patterns("locale"))
    own = content_of(content).own
    assert own.theme == content / "theme"
    publish(almanacs, ledger, content.parent / "own", own=own)
    assert files_of(content.parent / "own") == files_of(content.parent / "plain")
