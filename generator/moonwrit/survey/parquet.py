"""The tables of a survey once more as Parquet, typed; the extra ``parquet`` brings the library."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

from moonwrit.errors import RequestError
from moonwrit.survey.schema import TABLES

_BLOCK = 1 << 24
"""Bytes of a CSV file read at a time; each becomes a group of rows."""


def library() -> Any:
    """pyarrow. Raises RequestError where it is not installed."""
    try:
        import pyarrow.csv
        import pyarrow.parquet
    except ImportError:
        raise RequestError("--parquet needs the extra parquet", "pip install 'moonwrit[parquet]'") from None
    return pyarrow


def write_parquet(output: Path) -> None:
    """Each table of the folder ``output`` beside its CSV file, with the same columns and values.

    What is empty there is null. Equal tables give equal bytes: a Parquet file names the library that wrote it, no time.
    """
    arrow = library()
    types = {"string": arrow.string(), "integer": arrow.int32(), "number": arrow.float64()}
    for name, columns in TABLES.items():
        table = arrow.schema([(column, types[_type(form)]) for column, form in columns.items()])
        aside = output / f".{name}.parquet.{os.getpid()}"
        try:
            with (
                arrow.csv.open_csv(
                    output / f"{name}.csv",
                    arrow.csv.ReadOptions(block_size=_BLOCK),
                    arrow.csv.ParseOptions(newlines_in_values=True),
                    arrow.csv.ConvertOptions(column_types=table, null_values=[""], strings_can_be_null=True),
                ) as rows,
                arrow.parquet.ParquetWriter(aside, table) as writer,
            ):
                for block in rows:
                    writer.write_batch(block)
            os.replace(aside, output / f"{name}.parquet")
        except OSError as fault:
            raise RequestError(f"{output} cannot be written ({fault.strerror or fault})",
                               "free space, and run again: what is finished is kept") from None
        finally:
            aside.unlink(missing_ok=True)


def _type(form: dict[str, Any]) -> str:
    """Of a column, by its JSON Schema: what may be null says so beside its type."""
    kind = form["type"]
    return str(kind if isinstance(kind, str) else kind[0])
