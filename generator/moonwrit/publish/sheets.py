"""PDF sheets of pages that people print: years, months and evenings. Needs the extra ``pdf`` (WeasyPrint).

Equal content gives equal bytes on one machine; another may have other fonts.
"""

from __future__ import annotations

import mimetypes
import re
from collections.abc import Mapping
from functools import cache
from typing import Any, Literal
from urllib.parse import unquote, urlsplit

from moonwrit.errors import RequestError
from moonwrit.publish.render import pictures_sheet, stylesheet

Paper = Literal["a4", "letter"]
SHEETS = frozenset({"year", "civil", "month", "evening", "fasting"})
"""Templates of which sheets are made."""

_PROPERTY = re.compile(r"(--[\w-]+):\s*([^;}]+)")
_SVG = re.compile(r"<svg\b[^>]*>")
_SITE = "https://site.invalid/"


def sheet(path: str, files: Mapping[str, bytes], paper: Paper) -> bytes:
    """The page at ``path`` as a PDF file, by its print style; what it refers to is taken from ``files``.

    Raises RequestError where the extra is not installed, or the page refers to what is not there.
    """
    weasyprint = _weasyprint()
    css = _drawn()
    text = _SVG.sub(lambda found: f"{found[0]}<style>{css}</style>", files[path].decode())
    document = weasyprint.HTML(string=text, base_url=_SITE + path, url_fetcher=_fetcher()(files))
    page = weasyprint.CSS(string=f"@page {{ size: {paper}; }}")
    try:
        made: bytes = document.write_pdf(stylesheets=[page], pdf_identifier=b"moonwrit")
    except weasyprint.urls.FatalURLFetchingError as fault:
        raise RequestError(f"{path}: {fault}", "keep what a sheet shows within the site") from None
    return made


@cache
def _weasyprint() -> Any:
    try:
        import weasyprint
    except (ImportError, OSError) as fault:
        raise RequestError(
            f"PDF sheets need WeasyPrint and its libraries ({fault})", "pip install 'moonwrit[pdf]', and Pango"
        ) from None
    return weasyprint


@cache
def _fetcher() -> Any:
    """The class that answers for addresses: the site's own files, and nothing from anywhere else."""
    from weasyprint.urls import FatalURLFetchingError, URLFetcher, URLFetcherResponse

    class Own(URLFetcher):  # type: ignore[misc]
        def __init__(self, files: Mapping[str, bytes]) -> None:
            super().__init__()
            self.files = files

        def fetch(self, url: str, headers: object = None) -> Any:
            path = unquote(urlsplit(url).path).lstrip("/")
            if not url.startswith(_SITE) or path not in self.files:
                raise FatalURLFetchingError(f"{url} is not part of the site")
            kind = mimetypes.guess_type(path)[0] or "application/octet-stream"
            return URLFetcherResponse(url, self.files[path], {"Content-Type": kind})

    return Own


@cache
def _drawn() -> str:
    """The style of what is drawn, with the colours of the print sheet in place of their names."""
    css = stylesheet().decode()
    values = dict(_PROPERTY.findall(css[: css.index("}")]))
    values.update(_PROPERTY.findall(css[css.index("@media print"):]))
    drawn = re.sub(r"var\((--[\w-]+)\)", lambda found: values[found[1]], pictures_sheet().decode())
    return drawn + ".name { stroke: none }"  # WeasyPrint draws a stroke over the letters, not beneath them


__all__ = ["SHEETS", "Paper", "sheet"]
