"""The day count that every calendar here is reckoned through, and the error they share.

A *rata die* is a whole number of days: 1 is Monday, 1 January AD 1 of the Gregorian calendar carried
backwards (Reingold and Dershowitz, Calendrical Calculations). It is what ``datetime.date`` calls the
ordinal, but it also runs below 1, where ``date`` ends. Midnight beginning the day is
Julian Date = rata die + 1721424.5.
"""

from __future__ import annotations

from datetime import date

from moonwrit.errors import RequestError


class CalendarError(RequestError, ValueError):
    """A date, month or year that the calendar asked for does not have. A plain ``ValueError`` too."""


def date_of_rd(rd: int) -> date:
    """The Gregorian date of a rata die. Raises ``CalendarError`` outside AD 1 to 9999."""
    if not date.min.toordinal() <= rd <= date.max.toordinal():
        raise CalendarError(
            f"day {rd} of the day count lies outside the Gregorian years 1 to 9999", "ask for a nearer year"
        )
    return date.fromordinal(rd)


def check_month(calendar: str, month: int) -> None:
    """Raises ``CalendarError`` where ``month`` is not 1 to 12."""
    if not 1 <= month <= 12:
        raise CalendarError(f"the {calendar} calendar has no month {month}", "months run from 1 to 12")


def check_day(calendar: str, year: int, month: int, day: int, length: int) -> None:
    """Raises ``CalendarError`` where ``day`` is not 1 to ``length``, the length of that month in days."""
    if not 1 <= day <= length:
        raise CalendarError(
            f"month {month} of {year} has no day {day} in the {calendar} calendar", f"it has {length} days"
        )
