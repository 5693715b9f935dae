"""Result tables as CSV bytes: text as it is, numbers to their last digit."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import pandas as pd

from relook.errors import Problem


def csv_bytes(frame: pd.DataFrame) -> bytes:
    """Return a frame as CSV in UTF-8, line feeds at the line ends, undefined cells empty.

    Floats are written by their shortest text that reads back to the same number.
    """
    return frame.to_csv(index=False, lineterminator="\n").encode("utf-8")


def rows_csv(rows: Iterable[dict[str, object]], columns: Sequence[str]) -> bytes:
    """Return rows, each a mapping of column to value, as CSV with just these columns."""
    frame = pd.DataFrame(list(rows), columns=list(columns), dtype=object)
    return csv_bytes(frame)


def problems_csv(problems: Iterable[Problem]) -> bytes:
    """Return problems as CSV: severity, file, sheet, row, column, message, mend."""
    columns = ("severity", "file", "sheet", "row", "column", "message", "mend")
    rows: list[dict[str, object]] = []
    for problem in problems:
        where = problem.where
        rows.append(
            {
                "severity": problem.severity,
                "file": where and where.file,
                "sheet": where and where.sheet,
                "row": where and where.row,
                "column": where and where.column,
                "message": problem.message,
                "mend": problem.mend,
            }
        )
    return rows_csv(rows, columns)
