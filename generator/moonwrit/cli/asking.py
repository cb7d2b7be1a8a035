"""``months``, ``evening``, ``why`` and ``differ``: what a policy says, and what it rests on."""

from __future__ import annotations

import re
from datetime import date
from typing import TYPE_CHECKING

import click

from moonwrit.cli.options import (
    content_at,
    content_if_there,
    date_given,
    is_folder,
    method_of,
    on_record,
    place_of,
    print_json,
    progress,
    shared,
    table,
    today_of,
    years_of,
)
from moonwrit.concordance import TITLES, in_calendar
from moonwrit.errors import RequestError, did_you_mean

if TYPE_CHECKING:
    from pathlib import Path

    from moonwrit.content import Content
    from moonwrit.content.models import OtherCalendar
    from moonwrit.content.record import Decision
    from moonwrit.policy import Method, Month


@click.command()
@shared("content", "policy", "place", "years", "as_of", "json")
@click.option("--also", "calendars", multiple=True, metavar="CALENDAR", type=click.Choice(sorted(TITLES)),
              help=f"The first days in another calendar too: {', '.join(sorted(TITLES))}; may be repeated.")
def months(
    folder: Path, policy: str | None, places: tuple[str, ...], first: int | None, last: int | None,
    as_of: date | None, as_json: bool, calendars: tuple[OtherCalendar, ...],
) -> None:
    """Month starts as a table."""
    content = content_if_there(folder, policy)
    method = method_of(content, policy, places)
    years = years_of(content, first, last)
    with progress("Computing months"):
        found = method.months(*years, on_record(content, method, as_of))
    from moonwrit.publish.basis import month_json

    also = [{calendar: in_calendar(month.starts, calendar) for calendar in calendars} for month in found]
    if as_json:
        print_json([
            {**month_json(month), **({"also": other} if other else {})}
            for month, other in zip(found, also, strict=True)
        ])
        return
    table(
        f"{method.title}, {years[0]}-{years[1]} AH",
        ("month", "starts", *(TITLES[calendar] for calendar in calendars), "days", "standing", "basis",
         "deciding quantity", "margin", "how close"),
        [
            (
                f"{m.year}-{m.month:02d}", f"{m.starts:%a %Y-%m-%d}", *(day or "-" for day in other.values()),
                str(m.length), m.standing, m.basis, m.margin.quantity,
                "" if m.margin.margin is None else f"{m.margin.margin:+g} {m.margin.unit}".strip(),
                m.margin.closeness,
            )
            for m, other in zip(found, also, strict=True)
        ],
    )


@click.command()
@click.argument("on", metavar="[DATE]", callback=date_given, required=False)
@shared("content", "place", "as_of", "json")
def evening(
    on: date | None, folder: Path, places: tuple[str, ...], as_of: date | None, as_json: bool
) -> None:
    """Circumstances of the evening of a civil date at places.

    Without DATE, the next 29th evening of the community's calendar.
    """
    content = content_at(folder) if on is None or not places or is_folder(folder) else None
    from moonwrit.policy import named_place
    from moonwrit.policy.evening import evening_at

    if places:
        chosen = [place_of(content, text) for text in places]
    else:
        assert content is not None
        chosen = [named_place(content, place_id) for place_id in content.places]
    if on is None:
        assert content is not None
        on = _next_evening(content, as_of)
    rows = evening_at(on, chosen)
    if as_json:
        print_json(rows)
        return
    keys = [key for key in rows[0] if key not in ("date", "place")]
    table(
        f"Evening of {on:%A %Y-%m-%d}",
        ("", *(str(row["place"]) for row in rows)),
        [(key, *("-" if row[key] is None else str(row[key]) for row in rows)) for key in keys],
    )
    from moonwrit.publish.labels import EYES

    click.echo(EYES)


@click.command()
@click.argument("what")
@shared("content", "policy", "place", "as_of", "json")
def why(
    what: str, folder: Path, policy: str | None, places: tuple[str, ...], as_of: date | None, as_json: bool
) -> None:
    """The basis of one date, in words.

    WHAT is a lunar month (1447-9), a civil date (2026-02-19), or an observance and its year
    (eid-al-fitr-1447).
    """
    from moonwrit.publish.basis import month_json
    from moonwrit.publish.words import why_paragraphs

    content = content_if_there(folder, policy)
    method = method_of(content, policy, places)
    month, about = _asked(what, method, content, on_record(content, method, as_of))
    if as_json:
        print_json(month_json(month))
        return
    for paragraph in [*about, *why_paragraphs(month)]:
        click.echo(paragraph)


