"""Label tables to coded labels: every file read, every problem found, in one pass."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path, PurePosixPath

import numpy as np

from relook.core.differences import Values
from relook.core.exact import IntArray
from relook.core.labels import CodedLabels
from relook.errors import Place, Problem, RelookError, listed, nearest
from relook.tables.code_book import with_difference_table
from relook.tables.coding import Coding, Context, code_variable
from relook.tables.findings import Findings
from relook.tables.joining import Flat, Joined, join
from relook.tables.layouts import FileParts, take_apart, wanted_columns
from relook.tables.reading import Table, Texts, display_name, find_files, read_table
from relook.tables.schema import LabelSource, Variable


@dataclass(frozen=True, slots=True, eq=False)
class VariableLabels:
    """The labels of one variable, each with the place it came from.

    Attributes
    ----------
    variable : Variable
    texts : tuple of str
        The label of each value code: as declared; else numbers by size and words by code point.
    labels : CodedLabels
        Item codes into `LabelData.items`, coder codes into `LabelData.coders`; sorted by item, then
        coder.
    values : Values
    n_missing : int
        Cells that hold a missing marker, coders that were left out included.
    file_index, column_index, rows : int arrays of shape (n_labels,)
        Into `LabelData.files`, into that file's header, and the row of the spreadsheet.
    remarks : object array of shape (n_labels,) or None
        Each coder's remark on a label, "" where there is none.
    """

    variable: Variable
    texts: tuple[str, ...]
    labels: CodedLabels
    values: Values
    n_missing: int
    file_index: IntArray
    column_index: IntArray
    rows: IntArray
    remarks: Texts | None = None


@dataclass(frozen=True, slots=True, eq=False)
class LabelData:
    """All labels of a project.

    Attributes
    ----------
    items : object array of shape (n_items,)
        Item ids in order of first appearance, those without a label included.
    coders : tuple of str
        In order of first appearance; those left out are not among them. Empty for counts.
    variables : dict of str to VariableLabels
    digests : dict of str to str
        SHA-256 of each label file by its displayed path.
    problems : tuple of Problem
        Warnings and notes; errors are raised.
    said : tuple of str
        One line per file on how it was read, and one per coder left out.
    files, sheets : tuples of length n_files
        Displayed paths, and sheet titles (None where the file is no workbook).
    headers : tuple of tuple of str
    left_out : dict of str to int
        How many labels of each coder were left out.
    """

    items: Texts
    coders: tuple[str, ...]
    variables: dict[str, VariableLabels]
    digests: dict[str, str]
    problems: tuple[Problem, ...] = ()
    said: tuple[str, ...] = ()
    files: tuple[str, ...] = ()
    sheets: tuple[str | None, ...] = ()
    headers: tuple[tuple[str, ...], ...] = ()
    left_out: dict[str, int] = field(default_factory=dict)

    def place(self, variable: str, label: int) -> Place:
        """Return where a label stands: file, sheet, row and column.

        Parameters
        ----------
        variable : str
        label : int
            Position in the variable's labels.
        """
        found = self.variables[variable]
        file = int(found.file_index[label])
        column = self.headers[file][int(found.column_index[label])]
        return Place(self.files[file], self.sheets[file], int(found.rows[label]), column)


def read_labels(
    source: LabelSource,
    variables: Sequence[Variable],
    root: Path,
    known: dict[Path, Table] | None = None,
) -> LabelData:
    """Read all label tables of a project.

    Parameters
    ----------
    source : LabelSource
    variables : sequence of Variable
        At least one.
    root : Path
        The folder that paths are relative to.
    known : dict of Path to Table, optional
        Tables that were read already, by whole path; those that are used are taken out of it.

    Returns
    -------
    LabelData

    Raises
    ------
    RelookError
        With every error found in any of the files as its `problems`.
    """
    data, findings = survey_labels(source, variables, root, known)
    if data is None or findings.any_errors:
        findings.raise_errors()
    assert data is not None
    return data


def survey_labels(
    source: LabelSource,
    variables: Sequence[Variable],
    root: Path,
    known: dict[Path, Table] | None = None,
) -> tuple[LabelData | None, Findings]:
    """Read all that can be read, errors or not, for a check that wants to see everything.

    Returns
    -------
    data : LabelData or None
        Without the labels that are in error; None where nothing could be read.
    findings : Findings
        Errors among them.
    """
    if not variables:
        raise RelookError("no variable is named", mend="name the column that holds the labels")
    findings = Findings()
    tables, parts = _read_files(source, variables, root, {} if known is None else known, findings)
    joined = join(parts, [variable.name for variable in variables])
    joined, left_out = _leave_out(joined, source, findings)
    context = Context(tables, joined.items, joined.coders, source.duplicates, findings)
    found: dict[str, VariableLabels] = {}
    for declared in variables:
        variable = findings.attempt(partial(with_difference_table, declared, root))
        if variable is None:
            continue
        flat = joined.flats[variable.name]
        coding = code_variable(variable, flat, context)
        if coding is None:
            continue
        found[variable.name] = variable_labels(variable, coding)
        if flat.text.size == 0 and not findings.any_errors:
            findings.add(
                f'the variable "{variable.name}" has no labels: every cell is empty or a missing '
                "marker",
                tables[0].place if tables else None,
                "check the column and the missing markers",
            )
    if not tables:
        return None, findings
    said = [table.said for table in tables]
    said += [f'coder "{name}" left out ({n:,} labels)' for name, n in left_out.items()]
    data = LabelData(
        joined.items,
        tuple(joined.coders),
        found,
        {table.file: table.digest for table in tables},
        findings.sorted(),
        tuple(said),
        tuple(table.file for table in tables),
        tuple(table.sheet for table in tables),
        tuple(table.header for table in tables),
        left_out,
    )
    return data, findings


def _read_files(
    source: LabelSource,
    variables: Sequence[Variable],
    root: Path,
    known: dict[Path, Table],
    findings: Findings,
) -> tuple[list[Table], list[FileParts]]:
    files = findings.attempt(lambda: find_files(source.files, root)) or ()
    wanted = wanted_columns(source, variables)
    tables: list[Table] = []
    parts: list[FileParts] = []
    for path in files:
        try:
            # Taken and not kept, so that its memory is free once the labels are coded.
            held = known.pop((root / path).resolve(), None)
            table = (
                held.named(display_name(path, root))
                if held is not None
                else read_table(
                    path,
                    root,
                    sheet=source.sheet,
                    delimiter=source.delimiter,
                    encoding=source.encoding,
                    wanted=wanted,
                )
            )
            parts.append(take_apart(table, source, variables, findings))
            tables.append(table)
        except RelookError as error:
            findings.take(error)
    if source.coder_from == "file":
        _check_file_names(tables, findings)
    return tables, parts


def _check_file_names(tables: Sequence[Table], findings: Findings) -> None:
    first: dict[str, str] = {}
    for table in tables:
        stem = PurePosixPath(table.file).stem
        if stem in first:
            findings.add(
                f'two files stand for the coder "{stem}": this one and {first[stem]}',
                Place(table.file),
                "rename one of them, or leave it out",
            )
        first.setdefault(stem, table.file)


def _leave_out(
    joined: Joined, source: LabelSource, findings: Findings
) -> tuple[Joined, dict[str, int]]:
    """Take out the coders that are left out, and their codes with them."""
    if not source.leave_out:
        return joined, {}
    names = [str(name) for name in joined.coders]
    for name in source.leave_out:
        if name not in names and names:
            close = nearest(name, names)
            findings.add(
                f'the coder to leave out, "{name}", is not there; the coders are {listed(names)}',
                None,
                f'did you mean "{close}"?' if close else "correct leave_out",
                "warning",
            )
    gone = np.array([name in source.leave_out for name in names], dtype=bool)
    if not gone.any():
        return joined, {}
    new_code = np.cumsum(~gone) - 1
    counts = np.zeros(len(names), dtype=np.int64)
    flats: dict[str, Flat] = {}
    for name, flat in joined.flats.items():
        if flat.coder is None:
            flats[name] = flat
            continue
        counts += np.bincount(flat.coder, minlength=len(names))
        kept = flat.take(~gone[flat.coder])
        assert kept.coder is not None
        kept.coder[:] = new_code[kept.coder]
        flats[name] = kept
    left_out = {name: int(counts[at]) for at, name in enumerate(names) if gone[at]}
    return Joined(joined.items, joined.coders[~gone], flats), left_out


def variable_labels(variable: Variable, coding: Coding) -> VariableLabels:
    """Return the coded labels of a variable with the places they came from."""
    flat = coding.flat
    return VariableLabels(
        variable,
        coding.coded.texts,
        coding.labels,
        coding.coded.values,
        flat.n_missing,
        flat.file,
        flat.column,
        flat.row,
        flat.remark,
    )
