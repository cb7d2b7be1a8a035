"""Writes ../<country>_feasts.csv: 1 Shawwal and 10 Dhu al-Hijja as recorded in the ``holidays`` package.

The package marks each date as confirmed or estimated; only confirmed ones are taken. Days in lieu, eves and the
further days of a feast are made elsewhere in the package and do not come in: the calendar class gives the
feast's own day. Some dates that it writes for one country look like such days all the same; the tests in
tests/policy name them. Only these two feasts are taken, because the package's dates of other days (the new year, the
Prophet's birthday) are those of the day off, which was sometimes moved: Indonesia, 10 to 11 August 2021.
"""

from __future__ import annotations

from datetime import date
from importlib.metadata import version
from pathlib import Path

from convertdate import islamic
from holidays.countries.indonesia import IndonesiaIslamicHolidays
from holidays.countries.malaysia import MalaysiaIslamicHolidays
from holidays.countries.turkey import TurkeyIslamicHolidays

HERE = Path(__file__).parent
FEASTS = {"EID_AL_FITR": (10, 1), "EID_AL_ADHA": (12, 10)}
COUNTRIES = {
    "turkiye": ("Türkiye", TurkeyIslamicHolidays),
    "indonesia": ("Indonesia", IndonesiaIslamicHolidays),
    "malaysia": ("Malaysia", MalaysiaIslamicHolidays),
}


def rows(kind: type) -> list[str]:
    """Lines ``year,month,day,date,record``, in order of date.

    ``record`` is "own" where the package writes the date for this country, "shared" where it confirms for
    this country, over a span of years, the date in the table that it keeps for many.
    """
    found: list[tuple[date, str]] = []
    for feast, (month, day) in FEASTS.items():
        own = getattr(kind, f"{feast}_DATES_CUSTOM_CALENDAR")
        dates = getattr(kind(), f"{feast.lower()}_dates")
        for civil_year in range(1900, 2100):
            for kept, estimated in dates(civil_year):
                if estimated or kept.year != civil_year:  # the package also repeats the year before
                    continue
                # The tabular year is enough: both feasts are weeks away from a new year.
                year = islamic.from_gregorian(kept.year, kept.month, kept.day)[0]
                record = "own" if civil_year in own else "shared"
                found.append((kept, f"{year},{month},{day},{kept},{record}"))
    return [line for _, line in sorted(found)]


def main() -> None:
    for name, (title, kind) in COUNTRIES.items():
        header = [
            f"# 1 Shawwal and 10 Dhu al-Hijja as recorded for {title}; no estimated date is among them.",
            f"# Source: PyPI package holidays {version('holidays')} (MIT), {kind.__module__}.{kind.__name__}.",
            "# record: own = written there for this country; shared = its table for many countries, confirmed for",
            "# this one over a span of years. These are days off as announced, often long before: a decision",
            "# taken on the evening itself may have been another (from memory: for 1 Shawwal 1432 Indonesia",
            "# announced 30 August 2011 and decided on the 31st).",
            "# Written by makers/recorded_feasts.py.",
            "year,month,day,date,record",
        ]
        text = "\n".join([*header, *rows(kind)]) + "\n"
        (HERE.parent / f"{name}_feasts.csv").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