@click.command()
@shared("content")
@click.option("--policy", "policies", multiple=True, metavar="P",
              help="A policy to put beside the community's; may be repeated. Default: all others of the content.")
@shared("place", "years", "as_of", "json")
def differ(
    folder: Path, policies: tuple[str, ...], places: tuple[str, ...], first: int | None, last: int | None,
    as_of: date | None, as_json: bool,
) -> None:
    """Policies side by side: month starts, and the computed reason for each difference."""
    from moonwrit.policy.differ import beside
    from moonwrit.publish.basis import beside_json

    content = content_at(folder)
    main_policy = next(iter(content.site.calendars.values())).policy
    ours = method_of(content, None, ())
    others = [method_of(content, name, places) for name in policies or content.policies if name != main_policy]
    if not others:
        raise RequestError("there is no other policy to put beside the community's", "name one with --policy")
    years = years_of(content, first, last)
    with progress("Computing policies"):
        months = ours.months(*years, on_record(content, ours, as_of))
        found = [beside(other, months, ours) for other in others]
    if as_json:
        print_json([beside_json(one) for one in found])
        return
    table(
        f"{years[0]}-{years[1]} AH",
        ("month", ours.title, *(one.method.title for one in found)),
        [
            (f"{m.year}-{m.month:02d}", f"{m.starts:%a %Y-%m-%d}", *(
                "same" if one.months[i].starts == m.starts else f"{(one.months[i].starts - m.starts).days:+d} d"
                for one in found
            ))
            for i, m in enumerate(months)
        ],
    )
    for one in found:
        click.echo(f"{one.method.title}: {one.agreement:.0%} of {len(months)} months begin on the same day.")
        for each in one.differences:
            click.echo(f"  {each.ours.year}-{each.ours.month:02d}: {each.days:+d} d. {each.reason}")


def _next_evening(content: Content, as_of: date | None) -> date:
    """The first 29th evening from today on, by the community's own policy and record."""
    method, today = method_of(content, None, ()), as_of or today_of(content)
    years = content.site.years
    for month in method.months(years.first, years.last, on_record(content, method, as_of)):
        if month.evidence.evening >= today:
            return month.evidence.evening
    raise RequestError("no 29th evening is left in the years of site.yaml", "give a DATE, or add years")


def _asked(
    what: str, method: Method, content: Content | None, decisions: dict[int, Decision]
) -> tuple[Month, list[str]]:
    """The month on which the thing asked for rests, and a line that dates the thing itself."""
    from moonwrit.calendars import Tabular, month_name

    if match := re.fullmatch(r"(\d{1,4})-(\d{1,2})", what):
        year, number = int(match[1]), int(match[2])
        if not 1 <= number <= 12:
            raise RequestError(f"there is no month {number}", "lunar months are 1 to 12")
        if year < 1:
            raise RequestError("there is no year 0", "Hijri years begin with 1")
        return method.months(year, year, decisions)[number - 1], []
    if re.fullmatch(r"\d{4}-\d{2}-\d{2}", what):
        try:
            day = date.fromisoformat(what)
        except ValueError:
            raise RequestError(f"{what} is not a date", "write year-month-day") from None
        near = Tabular().from_date(day)
        for year in (near.year, near.year + (1 if near.month > 6 else -1)):
            for month in method.months(year, year, decisions):
                if month.starts <= day <= month.ends:
                    lunar = f"{(day - month.starts).days + 1} {month_name(month.month)} {month.year}"
                    return month, [f"{day:%A %d %B %Y} is {lunar}."]
    if content is not None and (match := re.fullmatch(r"([a-z0-9-]+?)-(\d{3,4})(-\d{2})*", what)):
        from moonwrit.observances import occurrences

        year = int(match[2])
        found = method.months(year, year, decisions)
        dated = {one.key: one for one in occurrences(content.observances, found)}
        if what in dated:
            one = dated[what]
            run = f"{one.starts:%A %d %B %Y}" + ("" if one.starts == one.ends else f" to {one.ends:%A %d %B %Y}")
            return found[one.month - 1], [f"{what}: {run}."]
        raise RequestError(f'"{what}" is nothing that is dated here', did_you_mean(what, dated))
    raise RequestError(
        f'"{what}" is neither a lunar month, a civil date nor an observance',
        "write 1447-9, 2026-02-19 or eid-al-fitr-1447",
    )
