"""A community's own table of month starts: a CSV file beside policies.yaml."""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping
from datetime import date
from pathlib import Path

from moonwrit.errors import ContentError

MAX_BYTES = 2 * 1024 * 1024

Table = Mapping[int, date]
"""Months since Muharram of the year 1 (which is 0) -> first day."""


def read_table(file: Path) -> Table:
    """The month starts in ``file``: columns year, month and starts, every month once and in order.

    Raises ContentError where the file cannot be read, a line is not a month, or a month would not have
    29 or 30 days.
    """
    try:
        with file.open("rb") as stream:
            data = stream.read(MAX_BYTES + 1)
        if len(data) > MAX_BYTES:
            raise ContentError(file, 0, "the table is larger than 2 MB", "keep month starts alone in it")
        rows = csv.DictReader(io.StringIO(data.decode("utf-8-sig")))
        if set(rows.fieldnames or ()) != {"year", "month", "starts"}:
            mend = "name them so in the first line, in any order"
            raise ContentError(file, 1, "the columns must be year, month and starts", mend)
        return _starts(file, rows)
    except FileNotFoundError:
        raise ContentError(file, 0, "the file is missing", "put the table beside policies.yaml") from None
    except OSError as error:
        raise ContentError(file, 0, f"the file cannot be read ({error.strerror})", "make it readable") from None
    except (UnicodeDecodeError, csv.Error) as error:
        raise ContentError(file, 0, f"this is not a table ({error})", "save it as CSV, in UTF-8") from None


def _starts(file: Path, rows: csv.DictReader[str]) -> Table:
    out: dict[int, date] = {}
    before: int | None = None
    for row in rows:
        line = rows.line_num
        try:
            year, month = int(row["year"]), int(row["month"])
            ordinal = (year - 1) * 12 + month - 1
            starts = date.fromisoformat(row["starts"].strip())
            if not 1 <= month <= 12 or not 1 <= year <= 9999:
                raise ValueError(month)
        except (AttributeError, TypeError, ValueError):
            mend = "write for instance 1447,9,2026-02-18"
            raise ContentError(file, line, "this is not a month and its first day", mend) from None
        if before is not None and ordinal != before + 1:
            mend = "give every month once, in order"
            raise ContentError(file, line, "this month does not follow the one before", mend)
        if before is not None and (length := (starts - out[before]).days) not in (29, 30):
            what = f"the month before would have {length} days"
            raise ContentError(file, line, what, "a month has 29 or 30 days")
        out[ordinal], before = starts, ordinal
    if len(out) < 2:
        mend = "the last line only ends the month before"
        raise ContentError(file, 0, "there are fewer than two months in it", mend)
    return out


__all__ = ["Table", "read_table"]
