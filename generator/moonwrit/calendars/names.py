"""Names of months.

Hijri names in Arabic, Turkish, Urdu, Indonesian and French: Unicode CLDR 48.2.0 (npm package
cldr-cal-islamic-full, key months/format/wide; Unicode License v3), but for three spellings mended
here: Urdu 3 and 4 lose a stray space ("ر بیع"), and French 11 has an apostrophe for a grave accent.
English: a transliteration in plain letters, one spelling throughout (CLDR's has half rings, and
numbers for Rabi and Jumada). Persian months: the English names of CLDR 48. Rumi months: the usual
names in Turkish spelling, from memory.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from moonwrit.calendars.daycount import check_month

HIJRI_MONTHS: Mapping[str, tuple[str, ...]] = MappingProxyType({
    "en": (
        "Muharram", "Safar", "Rabi al-Awwal", "Rabi al-Thani", "Jumada al-Ula", "Jumada al-Thani",
        "Rajab", "Shaban", "Ramadan", "Shawwal", "Dhu al-Qada", "Dhu al-Hijja",
    ),
    "ar": (
        "محرم", "صفر", "ربيع الأول", "ربيع الآخر", "جمادى الأولى", "جمادى الآخرة",
        "رجب", "شعبان", "رمضان", "شوال", "ذو القعدة", "ذو الحجة",
    ),
    "tr": (
        "Muharrem", "Safer", "Rebiülevvel", "Rebiülahir", "Cemaziyelevvel", "Cemaziyelahir",
        "Recep", "Şaban", "Ramazan", "Şevval", "Zilkade", "Zilhicce",
    ),
    "ur": (
        "محرم", "صفر", "ربیع الاول", "ربیع الثانی", "جمادی الاول", "جمادی الثانی",
        "رجب", "شعبان", "رمضان", "شوال", "ذوالقعدۃ", "ذوالحجۃ",
    ),
    "id": (
        "Muharam", "Safar", "Rabiulawal", "Rabiulakhir", "Jumadilawal", "Jumadilakhir",
        "Rajab", "Syakban", "Ramadan", "Syawal", "Zulkaidah", "Zulhijah",
    ),
    "fr": (
        "mouharram", "safar", "rabia al awal", "rabia ath-thani", "joumada al oula", "joumada ath-thania",
        "rajab", "chaabane", "ramadan", "chawwal", "dhou al qi’da", "dhou al-hijja",
    ),
})  # fmt: skip
"""Language code to the twelve names, Muharram first."""

GREGORIAN_MONTHS: tuple[str, ...] = (
    "January", "February", "March", "April", "May", "June",
    "July", "August", "September", "October", "November", "December",
)  # fmt: skip
"""In English, January first; the Julian months are the same."""

RUMI_MONTHS: tuple[str, ...] = (
    "Kanun-i Sani", "Şubat", "Mart", "Nisan", "Mayıs", "Haziran",
    "Temmuz", "Ağustos", "Eylül", "Teşrin-i Evvel", "Teşrin-i Sani", "Kanun-i Evvel",
)  # fmt: skip
"""By the number of the Julian or Gregorian namesake: the first is January's, Mart is the third."""

SOLAR_HIJRI_MONTHS: tuple[str, ...] = (
    "Farvardin", "Ordibehesht", "Khordad", "Tir", "Mordad", "Shahrivar",
    "Mehr", "Aban", "Azar", "Dey", "Bahman", "Esfand",
)  # fmt: skip
"""Transliterated, Farvardin first."""


def month_name(month: int, language: str = "en") -> str:
    """The name of a Hijri month (1 to 12) in a language.

    ``language`` is a language code; a region or script after it is passed over (``tr-CY`` is ``tr``), and
    a language without names here gets the English transliteration. Raises ``CalendarError`` for any other
    month.
    """
    check_month("Hijri", month)
    names = HIJRI_MONTHS.get(language.partition("-")[0].lower(), HIJRI_MONTHS["en"])
    return names[month - 1]


def month_slug(month: int) -> str:
    """The name of a Hijri month for addresses and file names, in small plain letters: ``dhu-al-hijja``."""
    return month_name(month).lower().replace(" ", "-")
