"""Decisions and changes as notices: Atom (RFC 4287) and JSON Feed 1.1, drawn from the journal and the record."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Any
from xml.etree import ElementTree as ET

from moonwrit import __version__
from moonwrit.almanac import Almanac
from moonwrit.calendars import month_slug
from moonwrit.content.models import in_language
from moonwrit.content.record import Decision
from moonwrit.journal import Ledger
from moonwrit.policy import Month
from moonwrit.publish import words
from moonwrit.publish.basis import json_bytes, utc
from moonwrit.publish.icalendar import last_change, page, uid
from moonwrit.publish.language import ENGLISH, Language

_ATOM = "http://www.w3.org/2005/Atom"
KEPT = 60
"""Notices kept in the feeds, newest first."""


@dataclass(frozen=True, slots=True)
class Notice:
    """One decision, or one published date moved or withdrawn. ``name`` is lasting and unique in the calendar."""

    name: str
    title: str
    text: str
    path: str
    at: datetime


def notices(almanac: Almanac, ledger: Ledger, language: Language = ENGLISH) -> list[Notice]:
    """Newest first, at most ``KEPT``."""
    found = [*_decisions(almanac, language), *_changes(almanac, ledger, language)]
    return sorted(found, key=lambda notice: (notice.at, notice.name), reverse=True)[:KEPT]


def atom_feed(almanac: Almanac, ledger: Ledger, language: Language = ENGLISH) -> bytes:
    """``feeds/notices.atom``"""
    address = page(almanac, "feeds/notices.atom")
    root = ET.Element("feed", {"xmlns": _ATOM, "xml:lang": language.code})
    _add(root, "id", address)
    _add(root, "title", _title(almanac, language))
    _add(root, "updated", str(utc(_updated(almanac, ledger, language))))
    ET.SubElement(root, "link", {"rel": "self", "href": address, "type": "application/atom+xml"})
    ET.SubElement(root, "link", {"rel": "alternate", "href": page(almanac, "changes/"), "type": "text/html"})
    author = ET.SubElement(root, "author")
    _add(author, "name", in_language(almanac.site.community, language.code, almanac.site.language))
    _add(root, "generator", "Moonwrit").set("version", __version__)
    for notice in notices(almanac, ledger, language):
        entry = ET.SubElement(root, "entry")
        _add(entry, "id", _id(almanac, notice))
        _add(entry, "title", notice.title)
        _add(entry, "updated", str(utc(notice.at)))
        _add(entry, "published", str(utc(notice.at)))
        ET.SubElement(entry, "link", {"rel": "alternate", "href": page(almanac, notice.path), "type": "text/html"})
        _add(entry, "content", notice.text).set("type", "text")
    ET.indent(root, " ")
    text = ET.tostring(root, encoding="unicode")
    return f'<?xml version="1.0" encoding="utf-8"?>\n{text}\n'.encode()


def json_feed(almanac: Almanac, ledger: Ledger, language: Language = ENGLISH) -> bytes:
    """``feeds/notices.json``"""
    value: dict[str, Any] = {
        "version": "https://jsonfeed.org/version/1.1",
        "title": _title(almanac, language),
        "home_page_url": page(almanac, "changes/"),
        "feed_url": page(almanac, "feeds/notices.json"),
        "language": language.code,
        "authors": [{"name": in_language(almanac.site.community, language.code, almanac.site.language)}],
        "items": [
            {
                "id": _id(almanac, notice),
                "url": page(almanac, notice.path),
                "title": notice.title,
                "content_text": notice.text,
                "date_published": utc(notice.at),
            }
            for notice in notices(almanac, ledger, language)
        ],
    }
    return json_bytes(value)


def _decisions(almanac: Almanac, language: Language) -> Iterable[Notice]:
    for month in almanac.months:
        made = [*almanac.superseded.get(month.ordinal, ())]
        if month.decision is not None:
            made.append(month.decision)
        for number, decision in enumerate(made, 1):
            yield Notice(
                f"decision-{month.year}-{month.month:02d}-{number}",
                _decision_title(month, decision, language),
                _decision_text(month, decision, almanac, language),
                f"{month.year}/{month_slug(month.month)}/",
                decision.at.astimezone(UTC),
            )


def _decision_title(month: Month, decision: Decision, language: Language) -> str:
    return language.gettext("%(month)s begins on %(day)s") % {
        "month": words.month_title(month, language), "day": language.full_date(decision.starts)
    }


def _decision_text(month: Month, decision: Decision, almanac: Almanac, language: Language) -> str:
    _ = language.gettext
    parts = [_("Decided by %(who)s.") % {"who": decision.by}]
    if decision is not month.decision:
        parts.append(_("This decision has been superseded since."))
    if decision.text is not None:
        parts.append(in_language(decision.text, language.code, almanac.site.language))
    if decision is month.decision:
        parts += [words.basis_sentence(month, language), words.margin_sentence(month.margin, language)]
    return " ".join(parts)


def _changes(almanac: Almanac, ledger: Ledger, language: Language) -> Iterable[Notice]:
    _ = language.gettext
    for entry in ledger.moved(almanac.calendar_id):
        names = {
            "what": words.published_name(entry.key, almanac.observances, almanac.site.language, language),
            "was": language.full_date(entry.was or entry.starts),
            "is": language.full_date(entry.starts),
            "reason": entry.because or "",
        }
        if entry.standing == "withdrawn":
            title, text = _("%(what)s is withdrawn"), _("It was published as %(was)s. Reason: %(reason)s.")
        else:
            title = _("%(what)s has moved to %(is)s")
            text = _("It was published as %(was)s and is now %(is)s. Reason: %(reason)s.")
        yield Notice(f"change-{entry.key}-{entry.seq}", title % names, text % names, "changes/", entry.at)


def _updated(almanac: Almanac, ledger: Ledger, language: Language) -> datetime:
    return max([last_change(almanac, ledger), *(notice.at for notice in notices(almanac, ledger, language))])


def _title(almanac: Almanac, language: Language) -> str:
    name = in_language(almanac.calendar.name, language.code, almanac.site.language)
    return language.gettext("%(calendar)s: decisions and changes") % {"calendar": name}


def _id(almanac: Almanac, notice: Notice) -> str:
    return page(almanac, f"changes/#{uid(almanac, notice.name)}")


def _add(parent: ET.Element, name: str, text: str) -> ET.Element:
    element = ET.SubElement(parent, name)
    element.text = text
    return element
