"""The content folder: its files read, checked one by one and against each other."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Collection, Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from types import MappingProxyType
from typing import Any, TypeVar

from pydantic import BaseModel, TypeAdapter

from moonwrit.content import yaml
from moonwrit.content.faults import checked, first_of, schema_of
from moonwrit.content.look import Look, read_logo, too_faint
from moonwrit.content.models import Identifier, Observance, Place, Region, Site
from moonwrit.content.outlines import Polygons, read_outline
from moonwrit.content.own import Own, dated, read_texts, theme_of
from moonwrit.content.policies import Policy
from moonwrit.content.record import Amendment, Decision, Report
from moonwrit.content.tables import Table, read_table
from moonwrit.content.yaml import Document, KeyPath
from moonwrit.errors import ContentError, did_you_mean

T = TypeVar("T")

SHAPES: Mapping[str, TypeAdapter[Any]] = MappingProxyType(
    {
        "site.yaml": TypeAdapter(Site),
        "places.yaml": TypeAdapter(dict[Identifier, Place]),
        "regions.yaml": TypeAdapter(dict[Identifier, Region]),
        "policies.yaml": TypeAdapter(dict[Identifier, Policy]),
        "observances.yaml": TypeAdapter(dict[Identifier, Observance]),
    }
)
"""The content files, and what each of them holds."""

RECORD: Mapping[str, TypeAdapter[Any]] = MappingProxyType(
    {
        "record/reports.yaml": TypeAdapter(list[Report]),
        "record/decisions.yaml": TypeAdapter(list[Decision]),
        "record/amendments.yaml": TypeAdapter(list[Amendment]),
    }
)
"""The files of the record, which a new community does not have yet."""

OPTIONAL: Mapping[str, TypeAdapter[Any]] = MappingProxyType({"look.yaml": TypeAdapter(Look)})
"""Content files that a community may do without."""

_ALL = {**SHAPES, **RECORD, **OPTIONAL}

# Keys that name something defined elsewhere, wherever they stand: what a single name means, and what each
# name in a list means. A new key of this kind needs a line here and nothing more.
_ONE = {
    "place": "place",
    "dawn_at": "place",
    "shares_night_with": "place",
    "region": "region",
    "any_of": "region",
    "every_of": "region",
    "of": "region",
    "of_area": "outlined region",
    "within": "outlined region",
    "policy": "policy",
    "published": "published policy",
    "criterion": "criterion",
}
_EACH = {
    "places": "place",
    "any_of": "place",
    "every_of": "place",
    "of": "place",
    "adopts": "policy",
}


@dataclass(frozen=True, slots=True)
class Content:
    """All that a community has written down, by name and in the order of its files.

    ``outlines`` are those of the regions that have one, ``tables`` those of the policies that are one.
    """

    folder: Path
    site: Site
    places: Mapping[str, Place]
    regions: Mapping[str, Region]
    policies: Mapping[str, Policy]
    observances: Mapping[str, Observance]
    reports: tuple[Report, ...]
    decisions: tuple[Decision, ...]
    amendments: tuple[Amendment, ...]
    outlines: Mapping[str, Polygons] = field(repr=False)
    tables: Mapping[str, Table] = field(repr=False)
    own: Own = field(repr=False)
    documents: Mapping[str, Document] = field(repr=False, compare=False)

    def line_of(self, file: str, *path: str | int) -> int:
        """The line, from 1, of the value at ``path`` in ``file`` ("places.yaml"), or of what is around it."""
        return self.documents[file].line_of(*path)

    def error(self, file: str, path: KeyPath, what: str, mend: str = "") -> ContentError:
        """An error that points at the value at ``path`` in ``file``; for checks that later layers make."""
        return self.documents[file].error(path, what, mend)


def load(
    folder: Path, published: Collection[str] | None = None, criteria: Collection[str] | None = None
) -> Content:
    """Read the content files of ``folder``.

    ``published`` are the names of policies that exist without being written down, ``criteria`` those of the
    published criteria; None leaves such names unchecked. Raises ContentError: the first fault in the order of
    files and lines, with the number of the others.
    """
    if not folder.is_dir():
        raise ContentError(folder, 0, "there is no such content folder", "name the folder that holds site.yaml")
    documents: dict[str, Document] = {}
    values: dict[str, Any] = {}
    faults: list[ContentError] = []
    for file, shape in _ALL.items():
        try:
            documents[file] = _read(folder, file)
        except ContentError as fault:
            faults.append(fault)
            continue
        value = checked(documents[file], shape, faults)
        if value is not None:
            values[file] = value
    outlines = _files_beside(documents, values, faults, "regions.yaml", "outline", read_outline)
    tables = _files_beside(documents, values, faults, "policies.yaml", "table", read_table)
    faults += _missing_names(documents, values, published, criteria)
    if "site.yaml" in values:
        faults += _missing_words(documents, values)
    own = _own(folder, documents, values, faults)
    if faults:
        order = {folder / file: place for place, file in enumerate(_ALL)}
        # Faults inside other files come last.
        raise first_of(sorted(faults, key=lambda fault: (order.get(Path(fault.file), len(order)), fault.line)))
    return Content(
        folder=folder,
        site=values["site.yaml"],
        places=MappingProxyType(values["places.yaml"]),
        regions=MappingProxyType(values["regions.yaml"]),
        policies=MappingProxyType(values["policies.yaml"]),
        observances=MappingProxyType(values["observances.yaml"]),
        reports=tuple(values["record/reports.yaml"]),
        decisions=tuple(values["record/decisions.yaml"]),
        amendments=tuple(values["record/amendments.yaml"]),
        outlines=MappingProxyType(outlines),
        tables=MappingProxyType(tables),
        own=own,
        documents=MappingProxyType(documents),
    )


def schemas() -> dict[str, dict[str, Any]]:
    """The JSON Schema (2020-12) of each content file, for editors; by file name."""
    return {file: {"title": file, **schema_of(shape)} for file, shape in _ALL.items()}


def _read(folder: Path, file: str) -> Document:
    path = folder / file
    if path.exists():
        return yaml.read(path, empty=_nothing(file))
    if (empty := _nothing(file)) is not None:
        return Document(path, empty, {(): 0})
    others = {other.name for other in folder.glob("*.y*ml")} - set(_ALL)
    near = difflib.get_close_matches(file, sorted(others), n=1)
    mend = f'rename "{near[0]}" to {file}' if near else "add it, with {} where it has nothing to say"
    raise ContentError(path, 0, "the file is missing", mend)


def _nothing(file: str) -> Any:
    """The value of a file that is not there or empty; None where it has to be written."""
    return [] if file in RECORD else {} if file in OPTIONAL else None


def _own(
    folder: Path, documents: Mapping[str, Document], values: Mapping[str, Any], faults: list[ContentError]
) -> Own:
    """The look, pages, notices and templates of the community; what is wrong with them goes to ``faults``."""
    look, logo = values.get("look.yaml", Look()), None
    if "look.yaml" in values:
        faults += too_faint(documents["look.yaml"], look.colours)
    if look.logo is not None:
        try:
            logo = read_logo(folder / look.logo.file)
        except ContentError as fault:
            faults.append(fault)
    theme = theme_of(folder, faults)
    if not {"site.yaml", "observances.yaml"} <= set(values):
        return Own(look, logo, theme=theme)
    pages, notices = (
        read_texts(folder / kind, values["site.yaml"], values["observances.yaml"], faults)
        for kind in ("pages", "notices")
    )
    return Own(look, logo, pages, dated(notices, folder / "notices", faults), theme)


def _missing_names(
    documents: Mapping[str, Document],
    values: Mapping[str, Any],
    published: Collection[str] | None,
    criteria: Collection[str] | None,
) -> Iterator[ContentError]:
    """Names that nothing defines. Files that have faults of their own are left out, on both sides."""
    policies = values.get("policies.yaml")
    known: dict[str, Collection[str] | None] = {
        "place": values.get("places.yaml"),
        "region": values.get("regions.yaml"),
        "outlined region": _outlined(values.get("regions.yaml")),
        "policy": None if policies is None or published is None else {*policies, *published},
        "published policy": published,
        "criterion": criteria,
    }
    for file in values:
        for path, kind, name in _references(documents[file].value):
            names = known[kind]
            if names is not None and name not in names:
                what, mend = f'{kind} "{name}" is not defined', did_you_mean(name, names)
                if kind == "outlined region" and name in values["regions.yaml"]:
                    what, mend = f'region "{name}" has no outline', "give it one in regions.yaml"
                yield documents[file].error(path, what, mend)


def _outlined(regions: Mapping[str, Region] | None) -> list[str] | None:
    return None if regions is None else [name for name, region in regions.items() if region.outline]


def _files_beside(
    documents: Mapping[str, Document],
    values: Mapping[str, Any],
    faults: list[ContentError],
    file: str,
    key: str,
    read: Callable[[Path], T],
) -> dict[str, T]:
    """The files that entries of ``file`` name under ``key``, read; what is wrong with them goes to ``faults``."""
    found = {}
    for name, value in values.get(file, {}).items():
        beside = getattr(value, key)
        if beside is None:
            continue
        if beside != Path(beside).name:
            what = f'the {key} "{beside}" lies outside the content folder'
            mend = f"keep it beside {file} and give its name alone"
            faults.append(documents[file].error((name, key), what, mend))
            continue
        try:
            found[name] = read(documents[file].file.parent / beside)
        except ContentError as fault:
            faults.append(fault)
    return found


def _references(value: Any, path: KeyPath = ()) -> Iterator[tuple[KeyPath, str, str]]:
    """``(path, kind, name)`` of all that is named below ``value``."""
    for key, below in _items(value):
        here = (*path, key)
        if key in _ONE and isinstance(below, str):
            yield here, _ONE[key], below
        elif key in _EACH and isinstance(below, list):
            yield from (((*here, i), _EACH[key], name) for i, name in enumerate(below))
        else:
            yield from _references(below, here)


def _items(value: Any) -> Iterable[tuple[Any, Any]]:
    if isinstance(value, dict):
        return value.items()
    return enumerate(value) if isinstance(value, list) else ()


def _missing_words(documents: Mapping[str, Document], values: Mapping[str, Any]) -> Iterator[ContentError]:
    """Texts in several languages that leave out the site's own, to which every page can fall back."""
    language = values["site.yaml"].language
    for file, value in values.items():
        for path, words in _words(value):
            if "" not in words and language not in words:
                what = f'{path[-1]} has no text in the site\'s language, "{language}"'
                yield documents[file].error(path, what, f"add {language}: ...")


def _words(value: Any, path: KeyPath = ()) -> Iterator[tuple[KeyPath, Mapping[str, str]]]:
    """Every text by language below ``value``: in the content, these are the mappings from text to text."""
    if isinstance(value, BaseModel):
        value = {info.alias or name: getattr(value, name) for name, info in type(value).model_fields.items()}
    elif isinstance(value, dict) and value and all(isinstance(text, str) for text in value.values()):
        yield path, value
    for key, below in _items(value):
        yield from _words(below, (*path, key))


__all__ = ["SHAPES", "Content", "load", "schemas"]
