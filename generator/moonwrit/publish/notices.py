"""Decisions and changes as notices: Atom (RFC 4287) and JSON Feed 1.1, drawn from the journal and the record."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, time
from xml.etree import ElementTree as ET

from moonwrit import __version__
from moonwrit.content.record import Decision
from moonwrit.files import json_bytes
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.basis import utc
from moonwrit.publish.edition import Edition, Imprint, month_path
from moonwrit.publish.language import Language
from moonwrit.publish.own import own_notices
from moonwrit.publish.pieces import Parts

_ATOM = "http://www.w3.org/2005/Atom"
KEPT = 60
"""Notices kept in the feeds, newest first."""


@dataclass(frozen=True, slots=True)
class Notice:
    """One decision, one published date moved or withdrawn, or one of the community's own notices.

    ``name`` is lasting and unique in the calendar; ``html`` is the text of a notice, with whole addresses.
    """

    name: str
    title: str
    text: str
    path: str
    at: datetime
    html: str = ""


def notices(edition: Edition) -> list[Notice]:
    """Newest first, at most ``KEPT``."""
    found = [*_decisions(edition), *_changes(edition), *_own(edition)]
    return sorted(found, key=lambda notice: (notice.at, notice.name), reverse=True)[:KEPT]


def atom_feed(edition: Edition) -> Parts:
    """``feeds/notices.atom``"""
    found = tuple(notices(edition))
    return (edition.piece(_atom, edition.imprint, found, _updated(edition, found)),)


def json_feed(edition: Edition) -> Parts:
    """``feeds/notices.json``"""
    return (edition.piece(_json, edition.imprint, tuple(notices(edition))),)


def _atom(imprint: Imprint, found: Sequence[Notice], updated: datetime) -> bytes:
    address = imprint.feed("notices.atom")
    root = ET.Element("feed", {"xmlns": _ATOM, "xml:lang": imprint.language.code})
    _add(root, "id", address)
    _add(root, "title", _title(imprint))
    _add(root, "updated", str(utc(updated)))
    ET.SubElement(root, "link", {"rel": "self", "href": address, "type": "application/atom+xml"})
    ET.SubElement(root, "link", {"rel": "alternate", "href": imprint.page("changes/"), "type": "text/html"})
    author = ET.SubElement(root, "author")
    _add(author, "name", imprint.say(imprint.site.community))
    _add(root, "generator", "Moonwrit").set("version", __version__)
    for notice in found:
        entry = ET.SubElement(root, "entry")
        _add(entry, "id", _id(imprint, notice))
        _add(entry, "title", notice.title)
        _add(entry, "updated", str(utc(notice.at)))
        _add(entry, "published", str(utc(notice.at)))
        ET.SubElement(entry, "link", {"rel": "alternate", "href": imprint.page(notice.path), "type": "text/html"})
        _add(entry, "content", notice.html or notice.text).set("type", "html" if notice.html else "text")
    ET.indent(root, " ")
    text = ET.tostring(root, encoding="unicode")
    return f'<?xml version="1.0" encoding="utf-8"?>\n{text}\n'.encode()


def _json(imprint: Imprint, found: Sequence[Notice]) -> bytes:
    return json_bytes({
        "version": "https://jsonfeed.org/version/1.1",
        "title": _title(imprint),
        "home_page_url": imprint.page("changes/"),
        "feed_url": imprint.feed("notices.json"),
        "language": imprint.language.code,
        "authors": [{"name": imprint.say(imprint.site.community)}],
        "items": [
            {
                "id": _id(imprint, notice),
                "url": imprint.page(notice.path),
                "title": notice.title,
                "content_text": notice.text,
                **({"content_html": notice.html} if notice.html else {}),
                "date_published": utc(notice.at),
            }
            for notice in found
        ],
    })


def _decisions(edition: Edition) -> Iterable[Notice]:
    for month in edition.almanac.months:
        made = [*edition.almanac.superseded.get(month.ordinal, ())]
        if month.decision is not None:
            made.append(month.decision)
        for number, decision in enumerate(made, 1):
            yield Notice(
                f"decision-{month.year}-{month.month:02d}-{number}",
                _decision_title(month, decision, edition.language),
                _decision_text(month, decision, edition),
                month_path(month),
                decision.at.astimezone(UTC),
            )


def _decision_title(month: Month, decision: Decision, language: Language) -> str:
    return language.gettext("%(month)s begins on %(day)s") % {
        "month": words.month_title(month, language), "day": language.full_date(decision.starts)
    }


def _decision_text(month: Month, decision: Decision, edition: Edition) -> str:
    _, language = edition.language.gettext, edition.language
    parts = [_("Decided by %(who)s.") % {"who": decision.by}]
    if decision is not month.decision:
        parts.append(_("This decision has been superseded since."))
    if decision.text is not None:
        parts.append(edition.imprint.say(decision.text))
    if decision is month.decision:
        parts += [words.basis_sentence(month, language), words.margin_sentence(month.margin, language)]
    return " ".join(parts)


def _changes(edition: Edition) -> Iterable[Notice]:
    _, language, imprint = edition.language.gettext, edition.language, edition.imprint
    for entry in edition.ledger.moved(edition.almanac.calendar_id):
        names = {
            "what": words.published_name(entry.key, imprint.observances, imprint.site.language, language),
            "was": language.full_date(entry.was or entry.starts),
            "is": language.full_date(entry.starts),
            "reason": words.reason(entry.because, language),
        }
        if entry.standing == "withdrawn":
            title, text = _("%(what)s is withdrawn"), _("It was published as %(was)s. Reason: %(reason)s.")
        else:
            title = _("%(what)s has moved to %(is)s")
            text = _("It was published as %(was)s and is now %(is)s. Reason: %(reason)s.")
        yield Notice(f"change-{entry.key}-{entry.seq}", title % names, text % names, "changes/", entry.at)


def _own(edition: Edition) -> Iterable[Notice]:
    zone = next(iter(edition.almanac.places.values())).zone
    for one in own_notices(edition):
        assert one.on is not None
        # From the beginning of its date at the first place of the region.
        at = datetime.combine(one.on, time(), zone).astimezone(UTC)
        name = one.path.strip("/").replace("/", "-")
        yield Notice(name, one.title, one.text, one.path, at, one.html(edition.imprint.page(one.path)))


def _updated(edition: Edition, found: Sequence[Notice]) -> datetime:
    return max([edition.last_change, *(notice.at for notice in found)])


def _title(imprint: Imprint) -> str:
    return imprint.language.gettext("%(calendar)s: decisions and changes") % {"calendar": imprint.name}


def _id(imprint: Imprint, notice: Notice) -> str:
    return imprint.page(f"changes/#{imprint.uid(notice.name)}")


def _add(parent: ET.Element, name: str, text: str) -> ET.Element:
    element = ET.SubElement(parent, name)
    element.text = text
    return element
