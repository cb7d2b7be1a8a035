"""One language of the site: its messages, and how it writes dates, times and numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date, datetime
from functools import cache, lru_cache
from typing import Literal

from babel import Locale
from babel.dates import format_date, format_skeleton, get_day_names
from babel.numbers import format_decimal

from moonwrit.calendars import month_name
from moonwrit.publish.catalogue import translations

_DIGITS = {
    "arab": str.maketrans("0123456789", "٠١٢٣٤٥٦٧٨٩"),
    "arabext": str.maketrans("0123456789", "۰۱۲۳۴۵۶۷۸۹"),
}
_LOCALES = {"en": "en_AU", "ar": "ar_EG"}
"""English without a country is written day first, as in most of the world; Arabic as in its likely country (CLDR)."""


@dataclass(frozen=True)
class Language:
    """``code`` is the language tag of the pages. Messages are given in English and looked up in its catalogue.

    ``names`` are proper names of the content (places, policies), from the site's language to this one.
    """

    code: str = "en"
    names: Mapping[str, str] = field(default_factory=dict, compare=False)

    @property
    def locale(self) -> Locale:
        return _locale(self.code)

    @property
    def own_name(self) -> str:
        """The name that the language has for itself, as it is written within a line or alone."""
        name = Locale.parse(self.code.replace("-", "_")).get_display_name() or self.code
        return name[:1].upper() + name[1:]

    @property
    def direction(self) -> Literal["ltr", "rtl"]:
        return "rtl" if self.locale.text_direction == "rtl" else "ltr"

    @property
    def first_weekday(self) -> int:
        """Monday is 0."""
        return int(self.locale.first_week_day)

    def gettext(self, message: str) -> str:
        return translations(self.code).gettext(message)

    def ngettext(self, one: str, many: str, n: int) -> str:
        return translations(self.code).ngettext(one, many, n)

    def name(self, text: str) -> str:
        """A proper name in this language, or as it is."""
        return self.names.get(text, text)

    def digits(self, text: str | int) -> str:
        """A text or whole number with the digits that readers of the language expect (CLDR's default)."""
        return str(text).translate(_digits(self.code))

    def values(self, given: Mapping[str, object]) -> dict[str, object]:
        """Values for the places of a message: whole numbers in the language's digits, proper names in its form."""
        return {
            key: self.digits(value) if isinstance(value, int) and not isinstance(value, bool)
            else self.name(value) if isinstance(value, str) else value
            for key, value in given.items()
        }

    def weekdays(self, width: Literal["wide", "abbreviated", "narrow"] = "wide") -> list[str]:
        """The seven names, in the order of the week here."""
        names = get_day_names(width, "stand-alone", self.locale)
        return [str(names[(self.first_weekday + i) % 7]) for i in range(7)]

    def full_date(self, day: date) -> str:
        """Friday 20 February 2026"""
        return _full_date(self.code, day)

    def long_date(self, day: date) -> str:
        """20 February 2026"""
        return self._date("yMMMMd", day)

    def week_date(self, day: date) -> str:
        """Fri 20 Feb 2026"""
        return self._date("yMMMEd", day)

    def short_date(self, day: date) -> str:
        """20 Feb"""
        return self._date("MMMd", day)

    def short_week_date(self, day: date) -> str:
        """Fri 20 Feb"""
        return self._date("MMMEd", day)

    def civil_month(self, day: date) -> str:
        """February 2026"""
        return self._date("yMMMM", day)

    def short_civil_month(self, day: date) -> str:
        """Feb"""
        return self._date("MMM", day)

    def weekday(self, day: date) -> str:
        """Friday"""
        return str(get_day_names("wide", "stand-alone", self.locale)[day.weekday()])

    def clock(self, moment: datetime) -> str:
        """20:15, by the clock of the moment's own zone."""
        return self.digits(moment.strftime("%H:%M"))

    def number(self, value: float, decimals: int = 4) -> str:
        """With a true minus sign and at most so many decimals."""
        return _number(self.code, value + 0.0, decimals)

    def month(self, month: int) -> str:
        """The name of a Hijri month, 1 to 12."""
        return month_name(month, self.code)

    @property
    def comma(self) -> str:
        """What stands between the items of a list."""
        return "، " if self.direction == "rtl" else ", "

    def listing(self, items: list[str]) -> str:
        """a, b, c"""
        return self.comma.join(items)

    def _date(self, skeleton: str, day: date) -> str:
        return _date(self.code, skeleton, day)


# Texts made from values alone, each made once: the formatting of dates and numbers is slow, and a site repeats them.


@cache
def _locale(code: str) -> Locale:
    return Locale.parse(_LOCALES.get(code, code.replace("-", "_")))


@cache
def _digits(code: str) -> dict[int, int]:
    return _DIGITS.get(_locale(code).default_numbering_system, {})


@lru_cache(maxsize=1 << 15)
def _date(code: str, skeleton: str, day: date) -> str:
    return format_skeleton(skeleton, day, locale=_locale(code)).translate(_digits(code))


@lru_cache(maxsize=1 << 13)
def _full_date(code: str, day: date) -> str:
    return format_date(day, "full", _locale(code)).translate(_digits(code))


@lru_cache(maxsize=1 << 15)
def _number(code: str, value: float, decimals: int) -> str:
    pattern = "#,##0." + "#" * decimals if decimals else "#,##0"
    text = format_decimal(value, pattern, _locale(code), numbering_system="default")
    # Without the mark, European digits in a line from right to left would have their sign on the wrong side (CLDR).
    minus = "\u200e\u2212" if _locale(code).text_direction == "rtl" and not _digits(code) else "\u2212"
    return text.replace("-", minus).translate(_digits(code))


ENGLISH = Language()
