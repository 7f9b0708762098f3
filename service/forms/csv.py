"""An answer as CSV (RFC 4180): one table, a header row, cells that no spreadsheet runs."""

import csv
from collections.abc import Iterable, Mapping, Sequence
from io import StringIO
from typing import Any

RUNS_AS_FORMULA = ("=", "+", "-", "@", "\t", "\r", "\n")


def write(answer: Mapping[str, Any], tables: Mapping[str, Any]) -> str:
    """The first of `tables`."""
    table = next(iter(tables.values()))
    return rows_to_csv(table.columns, table.rows(answer))


def rows_to_csv(columns: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    """A header row, then the rows."""
    out = StringIO()
    writer = csv.writer(out, lineterminator="\r\n")
    writer.writerow(columns)
    writer.writerows([safe(cell) for cell in row] for row in rows)
    return out.getvalue()


def safe(cell: object) -> object:
    """`cell` as it may stand in a sheet: text that would run as a formula gets an apostrophe."""
    if isinstance(cell, str) and cell.startswith(RUNS_AS_FORMULA):
        return f"'{cell}"
    return "" if cell is None else cell
