"""The labels with the decisions put in: one variable's corrected data, measured.

The labels that coders gave are never touched; what is made here is a second set beside them. Its
agreement is the agreement in the corrected data, and no reliability.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement, measure_agreement
from relook.core.decisions import Settlement
from relook.core.exact import IntArray
from relook.core.settling import (
    CANNOT_BE_CODED,
    CorrectedAgreement,
    agreement_after,
    corrected_labels,
)
from relook.errors import Place, Problem, RelookError
from relook.project.archive.decidable import takes_numbers
from relook.project.setup.loading import Loaded
from relook.project.setup.settings import SETTINGS_FILE
from relook.tables.labels import VariableLabels
from relook.tables.schema import Variable
from relook.tables.values import code_values

#: States whose decision enters the corrected data; in all others the coders' labels stand.
ENTERING = ("settled", "cannot be coded")


@dataclass(frozen=True, slots=True, eq=False)
class Corrected:
    """One variable before and after its decisions.

    Attributes
    ----------
    variable : Variable
    texts : tuple of str
        The label of each value code, decisions that nobody gave as a label included.
    given : Agreement
        Of the labels as coders gave them, under these codes; its figures are those of the labels
        alone.
    settled : tuple of Settlement
        Those that enter, in the order of `item_index`.
    item_index : int array of shape (n,)
        Ascending.
    decided : int array of shape (n,)
        Value codes, `CANNOT_BE_CODED` where the item was ruled so.
    after : CorrectedAgreement
    measured : Agreement
        The corrected data in full. For what remains, not for its alpha.
    common : Agreement
        The labels as given on the items that are in both: all but those that cannot be coded.
    """

    variable: Variable
    texts: tuple[str, ...]
    given: Agreement
    settled: tuple[Settlement, ...]
    item_index: IntArray
    decided: IntArray
    after: CorrectedAgreement
    measured: Agreement
    common: Agreement


def correct(loaded: Loaded, name: str, settled: Mapping[tuple[str, str], Settlement]) -> Corrected:
    """Put the decisions on one variable into its labels.

    Parameters
    ----------
    loaded : Loaded
    name : str
        Of the variable.
    settled : mapping of (item, variable) to Settlement
        Only those that are settled or cannot be coded enter. Items that are gone from the label
        table are passed over.

    Raises
    ------
    RelookError
        Decisions that relook.toml no longer allows, all of them at once.
    """
    held, agreement = loaded.labels.variables[name], loaded.agreements[name]
    own = [each for key, each in settled.items() if key[1] == name and each.state in ENTERING]
    numbers = loaded.item_numbers([each.item for each in own])
    order = [int(at) for at in np.argsort(numbers, kind="stable") if numbers[at] >= 0]
    entering = tuple(own[at] for at in order)
    item_index = np.asarray(numbers[order], dtype=np.int64)
    recoded, texts, code_of = with_decisions(
        held, agreement, [each.label for each in entering if each.label is not None]
    )
    decided = np.array(
        [CANNOT_BE_CODED if each.label is None else code_of[each.label] for each in entering],
        dtype=np.int64,
    )
    put_in = corrected_labels(recoded.labels, item_index, decided, recoded.values.n_values)
    unusable = np.zeros(recoded.labels.n_items, dtype=bool)
    unusable[item_index[decided == CANNOT_BE_CODED]] = True
    kept = recoded.labels.where(~unusable[recoded.labels.item_index])
    tolerance = held.variable.tolerance
    function, values = recoded.function, recoded.values
    return Corrected(
        variable=held.variable,
        texts=texts,
        given=recoded,
        settled=entering,
        item_index=item_index,
        decided=decided,
        after=agreement_after(recoded, item_index, decided),
        measured=measure_agreement(put_in, function, values, tolerance=tolerance),
        common=measure_agreement(kept, function, values, tolerance=tolerance),
    )


def with_decisions(
    held: VariableLabels, agreement: Agreement, decisions: Sequence[str]
) -> tuple[Agreement, tuple[str, ...], dict[str, int]]:
    """Give labels and decisions one set of value codes.

    Parameters
    ----------
    held : VariableLabels
    agreement : Agreement
        Of its labels.
    decisions : sequence of str
        Labels that were decided, those that nobody gave among them.

    Returns
    -------
    agreement : Agreement
        The same labels under the new codes.
    texts : tuple of str
    code_of : dict of str to int
        The code of each decision.

    Raises
    ------
    RelookError
        Decisions that the variable's declaration does not allow.
    """
    wanted = list(dict.fromkeys(decisions))
    written = {text: as_written(held, text) for text in wanted}
    added = [text for text in dict.fromkeys(written.values()) if text not in held.texts]
    if not added:
        code_of_text = {text: code for code, text in enumerate(held.texts)}
        return agreement, held.texts, {text: code_of_text[written[text]] for text in wanted}
    every = [*held.texts, *added]
    coded = code_values(held.variable, every)
    if coded.bad:
        raise RelookError.from_problems(
            [
                Problem(
                    f'a decision on "{held.variable.name}" cannot be put in: {bad.message}',
                    Place(SETTINGS_FILE),
                    f"let [variables.{held.variable.name}] allow it again, or collect another "
                    "decision",
                )
                for bad in coded.bad.values()
            ]
        )
    labels = agreement.labels.recoded(coded.code_of_text[: len(held.texts)], len(coded.texts))
    again = measure_agreement(
        labels, agreement.function, coded.values, tolerance=held.variable.tolerance
    )
    code = dict(zip(every, coded.code_of_text.tolist(), strict=True))
    return again, coded.texts, {text: code[written[text]] for text in wanted}


def as_written(held: VariableLabels, decision: str) -> str:
    """Return a decided number with the table's decimal mark, anything else as it stands."""
    if decision in held.texts or held.variable.decimal == "." or not takes_numbers(held.variable):
        return decision
    return decision.replace(".", held.variable.decimal)
