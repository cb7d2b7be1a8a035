"""The look of a community's site: colours, checked for contrast, a logo, and words for the foot of every page."""

from __future__ import annotations

import re
import struct
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from types import MappingProxyType
from typing import Annotated
from xml.parsers import expat

from pydantic import Field

from moonwrit.content.models import Words, _Model
from moonwrit.content.yaml import Document
from moonwrit.errors import ContentError

ENOUGH = 4.5
"""Contrast of text with what is behind it: WCAG 2.2, success criterion 1.4.3, level AA."""
MAX_BYTES = 256 * 1024
MAX_PIXELS = 4096
HEIGHT, WIDTH = 40, 192
"""The room for a logo in the masthead, in CSS pixels."""

Colour = Annotated[
    str, Field(pattern=r"^#([0-9A-Fa-f]{3}|[0-9A-Fa-f]{6})$", description="a colour in quotes, such as '#14506e'")
]


class Colours(_Model):
    """What is not given stays as the theme has it."""

    paper: Colour | None = None
    sheet: Colour | None = None
    ink: Colour | None = None
    soft: Colour | None = None
    line: Colour | None = None
    link: Colour | None = None
    mark: Colour | None = None

    def given(self) -> dict[str, str]:
        return {name: value for name in Colours.model_fields if (value := getattr(self, name)) is not None}


class LightColours(Colours):
    """Colours of the light pages; ``dark`` those for readers who ask for dark ones."""

    dark: Annotated[Colours, Field(description="the same names again, for dark pages")] = Colours()


class LogoFile(_Model):
    """A picture beside the community's name."""

    file: Annotated[
        str, Field(pattern=r"^[A-Za-z0-9_-][A-Za-z0-9._-]*\.(svg|png)$",
                   description="the name of an SVG or PNG file beside look.yaml")
    ]
    alt: Annotated[Words, Field(description="what the logo shows, in words, for those who do not see it")]


class Look(_Model):
    """What is a community's own in how its site looks."""

    colours: Annotated[LightColours, Field(description="names of colours and their values")] = LightColours()
    logo: LogoFile | None = None
    footer: Words | None = None

    @property
    def has_colours(self) -> bool:
        return bool(self.colours.given() or self.colours.dark.given())


@dataclass(frozen=True, slots=True)
class Logo:
    """A logo that was read and checked; its size is in its own units."""

    path: str
    data: bytes
    width: float
    height: float

    @property
    def shown_height(self) -> int:
        """Pixels in the masthead: one size of every logo, less where it is long."""
        return max(1, min(HEIGHT, round(WIDTH * self.height / self.width)))

    @property
    def shown_width(self) -> int:
        return max(1, min(WIDTH, round(HEIGHT * self.width / self.height)))


# The theme's own, as in style.css; a test holds the two together.
LIGHT: Mapping[str, str] = MappingProxyType({
    "paper": "#fbf9f4", "sheet": "#f2eee4", "ink": "#1b222c", "soft": "#555e69", "line": "#d3ccbd", "link": "#14506e",
    "mark": "#8d3b1f",
})
DARK: Mapping[str, str] = MappingProxyType({
    "paper": "#12171d", "sheet": "#1b222a", "ink": "#e8e4da", "soft": "#a9b0b8", "line": "#39424d", "link": "#8cc7e6",
    "mark": "#f0a583",
})
_BEHIND = ("paper", "sheet")
_WRITTEN = ("ink", "soft", "link", "mark")


