"""Codings: fresh labels that coders gave to a sample, each coding with its own sheets and record.

The label tables are coding 1. A later one is kept as a round is, in the folder `codings`; what its
coders wrote is recorded as decisions are, and the last word of each coder is their label.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd

from relook.core.decisions import Decision, standing_decisions
from relook.errors import RelookError
from relook.project.archive.record import Record, read_record
from relook.project.archive.rounds import Round, read_rounds
from relook.project.setup.folder import Project
from relook.project.setup.loading import Loaded, measure
from relook.tables.columns import LabelColumn, labels_of_columns
from relook.tables.items import read_items
from relook.tables.labels import LabelData
from relook.tables.schema import Variable

#: The number of the coding that the label tables hold.
FIRST_CODING = 1
#: Keys of a coding's settings: the coders' names by id, and whether only items were drawn that
#: nobody had been shown before.
CODERS = "coders"
UNSEEN = "unseen"
KIND = "coding"


def read_codings(project: Project) -> list[Round]:
    """Return the codings after the first, in order.

    Raises
    ------
    RelookError
        As `read_rounds`.
    """
    return read_rounds(project.codings)


def coding_numbered(project: Project, number: int) -> Round:
    """Return a coding by its number.

    Raises
    ------
    RelookError
        There is no such coding.
    """
    codings = read_codings(project)
    for held in codings:
        if held.number == number:
            return held
    known = ", ".join(str(held.number) for held in codings)
    raise RelookError(
        f"there is no coding {number}",
        mend=f"coding 1 is that of the label tables; later ones: {known}"
        if known
        else "coding 1 is that of the label tables; `relook recode` draws another",
    )


def labels_given(record: Record, held: Round) -> list[Decision]:
    """Return the standing answers of one coding, "cannot be coded" included."""
    own = [decision for decision in record.decisions if decision.round == held.number]
    return [decision for kept in standing_decisions(own).values() for decision in kept]


def load_coding(project: Project, held: Round, *, only: Sequence[str] | None = None) -> Loaded:
    """Return the labels of a coding as those of a project's tables are returned.

    Parameters
    ----------
    project : Project
    held : Round
        The coding.
    only : sequence of str, optional
        Names of the variables; all that the coding asked for where left out.

    Returns
    -------
    Loaded
        Its items are those of the coding. Rows that are still open or cannot be coded count as
        missing.

    Raises
    ------
    RelookError
        No label is back yet, a variable that the coding did not ask for, labels that no longer fit
        their declaration, or tables that cannot be read.
    """
    asked = dict.fromkeys(row.variable for row in held.rows)
    settings = project.settings
    names = [settings.variable(name).name for name in only] if only else list(asked)
    strangers = [name for name in names if name not in asked]
    if strangers:
        raise RelookError(
            f'coding {held.number} did not ask for "{strangers[0]}"',
            mend=f"it asked for {', '.join(asked)}",
        )
    given = labels_given(read_record(project.codings), held)
    if not any(each.ruling == "label" for each in given):
        raise RelookError(
            f"no label of coding {held.number} is back yet",
            mend="collect its coding sheets with `relook collect`",
        )
    variables = [settings.variable(name) for name in names]
    labels = _label_data(held, given, variables, project)
    items = read_items(settings.items, project.root) if settings.items is not None else None
    agreements = {name: measure(found) for name, found in labels.variables.items()}
    return Loaded(project.codings, labels, items, agreements)


def _label_data(
    held: Round, given: Sequence[Decision], variables: Sequence[Variable], project: Project
) -> LabelData:
    items = list(dict.fromkeys(row.item for row in held.rows))
    coder_names: dict[str, str] = held.settings[CODERS]
    coders = list(coder_names)
    columns = {}
    for variable in variables:
        own = [each for each in given if each.variable == variable.name and each.label is not None]
        text, texts = pd.factorize(np.array([each.label for each in own], dtype=object))
        sent = sum(row.variable == variable.name for row in held.rows)
        columns[variable.name] = LabelColumn(
            item=pd.Index(items).get_indexer(pd.Index([each.item for each in own], dtype=object)),
            coder=pd.Index(coders).get_indexer(
                pd.Index([each.adjudicator for each in own], dtype=object)
            ),
            text=text,
            row=np.arange(len(own)),
            texts=np.asarray(texts, dtype=object),
            n_missing=sent - len(own),
        )
    return labels_of_columns(
        columns,
        variables,
        items=items,
        coders=[coder_names[coder] for coder in coders],
        source=f"coding {held.number}",
        root=project.root,
    )
