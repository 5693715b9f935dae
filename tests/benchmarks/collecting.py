"""How long collecting takes, beside openpyxl's read-only reading of the same files.

Run as: PYTHONPATH=src:tests python tests/benchmarks/collecting.py [WORKSHEETS] [ROWS]
"""

from __future__ import annotations

import io
import sys
import tempfile
import time
from pathlib import Path

from openpyxl import load_workbook

from reference.small_project import NOW, TOPICS, fill, give_back, make_project, make_worksheet
from relook.project.returning.collecting import collect


def main(n_worksheets: int, n_rows: int) -> None:
    """Print both times and their ratio."""
    sheets = [
        make_worksheet(adjudicator=f"adjudicator {number}", n_items=n_rows)
        for number in range(n_worksheets)
    ]
    with tempfile.TemporaryDirectory() as folder:
        project, sent = make_project(Path(folder) / "project", sheets)
        decisions = {row: TOPICS[row % 3] for row in range(n_rows)}
        for name, data in sent.items():
            give_back(project, f"{name}.xlsx", fill(data, dict(decisions)))
        files = [path.read_bytes() for path in sorted(project.returned_folder(1).glob("*.xlsx"))]
        begun = time.perf_counter()
        cells = 0
        for data in files:
            book = load_workbook(io.BytesIO(data), read_only=True)
            for sheet in book.worksheets:
                sheet.reset_dimensions()
                cells += sum(len(row) for row in sheet.iter_rows(values_only=True))
        reading = time.perf_counter() - begun
        begun = time.perf_counter()
        result = collect(project, None, now=NOW)
        collecting = time.perf_counter() - begun
        sys.stdout.write(
            f"{n_worksheets} worksheets of {n_rows} rows, {result.accepted:,} decisions taken\n"
            f"openpyxl, read-only: {reading:.2f} s ({cells:,} cells)\n"
            f"collect: {collecting:.2f} s, {collecting / reading:.2f} times that\n"
        )


if __name__ == "__main__":
    wanted = [int(each) for each in sys.argv[1:3]]
    main(*(wanted if len(wanted) == 2 else (100, 500)))