def contrast(one: str, other: str) -> float:
    """The contrast ratio of two colours, 1 to 21 (WCAG 2.2, definitions "contrast ratio" and "relative luminance")."""
    light, dark = sorted((_luminance(one), _luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def too_faint(document: Document, colours: LightColours) -> Iterator[ContentError]:
    """Pairs of text and what is behind it, one of which the community chose, that do not stand apart enough."""
    for path, given, theirs in (
        (("colours",), colours.given(), LIGHT), (("colours", "dark"), colours.dark.given(), DARK)
    ):
        all_of_them = {**theirs, **given}
        for name in _WRITTEN:
            for behind in _BEHIND:
                ratio = contrast(all_of_them[name], all_of_them[behind])
                chosen = next((one for one in (name, behind) if one in given), None)
                if ratio >= ENOUGH or chosen is None:
                    continue
                beside = _BEHIND if chosen == name else _WRITTEN
                passing = _nearest(all_of_them[chosen], [all_of_them[other] for other in beside])
                mend = (
                    f'{chosen} would pass as "{passing}"' if passing
                    else f"no {chosen} would pass: keep paper and sheet both light or both dark"
                )
                # Rounded down: a ratio that fails is not printed as one that passes.
                what = (f"{name} {all_of_them[name]} on {behind} {all_of_them[behind]} has a contrast of "
                        f"{int(ratio * 100) / 100:.2f}, and text needs {ENOUGH}")
                yield document.error((*path, chosen), what, mend)
                break


def _channels(colour: str) -> tuple[int, ...]:
    digits = colour[1:] if len(colour) == 7 else "".join(2 * digit for digit in colour[1:])
    return tuple(bytes.fromhex(digits))


def _luminance(colour: str) -> float:
    red, green, blue = (
        c / 12.92 if (c := value / 255) <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for value in _channels(colour)
    )
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def _nearest(colour: str, others: list[str]) -> str | None:
    """The colour nearest to ``colour`` on the way to black or to white that stands apart from all ``others``."""
    for share in range(257):
        for end in (0, 255):
            mixed = "#" + "".join(f"{round(c + (end - c) * share / 256):02x}" for c in _channels(colour))
            if all(contrast(mixed, other) >= ENOUGH for other in others):
                return mixed
    return None


# --- the logo -------------------------------------------------------------------------------------

_SVG = "http://www.w3.org/2000/svg"
_XLINK = "http://www.w3.org/1999/xlink"
# Shapes and what shapes are painted with; nothing that runs, moves, embeds or links.
_ELEMENTS = frozenset({
    "svg", "g", "path", "rect", "circle", "ellipse", "line", "polyline", "polygon", "text", "tspan", "title", "desc",
    "defs", "linearGradient", "radialGradient", "stop", "clipPath", "mask", "pattern", "symbol", "use",
})
_OUTSIDE = re.compile(r"""url\(\s*+(?!["']?#)|@import|\\|[a-z]+script:|data:""", re.IGNORECASE)
_REFERENCE = re.compile(r"""^#(.+)|url\(\s*["']?#([^)"']+)""", re.IGNORECASE)
SMALLEST, LARGEST = 0.01, 100_000
"""Sides of a logo, in its own units."""
MAX_DRAWN, MAX_NESTED = 50_000, 8
"""Elements that a logo has once those it refers to are put in; a few lines could else unfold into billions."""
_PLAIN = 'save it as "plain SVG", with shapes only'


def read_logo(file: Path) -> Logo:
    """Raises ContentError where the file is missing, too large, or holds what a picture does not need."""
    if not file.is_file():
        raise ContentError(file, 0, "the logo is missing", "put it beside look.yaml")
    if file.is_symlink():
        raise ContentError(file, 0, "the logo is a link to another file", "put the file itself there")
    with file.open("rb") as stream:
        data = stream.read(MAX_BYTES + 1)
    if len(data) > MAX_BYTES:
        raise ContentError(file, 0, f"the logo is larger than {MAX_BYTES // 1024} kB", "save it smaller")
    if file.suffix == ".png":
        return Logo("logo.png", data, *_png_size(file, data))
    return Logo("logo.svg", data, *_svg_size(file, data))


def _png_size(file: Path, data: bytes) -> tuple[int, int]:
    # PNG (W3C, third edition), 5.2 and 11.2.1: the signature, then the header with width and height.
    if not data.startswith(b"\x89PNG\r\n\x1a\n") or data[12:16] != b"IHDR" or len(data) < 24:
        raise ContentError(file, 0, "this is not a PNG picture", "save it as PNG")
    width, height = struct.unpack(">II", data[16:24])
    if not (0 < width <= MAX_PIXELS and 0 < height <= MAX_PIXELS):
        raise ContentError(file, 0, f"the logo has {width} by {height} pixels",
                           f"save it smaller: {MAX_PIXELS} by {MAX_PIXELS} at most")
    return width, height


def _svg_size(file: Path, data: bytes) -> tuple[float, float]:
    """The size in the picture's own units. Raises ContentError at the first thing that is not a shape."""
    sizes: list[tuple[float, float]] = []
    opened: list[str] = []
    elements: Counter[str] = Counter()
    references: dict[str, list[str]] = {}
    parser = expat.ParserCreate("utf-8", namespace_separator=" ")

    def refuse(what: str, mend: str = _PLAIN) -> None:
        raise ContentError(file, parser.CurrentLineNumber, what, mend)

    def element(name: str, attributes: dict[str, str]) -> None:
        space, _, local = name.rpartition(" ")
        if space != _SVG or local not in _ELEMENTS:
            refuse(f"the logo holds <{local}>, which is no shape")
        if not sizes and local != "svg":
            refuse("the logo does not begin with <svg>")
        for attribute, value in attributes.items():
            of, _, short = attribute.rpartition(" ")
            if of not in ("", _XLINK, "http://www.w3.org/XML/1998/namespace") or short.lower().startswith("on"):
                refuse(f"the logo has the attribute {short}, which is no part of a shape")
            if (short == "href" and not value.startswith("#")) or _OUTSIDE.search(value):
                refuse(f"{short} leads out of the logo")
        if not sizes:
            sizes.append(_view(attributes) or (0, 0))
            if not all(SMALLEST <= side <= LARGEST for side in sizes[0]):
                refuse("the logo does not say its size, or one that cannot be shown",
                       'give <svg> a viewBox such as viewBox="0 0 120 40"')
        opened.append(attributes.get("id", ""))
        found = [(one or other).strip() for value in attributes.values() for one, other in _REFERENCE.findall(value)]
        for name in {"", *opened}:  # "" is the whole
            elements[name] += 1
            references.setdefault(name, []).extend(found)

    @cache
    def drawn(name: str, nested: int = 0) -> int:
        if nested > MAX_NESTED:
            refuse(f"parts of the logo refer to one another more than {MAX_NESTED} deep")
        return elements[name] + sum(drawn(other, nested + 1) for other in references.get(name, ()))

    parser.StartElementHandler = element
    parser.EndElementHandler = lambda _: opened.pop()
    parser.StartDoctypeDeclHandler = lambda *_: refuse("the logo has a DOCTYPE")
    parser.XmlDeclHandler = lambda _, encoding, __: (
        refuse(f"the logo is in {encoding}", "save it in UTF-8") if encoding and encoding.lower() != "utf-8" else None
    )
    parser.ProcessingInstructionHandler = lambda *_: refuse("the logo has a processing instruction")
    try:
        data.decode("utf-8")
        parser.Parse(data, True)
        if drawn("") > MAX_DRAWN:
            refuse(f"the logo has more than {MAX_DRAWN} elements, those it refers to put in")
    except UnicodeDecodeError:
        raise ContentError(file, 0, "the logo is not UTF-8", _PLAIN) from None
    except expat.ExpatError as error:
        raise ContentError(file, error.lineno, f"this is not SVG ({expat.ErrorString(error.code)})", _PLAIN) from None
    return sizes[0]


def _view(attributes: Mapping[str, str]) -> tuple[float, float] | None:
    number = r"\d+(?:\.\d+)?"
    match = re.fullmatch(rf"\s*-?{number}[\s,]+-?{number}[\s,]+({number})[\s,]+({number})\s*",
                         attributes.get("viewBox", ""))
    return (float(match[1]), float(match[2])) if match else None


__all__ = ["DARK", "ENOUGH", "LIGHT", "Colours", "LightColours", "Logo", "Look", "contrast", "read_logo", "too_faint"]
