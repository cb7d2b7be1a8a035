"""What has been published, and what a new build would change of it.

The journal is a file of one JSON object a line, only ever added to. Each line says of one published thing (a month,
an occurrence of an observance) on which days it was published, with which standing, when, and why it changed. The
last line of a key is what subscribers have seen; its ``seq`` is the SEQUENCE of its event. Two people may publish
from two copies: their lines merge, and a key that both changed differently is reported until a later line settles it.
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import asdict, dataclass, replace
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Literal, get_args

from pydantic import TypeAdapter

from moonwrit.almanac import Almanac
from moonwrit.content.models import Text
from moonwrit.content.record import Amendment, Decision
from moonwrit.errors import ContentError, MoonwritError
from moonwrit.files import put
from moonwrit.policy import Month

FILE = "record/journal.jsonl"
MAX_BYTES = 32 * 1024 * 1024
"""Some two hundred thousand lines."""
_MARKER = "This folder was built by moonwrit and is replaced whole at every build."

Known = Literal["expected", "settled", "amended", "withdrawn"]


@dataclass(frozen=True, slots=True)
class Entry:
    """One line: ``starts`` and ``ends`` as published at ``at`` (UTC); ``was`` the first day before it moved, and
    ``because`` the reason that was recorded for it."""

    calendar: str
    key: str
    starts: date
    ends: date
    standing: Known
    seq: int
    at: datetime
    was: date | None = None
    because: str | None = None


class SilentChangeError(MoonwritError):
    """A published date would change without a decision or an amendment that explains it (exit code 3)."""

    exit_code = 3

    def __init__(self, changes: Sequence[str]) -> None:
        listed = "\n".join(f"  {change}" for change in changes)
        super().__init__(
            f"{len(changes)} published date{'s' if len(changes) > 1 else ''} would change without a recorded "
            f"reason:\n{listed}\nrecord the decision (moonwrit record decision), or write an amendment in "
            "record/amendments.yaml, or undo what changed the content"
        )


@dataclass(frozen=True, slots=True)
class Ledger:
    """The journal held against a build. ``current`` is what will have been published for each (calendar, key) once the
    build is in place; ``added`` the lines to append then; ``history`` every line there is or will be."""

    current: Mapping[tuple[str, str], Entry]
    added: tuple[Entry, ...]
    history: tuple[Entry, ...]

    def entry(self, calendar: str, key: str) -> Entry:
        return self.current[calendar, key]

    def moved(self, calendar: str) -> tuple[Entry, ...]:
        """Every change of a published date or withdrawal in a calendar, newest first."""
        changes = [
            one for one in self.history
            if one.calendar == calendar and (one.was is not None or one.standing == "withdrawn")
        ]
        return tuple(sorted(changes, key=lambda one: (one.at, one.key), reverse=True))


def month_key(year: int, month: int) -> str:
    return f"month-{year}-{month:02d}"


def read(folder: Path) -> tuple[Entry, ...]:
    """The journal of a content folder, in the order of its lines; empty where there is none yet.

    A last line that was cut short (an interrupted write) is left out. Raises ContentError for any other line that is
    no entry, and for two entries of one key that contradict each other.
    """
    file = folder / FILE
    try:
        if file.stat().st_size > MAX_BYTES:
            raise ContentError(file, 0, "the journal is larger than 32 MB", "restore it from your copies")
        text = file.read_text(encoding="utf-8")
    except FileNotFoundError:
        return ()
    except (OSError, UnicodeDecodeError) as fault:
        raise ContentError(file, 0, f"the journal cannot be read ({fault})", "restore it from your copies") from None
    entries = []
    lines = text.split("\n")
    for number, line in enumerate(lines, 1):
        if not line.strip():
            continue
        try:
            entries.append(_parsed(line))
        except (ValueError, KeyError, TypeError, AttributeError, RecursionError):
            if number == len(lines):
                continue
            raise ContentError(
                file, number, "this line is no entry of the journal",
                "settle a merge by keeping the lines of both sides, or restore the file from your copies",
            ) from None
    _refuse_contradictions(file, entries)
    return tuple(entries)


def hold_against(
    entries: Sequence[Entry], almanacs: Iterable[Almanac], amendments: Iterable[Amendment], now: datetime
) -> Ledger:
    """What the build changes of what was published.

    A change of a date is explained by a decision that moves its month or an earlier one in this build, or by an
    amendment that covers it, made after the date was published. Raises SilentChangeError, with the list, where a
    change is not explained.
    """
    last: dict[tuple[str, str], Entry] = {}
    for entry in entries:
        known = last.get((entry.calendar, entry.key))
        if known is None or entry.seq >= known.seq:
            last[entry.calendar, entry.key] = entry
    stamp = now.astimezone(UTC).replace(microsecond=0)
    added: list[Entry] = []
    silent: list[str] = []
    for almanac in almanacs:
        reasons = _Reasons(_moving(almanac, last), tuple(amendments))
        seen = set()
        for fresh, month in _published_by(almanac, stamp):
            seen.add(fresh.key)
            _compare(last, fresh, month, reasons, added, silent)
        years = almanac.site.years
        for gone in [e for (calendar, key), e in last.items() if calendar == almanac.calendar_id and key not in seen]:
            year = _year_of(gone.key)
            if gone.standing != "withdrawn" and year is not None and years.first <= year <= years.last:
                _withdraw(last, gone, year, reasons, stamp, added, silent)
    if silent:
        raise SilentChangeError(silent)
    return Ledger(last, tuple(added), (*entries, *added))


def append(folder: Path, added: Sequence[Entry]) -> None:
    """Write the new lines at the end of the journal; done once the site is in place.

    A cut line at the end is first removed. Raises ContentError where it cannot be written.
    """
    if not added:
        return
    file = folder / FILE
    try:
        before = file.read_bytes() if file.exists() else b""
        whole = before[: before.rfind(b"\n") + 1]
        text = "".join(_line(entry) + "\n" for entry in added).encode()
        put(file, whole + text)
    except OSError as fault:
        raise ContentError(file, 0, f"the journal cannot be written ({fault.strerror})", "mend its folder") from None


def site_marker(ledger: Ledger, address: str) -> str:
    """What a built site carries of the journal: the lines that it added, for ``recover``."""
    return "".join([f"{_MARKER}\n{address}\n", *(_line(entry) + "\n" for entry in ledger.added)])


def recover(folder: Path, marker: Path, address: str) -> None:
    """Add to the journal what the site in place says it published and the journal lacks.

    A build that was stopped after the site was in place and before the journal was written leaves just that.
    ``marker`` is the site's file with ``site_marker``'s text; one of another site is left alone.
    """
    try:
        head, of, *lines = marker.read_text(encoding="utf-8").split("\n")
        added = [_parsed(line) for line in lines if line]
    except (OSError, ValueError, KeyError, TypeError, AttributeError, RecursionError):
        return
    if head == _MARKER and of == address and added:
        known = set(read(folder))
        append(folder, [entry for entry in added if entry not in known])


# --- comparing ------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Reasons:
    """``moving``: the decisions that move the first day of their own month in this build; those that were published
    before have had their effect and explain nothing any more."""

    moving: tuple[Decision, ...]
    amendments: tuple[Amendment, ...]

    def for_change(self, key: str, ordinal: int, since: datetime) -> str | None:
        """Why a thing that hangs on the month ``ordinal`` may have changed since it was published."""
        made = [decision for decision in self.moving if decision.ordinal <= ordinal]
        if made:
            latest = max(made, key=lambda decision: (decision.ordinal, decision.at))
            return f"decision of {latest.at.date().isoformat()} on month {latest.month} by {latest.by}"
        for amendment in self.amendments:
            if amendment.at > since and amendment.covers(key, ordinal):
                return f"amendment of {amendment.at.date().isoformat()} by {amendment.by}: {amendment.reason}"
        return None


def _moving(almanac: Almanac, last: Mapping[tuple[str, str], Entry]) -> tuple[Decision, ...]:
    """The decisions that move their month: made since it was published, or the first on it, written down late."""
    return tuple(
        month.decision for month in almanac.months
        if month.decision is not None
        and (known := last.get((almanac.calendar_id, month_key(month.year, month.month)))) is not None
        and known.starts != month.starts
        and (known.standing == "expected" or month.decision.at > known.at)
    )


def _published_by(almanac: Almanac, stamp: datetime) -> Iterable[tuple[Entry, Month]]:
    """Every month and occurrence of a build as an entry, with the month it hangs on."""
    for month in almanac.months:
        key = month_key(month.year, month.month)
        yield Entry(almanac.calendar_id, key, month.starts, month.ends, month.standing, 0, stamp), month
    month_of = {(month.year, month.month): month for month in almanac.months}
    for one in almanac.occurrences:
        entry = Entry(almanac.calendar_id, one.key, one.starts, one.ends, one.standing, 0, stamp)
        yield entry, month_of[one.year, one.month]


def _compare(
    last: dict[tuple[str, str], Entry], fresh: Entry, month: Month, reasons: _Reasons,
    added: list[Entry], silent: list[str],
) -> None:
    """Add what changed of one thing to ``last`` and ``added``, or to ``silent`` where nothing explains it."""
    at = (fresh.calendar, fresh.key)
    known = last.get(at)
    if known is None:
        last[at] = fresh
        added.append(fresh)
        return
    is_month = fresh.key.startswith("month-")
    # A month's last day is the next month's business: only its first day is its own date.
    same_dates = fresh.starts == known.starts and (is_month or fresh.ends == known.ends)
    if same_dates:
        standing = known.standing if (fresh.standing, known.standing) == ("settled", "amended") else fresh.standing
        if standing == known.standing and fresh.ends == known.ends:
            return
        if standing == known.standing:
            last[at] = replace(known, ends=fresh.ends)
            return
        entry = replace(fresh, standing=standing, seq=known.seq + 1)
    else:
        # An observance's last days may hang on where the month ends, and so on the month after it.
        because = reasons.for_change(fresh.key, month.ordinal + (not is_month), known.at)
        if because is None:
            silent.append(_silent_line(known, fresh, month))
            return
        amended = known.standing in ("settled", "amended") and fresh.standing == "settled"
        entry = replace(
            fresh, standing="amended" if amended else fresh.standing, seq=known.seq + 1, was=known.starts,
            because=because,
        )
    last[at] = entry
    added.append(entry)


def _withdraw(
    last: dict[tuple[str, str], Entry], gone: Entry, year: int, reasons: _Reasons, stamp: datetime,
    added: list[Entry], silent: list[str],
) -> None:
    because = reasons.for_change(gone.key, year * 12 - 1, gone.at)
    if because is None:
        silent.append(
            f"{gone.key}: was {gone.starts} ({gone.standing}) -> would be withdrawn, "
            "because the content no longer gives it"
        )
        return
    entry = replace(gone, standing="withdrawn", seq=gone.seq + 1, at=stamp, was=None, because=because)
    last[gone.calendar, gone.key] = entry
    added.append(entry)


def _silent_line(known: Entry, fresh: Entry, month: Month) -> str:
    def days(entry: Entry) -> str:
        one = entry.starts == entry.ends or entry.key.startswith("month-")
        return f"{entry.starts}" if one else f"{entry.starts} to {entry.ends}"

    margin = month.margin
    because: str = month.basis
    if margin.value is not None and margin.threshold is not None:
        because += f", {margin.quantity} {margin.value:g} {margin.unit}".rstrip() + f" against {margin.threshold:g}"
    return (
        f"{known.key}: was {days(known)} ({known.standing}) -> would be {days(fresh)} ({fresh.standing}), because "
        f"{month.year}-{month.month:02d} begins {month.starts}: {because}"
    )


def _year_of(key: str) -> int | None:
    """The Hijri year in a key: the last number of three or four figures, for the name may hold one as well."""
    for part in reversed(key.split("-")[1:]):
        if part.isdigit() and len(part) in (3, 4):
            return int(part)
    return None


# --- lines ----------------------------------------------------------------------------------------


_PLAIN = ("calendar", "key", "standing", "seq", "because")
_STANDINGS = get_args(Known)
_NAME = re.compile(r"[a-z0-9]+(-[a-z0-9]+)*")
_TEXT: TypeAdapter[str] = TypeAdapter(Text)


def _line(entry: Entry) -> str:
    values = {name: value for name, value in asdict(entry).items() if value is not None}
    for name, value in values.items():
        if isinstance(value, datetime):
            values[name] = value.strftime("%Y-%m-%dT%H:%M:%SZ")
        elif isinstance(value, date):
            values[name] = value.isoformat()
    return json.dumps(values, ensure_ascii=False, separators=(",", ":"))


def _parsed(line: str) -> Entry:
    """Raises ValueError, KeyError, TypeError or RecursionError where the line is no entry.

    It is not trusted: whoever may write into the folder would otherwise write into every feed.
    """
    values = json.loads(line)
    calendar, key, standing, seq, because = (values.get(name) for name in _PLAIN)
    at = datetime.fromisoformat(values["at"])
    names = [name for name in (calendar, key) if isinstance(name, str) and _NAME.fullmatch(name)]
    is_whole = type(seq) is int and 0 <= seq < 2**31
    days = {name: date.fromisoformat(values[name]) for name in ("starts", "ends", "was") if name in values}
    are_near = all(1 < day.year < 9999 for day in (at, *days.values()))
    if len(names) < 2 or not is_whole or standing not in _STANDINGS or at.tzinfo is None or not are_near:
        raise ValueError(line)
    return Entry(
        calendar, key, days["starts"], days["ends"], standing, seq, at, days.get("was"),
        None if because is None else _TEXT.validate_python(because),
    )


def _refuse_contradictions(file: Path, entries: Sequence[Entry]) -> None:
    """Two lines of one key with the same ``seq`` and other days, which no later line has settled."""
    latest: dict[tuple[str, str], Entry] = {}
    clash: dict[tuple[str, str], tuple[Entry, Entry]] = {}
    for entry in entries:
        at = (entry.calendar, entry.key)
        known = latest.get(at)
        if known is None or entry.seq > known.seq:
            latest[at] = entry
            clash.pop(at, None)
        elif entry.seq == known.seq and (entry.starts, entry.standing) != (known.starts, known.standing):
            clash[at] = (known, entry)
    for one, other in clash.values():
        raise ContentError(
            file, 0,
            f"{one.key} was published from two copies on different days: {one.starts} ({one.standing}, {one.at:%F %R}) "
            f"and {other.starts} ({other.standing}, {other.at:%F %R})",
            f'keep both lines and add one with "seq":{one.seq + 1} that says which stands',
        )
