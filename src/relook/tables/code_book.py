"""Code books and tables of differences: small tables that a variable's settings name."""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path

from relook.core.differences import DifferenceTable
from relook.errors import Problem, RelookError
from relook.tables.headers import fold
from relook.tables.numbers import parse_number
from relook.tables.reading import Table, read_table
from relook.tables.schema import Variable

#: Headers that a code book may have, each with the other names it goes by.
_COLUMNS = {
    "label": ("label", "code", "value"),
    "meaning": ("meaning", "definition", "description"),
    "example": ("example", "examples"),
    "parent": ("parent", "above", "under"),
}


@dataclass(frozen=True, slots=True)
class CodeBookLine:
    """One label of a code book, with the row it stands in."""

    label: str
    meaning: str = ""
    example: str = ""
    parent: str = ""
    row: int = 0


@dataclass(frozen=True, slots=True)
class CodeBook:
    """A code book.

    Attributes
    ----------
    lines : tuple of CodeBookLine
        In the order of the file.
    file, digest, said : str
    """

    lines: tuple[CodeBookLine, ...]
    file: str
    digest: str
    said: str

    @property
    def labels(self) -> tuple[str, ...]:
        """The labels, in the order of the file."""
        return tuple(line.label for line in self.lines)


def read_code_book(path: Path, root: Path) -> CodeBook:
    """Read a code book: a column `label`, and `meaning`, `example`, `parent` where it has them.

    Parameters
    ----------
    path : Path
        Relative to `root`, or absolute.
    root : Path

    Raises
    ------
    RelookError
        No such file, no column of labels, a label without text, or a label listed twice.
    """
    table = read_table(path, root)
    columns = {name: _column(table, names) for name, names in _COLUMNS.items()}
    label = columns["label"]
    if label is None:
        label = table.find("label", "the labels of the code book")
    texts = {
        name: [""] * table.n_rows if at is None else list(table.texts(at))
        for name, at in columns.items()
        if name != "label"
    }
    problems: list[Problem] = []
    first: dict[str, int] = {}
    lines = []
    for at, text in enumerate(table.texts(label)):
        row = int(table.rows[at])
        if not text.strip():
            problems.append(
                Problem("the row has no label", table.at(row, label), "fill it in, or delete it")
            )
        elif text in first:
            problems.append(
                Problem(
                    f'the label "{text}" is in row {first[text]} already',
                    table.at(row, label),
                    "keep one of the two rows",
                )
            )
        else:
            first[text] = row
            lines.append(
                CodeBookLine(
                    text,
                    str(texts["meaning"][at]),
                    str(texts["example"][at]),
                    str(texts["parent"][at]),
                    row,
                )
            )
    if problems:
        raise RelookError.from_problems(problems)
    return CodeBook(tuple(lines), table.file, table.digest, table.said)


def _column(table: Table, names: tuple[str, ...]) -> int | None:
    for name in names:
        for at, header in enumerate(table.header):
            if fold(header) == name:
                return at
    return None


def read_difference_table(path: Path, root: Path) -> DifferenceTable:
    """Read a table of differences: labels down the first column and along the header.

    Raises
    ------
    RelookError
        Labels that differ between rows and columns, cells that are no numbers, or differences that
        are not symmetric, are negative, or are not 0 between a label and itself; each with its row
        and column.
    """
    table = read_table(path, root)
    across = table.header[1:]
    down = [str(text) for text in table.texts(0)]
    problems = [
        Problem(
            f'the label "{label}" has a row but no column',
            table.at(int(table.rows[at]), 0),
            "give it a column too, in the same order",
        )
        for at, label in enumerate(down)
        if label not in across
    ]
    problems += [
        Problem(f'the label "{label}" has a column but no row', table.place, "give it a row too")
        for label in across
        if label not in down
    ]
    for name, labels in (("row", down), ("column", list(across))):
        problems += [
            Problem(
                f'the label "{label}" has {labels.count(label)} {name}s', table.place, "keep one"
            )
            for label in dict.fromkeys(labels)
            if labels.count(label) > 1
        ]
    if problems:
        raise RelookError.from_problems(problems)
    entries: list[tuple[Fraction, ...]] = []
    for at in range(table.n_rows):
        found: list[Fraction] = []
        for label in down:
            column = 1 + across.index(label)
            text = str(table.frame[column].iloc[at])
            number = parse_number(text)
            if number is None:
                problems.append(
                    Problem(
                        f'"{text}" is not a number' if text.strip() else "the cell is empty",
                        table.at(int(table.rows[at]), column),
                        "write a difference of 0 or more",
                    )
                )
            found.append(number or Fraction(0))
        entries.append(tuple(found))
    differences = DifferenceTable(tuple(down), tuple(entries))
    if not problems:
        problems = [
            Problem(
                reason,
                table.at(int(table.rows[row]), 1 + across.index(down[column])),
                "differences are symmetric, 0 or more, and 0 between a label and itself",
            )
            for row, column, reason in differences.faults()
        ]
    if problems:
        raise RelookError.from_problems(problems)
    return differences


def with_difference_table(variable: Variable, root: Path) -> Variable:
    """Return the variable with its table of differences read, where its settings name a file."""
    named = variable.options.get("table")
    if variable.difference != "table" or not isinstance(named, str | Path):
        return variable
    read = read_difference_table(Path(named), root)
    return replace(variable, options={**variable.options, "table": read})
