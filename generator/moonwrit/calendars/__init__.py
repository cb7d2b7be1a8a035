"""Calendars of pure arithmetic: tabular Hijri, Julian, Rumi, solar Hijri, and the names of months.

Nothing here knows the sky, the content or a policy, and importing it is cheap. Conversions go
through the rata die, a count of days (see ``daycount``).
"""

from moonwrit.calendars.daycount import CalendarError
from moonwrit.calendars.julian import JulianDate, julian_from_date, julian_to_date
from moonwrit.calendars.names import (
    GREGORIAN_MONTHS,
    HIJRI_MONTHS,
    RUMI_MONTHS,
    SOLAR_HIJRI_MONTHS,
    month_name,
    month_slug,
)
from moonwrit.calendars.rumi import RumiDate, rumi_from_date, rumi_to_date
from moonwrit.calendars.solar_hijri import (
    CYCLE_2820,
    THIRTY_THREE_YEAR,
    SolarHijri,
    SolarHijriDate,
    new_year_from_equinox,
)
from moonwrit.calendars.tabular import TABULAR_NAMES, HijriDate, Tabular, tabular_by_name

__all__ = [
    "CYCLE_2820",
    "GREGORIAN_MONTHS",
    "HIJRI_MONTHS",
    "RUMI_MONTHS",
    "SOLAR_HIJRI_MONTHS",
    "TABULAR_NAMES",
    "THIRTY_THREE_YEAR",
    "CalendarError",
    "HijriDate",
    "JulianDate",
    "RumiDate",
    "SolarHijri",
    "SolarHijriDate",
    "Tabular",
    "julian_from_date",
    "julian_to_date",
    "month_name",
    "month_slug",
    "new_year_from_equinox",
    "rumi_from_date",
    "rumi_to_date",
    "tabular_by_name",
]
