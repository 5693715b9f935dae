"""A drawn sample as coding sheets and the round file that remembers them."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence

from relook import __version__
from relook.project.archive.codings import CODERS, KIND, UNSEEN
from relook.project.archive.decidable import SHEET_VARIABLES, variables_to_settings
from relook.project.archive.rounds import Round, RoundRow, RoundWorksheet
from relook.project.recoding.drawing import Sample
from relook.project.sending.issuing import IssuedRound, file_name
from relook.project.sending.sheets import sheet_variable, shown_columns
from relook.project.setup.loading import Loaded, shown_texts
from relook.worksheet.keys import (
    adjudicator_id,
    evidence_digests,
    keyed_order,
    row_keys,
    worksheet_id,
)
from relook.worksheet.layout import evidence_cells
from relook.worksheet.model import SheetRow, SheetVariable, Worksheet
from relook.worksheet.plan import Adjudicator
from relook.worksheet.write import write_worksheet


def coders_of(number: int, names: Sequence[str], secret: bytes) -> tuple[Adjudicator, ...]:
    """Return the coders of a coding; one person has another id in every coding."""
    return tuple(
        Adjudicator(id=adjudicator_id(secret, f"coding {number}: {name}"), name=name, coder=name)
        for name in names
    )


def issue_coding(
    loaded: Loaded,
    number: int,
    sample: Sample,
    dealt: Mapping[str, Sequence[str]],
    *,
    seed: int,
    unseen: bool,
    overlap: int,
    secret: bytes,
    stamp: str,
) -> IssuedRound:
    """Make the coding sheets of a coding and its round.json.

    Parameters
    ----------
    loaded : Loaded
        With the variables that are asked for.
    number : int
    sample : Sample
    dealt : mapping of str to sequence of str
        The items of each coder, by name.
    seed : int
    unseen : bool
        Whether only items were drawn from that nobody had been shown before.
    overlap : int
        Coders of each item.
    secret : bytes
    stamp : str
        ISO time to record.

    Raises
    ------
    RelookError
        A code book that cannot be read.
    """
    project = loaded.project
    variables = tuple(
        sheet_variable(held, loaded.agreements[name], project.root)
        for name, held in loaded.labels.variables.items()
    )
    people = coders_of(number, list(dealt), secret)
    files: dict[str, bytes] = {}
    sheets: list[RoundWorksheet] = []
    rows: list[RoundRow] = []
    for person in people:
        worksheet = _sheet(loaded, number, person, dealt[person.name], variables, secret, stamp)
        data = write_worksheet(worksheet)
        name = file_name(f"coding-{number:02d}", person, "", files)
        path = project.relative(project.codings.worksheets_folder(number) / name)
        files[path] = data
        sheets.append(
            RoundWorksheet(
                id=worksheet.id,
                adjudicator=person.id,
                file=path,
                digest=hashlib.sha256(data).hexdigest(),
                n_rows=len(worksheet.rows),
            )
        )
        rows += [
            RoundRow(
                key=row.key,
                item=row.item,
                variable=row.variable,
                worksheet=worksheet.id,
                adjudicator=person.id,
                kind=KIND,
                evidence=evidence_digests(evidence),
            )
            for row, evidence in zip(worksheet.rows, evidence_cells(worksheet), strict=True)
        ]
    held = Round(
        number=number,
        made=stamp,
        relook=__version__,
        project=project.settings.project,
        seed=seed,
        settings={
            CODERS: {person.id: person.name for person in people},
            UNSEEN: unseen,
            "overlap": overlap,
            "n_items": len(sample.items),
            "n_population": sample.n_population,
            "groups": {name: list(sizes) for name, sizes in sample.groups.items()},
            SHEET_VARIABLES: variables_to_settings(variables),
        },
        label_files={},
        variables=(),
        strata=(),
        worksheets=tuple(sheets),
        rows=tuple(rows),
    )
    return IssuedRound(held, files)


def _sheet(
    loaded: Loaded,
    number: int,
    person: Adjudicator,
    items: Sequence[str],
    variables: tuple[SheetVariable, ...],
    secret: bytes,
    stamp: str,
) -> Worksheet:
    """One coder's sheet: items in an order of its own, nothing of what anybody said of them."""
    settings = loaded.project.settings.worksheet
    identity = worksheet_id(secret, number, f"coding: {person.id}")
    order = keyed_order(secret, f"coding sheet {identity}", items)
    asked = [(items[at], variable.name) for at in order for variable in variables]
    columns = shown_columns(loaded)
    blank = ("",) * len(columns)
    return Worksheet(
        id=identity,
        project=loaded.project.settings.project,
        title=settings.title or loaded.project.title,
        round=number,
        adjudicator=person.name,
        variables=variables,
        shown_columns=columns,
        reasons=(),
        reveal="nothing",
        rows=tuple(
            SheetRow(
                key=key,
                item=item,
                variable=variable,
                shown=tuple(text for _, text in shown_texts(loaded, item)) or blank,
            )
            for key, (item, variable) in zip(row_keys(secret, identity, asked), asked, strict=True)
        ),
        may_show_other_labels=False,
        stamp=stamp,
        purpose="coding",
    )
