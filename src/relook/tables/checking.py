"""Everything that may be wrong with a project's tables, found in one pass."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from relook.errors import Place, Problem, listed
from relook.tables.checked_items import check_item_table, check_shown_columns
from relook.tables.checked_labels import check_coders, check_variable
from relook.tables.code_book import read_code_book
from relook.tables.findings import Findings
from relook.tables.items import ItemData, survey_items
from relook.tables.labels import LabelData, survey_labels
from relook.tables.schema import ItemSource, LabelSource, Variable
from relook.tables.twins import near_twins

#: Names listed in one message.
_NAMED = 5


@dataclass(frozen=True, slots=True, eq=False)
class Checked:
    """What a check found.

    Attributes
    ----------
    problems : tuple of Problem
        Errors, then warnings, then notes; each by file and row.
    said : tuple of str
        A line per file on how it was read.
    labels : LabelData or None
        What could be read, labels in error left out.
    items : ItemData or None
    """

    problems: tuple[Problem, ...]
    said: tuple[str, ...]
    labels: LabelData | None
    items: ItemData | None


def check_tables(
    source: LabelSource,
    variables: Sequence[Variable],
    items: ItemSource | None,
    root: Path,
) -> Checked:
    """Read all tables of a project and look for anything that may be wrong.

    Parameters
    ----------
    source : LabelSource
    variables : sequence of Variable
    items : ItemSource or None
    root : Path
        The folder that paths are relative to.
    """
    labels, findings = survey_labels(source, variables, root)
    item_data = None
    if items is not None:
        item_data, more = survey_items(items, root)
        findings.extend(more.sorted())
    said = list(labels.said) if labels is not None else []
    said += item_data.said if item_data is not None else ()
    said += _check_code_books(variables, root, findings)
    if labels is not None:
        _check_names(labels, findings)
        for name in labels.variables:
            check_variable(labels, name, findings)
        check_coders(labels, findings)
        if item_data is not None and items is not None:
            check_item_table(labels, item_data, findings)
            check_shown_columns(labels, item_data, items, findings)
    return Checked(findings.sorted(), tuple(said), labels, item_data)


def _check_names(labels: LabelData, findings: Findings) -> None:
    """Item ids and coders that are one to the eye."""
    where = Place(labels.files[0]) if len(labels.files) == 1 else None
    for what, names in (("item", [str(i) for i in labels.items]), ("coder", labels.coders)):
        twins = near_twins(dict.fromkeys(names, 1))
        for pair in twins[: findings.room("warning")]:
            findings.add(
                f'the {what}s "{pair.kept}" and "{pair.other}" differ only by {pair.how}, and '
                "count as two",
                where,
                f"write one of them throughout, if they are one {what}",
                "warning",
            )


def _check_code_books(variables: Sequence[Variable], root: Path, findings: Findings) -> list[str]:
    said = []
    for variable in variables:
        if variable.code_book is None:
            continue
        path = variable.code_book
        book = findings.attempt(lambda path=path: read_code_book(path, root))  # type: ignore[misc]
        if book is None:
            continue
        said.append(book.said)
        if variable.labels is None:
            continue
        lacking = [label for label in variable.labels if label not in book.labels]
        extra = [label for label in book.labels if label not in variable.labels]
        if lacking:
            findings.add(
                f"the code book does not explain {listed(lacking, most=_NAMED)} of "
                f'"{variable.name}"',
                Place(book.file),
                "add a row for each",
                "warning",
            )
        if extra:
            findings.add(
                f"the code book explains {listed(extra, most=_NAMED)}, not declared for "
                f'"{variable.name}"',
                Place(book.file),
                "declare the labels, or take them out of the code book",
                "warning",
            )
    return said
