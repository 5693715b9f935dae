"""Labels that coders corrected themselves: what changed, by whom, toward the others or away.

Corrected labels were made by people who knew that they had differed, so whatever agreement they
reach is no reliability. They are kept as a label version
(`relook.project.corrections.label_versions`) and can be released.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from relook.core.agreement import Agreement
from relook.core.settling import CANNOT_BE_CODED
from relook.errors import ExitCode, Place, RelookError
from relook.project.archive.independence import check_independence
from relook.project.archive.rounds import read_rounds
from relook.project.corrections.label_versions import LabelVersion, reading_tables, write_version
from relook.project.outcome.corrected import with_decisions
from relook.project.setup.loading import Loaded, load

DIRECTIONS = ("toward", "away", "neither", "alone")
#: Where a table lacks more than this share of the labels, it is told to be perhaps not whole.
MOST_REMOVED = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """A label that is another one in the corrected table.

    Attributes
    ----------
    item, coder : str
    old, new : str
    direction : str
        "toward" the other labels of the item as they were first given, where the mean δ² to them
        shrank; "away" where it grew; "neither"; "alone" where there are no others.
    """

    item: str
    coder: str
    old: str
    new: str
    direction: str


@dataclass(frozen=True, slots=True, kw_only=True)
class CoderChanges:
    """What one coder changed.

    Attributes
    ----------
    coder : str
    n_labels : int
        As first given.
    n_changed, n_added, n_removed : int
    directions : dict of str to int
        Of the changed ones, by `DIRECTIONS`.
    """

    coder: str
    n_labels: int
    n_changed: int
    n_added: int
    n_removed: int
    directions: dict[str, int]


@dataclass(frozen=True, slots=True, kw_only=True)
class VariableCorrection:
    """One variable as first given and as its coders corrected it.

    Attributes
    ----------
    name : str
    before, after : Agreement
        `after` is of labels that are not independent.
    changes : tuple of Change
    coders : tuple of CoderChanges
    """

    name: str
    before: Agreement
    after: Agreement
    changes: tuple[Change, ...]
    coders: tuple[CoderChanges, ...]

    @property
    def n_added(self) -> int:
        """Labels that were not there before."""
        return sum(each.n_added for each in self.coders)

    @property
    def n_removed(self) -> int:
        """Labels that are no longer there."""
        return sum(each.n_removed for each in self.coders)

    @property
    def directions(self) -> dict[str, int]:
        """How many changes went which way."""
        counts = Counter(change.direction for change in self.changes)
        return {direction: counts[direction] for direction in DIRECTIONS}


@dataclass(frozen=True, slots=True, kw_only=True)
class Correction:
    """Everything that `relook rescore --against` says.

    Attributes
    ----------
    loaded, corrected : Loaded
        The project's own labels, and those of the tables.
    independent : bool
        Whether the project's own labels are those of its first round.
    variables : tuple of VariableCorrection
    """

    loaded: Loaded
    corrected: Loaded
    independent: bool
    variables: tuple[VariableCorrection, ...]

    @property
    def n_changes(self) -> int:
        """Labels changed, added or removed on all variables."""
        return sum(len(each.changes) + each.n_added + each.n_removed for each in self.variables)


def compare_with(
    loaded: Loaded,
    tables: Sequence[Path],
    *,
    only: Sequence[str] | None = None,
    relabelled: bool = False,
) -> Correction:
    """Compare corrected tables with the labels as first given.

    Parameters
    ----------
    loaded : Loaded
    tables : sequence of Path
        In the layout of the project's own label tables, whole.
    only : sequence of str, optional
        The variables that `loaded` was restricted to.
    relabelled : bool
        Go on although the project's own label files changed since the first round.

    Raises
    ------
    RelookError
        Counts without coders, tables that cannot be read, or nothing changed (exit code 1).
    """
    project = loaded.project
    if project.settings.labels.layout == "counts":
        raise RelookError(
            "a table of counts does not say who gave which label, so nothing shows who changed one",
            where=Place(str(tables[0])),
            mend="give tables with a row per label or a column per coder",
        )
    rounds = read_rounds(project)
    changed = check_independence(loaded, rounds, relabelled=relabelled)
    corrected = load(reading_tables(project, tables), only=only)
    variables = tuple(_variable(loaded, corrected, name) for name in loaded.agreements)
    found = Correction(
        loaded=loaded,
        corrected=corrected,
        independent=bool(rounds) and not changed,
        variables=variables,
    )
    if not found.n_changes:
        raise RelookError(
            "the table holds the same labels, so nothing was corrected",
            where=Place(str(tables[0])),
            mend="give the table that the coders corrected",
            exit_code=ExitCode.FALLS_SHORT,
        )
    return found


def record_correction(held: Correction, stamp: str) -> tuple[LabelVersion, bool]:
    """Keep the corrected tables as a label version; see `write_version`."""
    summary = {
        each.name: {
            "changed": len(each.changes),
            "added": each.n_added,
            "removed": each.n_removed,
            **each.directions,
        }
        for each in held.variables
    }
    project = held.loaded.project
    return write_version(
        project,
        [project.root / file for file in held.corrected.project.settings.labels.files],
        stamp=stamp,
        compared_with=held.loaded.labels.digests,
        summary=summary,
    )


def correction_object(held: Correction, version: LabelVersion | None) -> dict[str, Any]:
    """Return everything that `relook rescore --against --json` writes, but for its format number.

    Keys: `version` (null with --dry-run), `independent`; `variables[]`: `variable`, `before{alpha,
    ...}`, `after{agreement, ...}`, `n_changed, n_added, n_removed, directions{}`; `coders[]`:
    `variable, coder, n_labels, n_changed, n_added, n_removed, directions{}`; `changes[]`:
    `variable, item, coder, old, new, direction`.
    """
    return {
        "project": str(held.loaded.project.root),
        "version": None if version is None else version.number,
        "independent": held.independent,
        "variables": [
            {
                "variable": each.name,
                "before": {"alpha": each.before.alpha, **_figures(each.before)},
                "after": {"agreement": each.after.alpha, **_figures(each.after)},
                "n_changed": len(each.changes),
                "n_added": each.n_added,
                "n_removed": each.n_removed,
                "directions": each.directions,
            }
            for each in held.variables
        ],
        "coders": [
            {"variable": each.name, **asdict(coder)}
            for each in held.variables
            for coder in each.coders
        ],
        "changes": [
            {"variable": each.name, **asdict(change)}
            for each in held.variables
            for change in each.changes
        ],
    }


def _figures(agreement: Agreement) -> dict[str, Any]:
    return {
        "undefined_because": agreement.undefined_because,
        "observed_disagreement": agreement.observed_disagreement,
        "expected_disagreement": agreement.expected_disagreement,
        "n_pairable_items": agreement.n_pairable_items,
        "n_disputed_items": agreement.n_disputed_items,
    }


def _variable(loaded: Loaded, corrected: Loaded, name: str) -> VariableCorrection:
    before, after = loaded.agreements[name], corrected.agreements[name]
    extended, texts, code_of = with_decisions(
        loaded.labels.variables[name], before, corrected.labels.variables[name].texts
    )
    first = _frame(loaded, extended, name).rename(columns={"value": "old"})
    recoded = np.array([code_of[text] for text in corrected.labels.variables[name].texts])
    second = _frame(corrected, after, name).rename(columns={"value": "new"})
    second["new"] = recoded[second["new"]] if len(second) else second["new"]
    both = first.merge(second, how="outer", on=["item", "coder"])
    both = both.fillna({"old": CANNOT_BE_CODED, "new": CANNOT_BE_CODED}).astype(
        {"old": np.int64, "new": np.int64}
    )
    was, now = both["old"] != CANNOT_BE_CODED, both["new"] != CANNOT_BE_CODED
    changed = both[was & now & (both["old"] != both["new"])]
    changes = _changes(loaded, extended, texts, changed)
    directions: dict[str, Counter[str]] = {}
    for change in changes:
        directions.setdefault(change.coder, Counter())[change.direction] += 1
    n_labels = both[was].groupby("coder").size()
    n_added, n_removed = both[~was].groupby("coder").size(), both[~now].groupby("coder").size()
    coders = dict.fromkeys([*loaded.labels.coders, *corrected.labels.coders])
    return VariableCorrection(
        name=name,
        before=before,
        after=after,
        changes=changes,
        coders=tuple(
            CoderChanges(
                coder=coder,
                n_labels=int(n_labels.get(coder, 0)),
                n_changed=sum(directions.get(coder, Counter()).values()),
                n_added=int(n_added.get(coder, 0)),
                n_removed=int(n_removed.get(coder, 0)),
                directions={each: directions.get(coder, Counter())[each] for each in DIRECTIONS},
            )
            for coder in coders
        ),
    )


def _frame(loaded: Loaded, agreement: Agreement, name: str) -> pd.DataFrame:
    labels = agreement.labels
    coders = np.array(loaded.labels.coders, dtype=object)
    assert labels.coder_index is not None  # counts were refused
    return pd.DataFrame(
        {
            "item": loaded.labels.items[labels.item_index],
            "coder": coders[labels.coder_index],
            "value": labels.value_index,
        }
    )


def _changes(
    loaded: Loaded, before: Agreement, texts: Sequence[str], changed: pd.DataFrame
) -> tuple[Change, ...]:
    """Each change with its direction, by the other labels of the item as they were first given."""
    items = loaded.item_numbers(changed["item"].tolist())
    labels = before.labels
    coder_of = {coder: at for at, coder in enumerate(loaded.labels.coders)}
    assert labels.coder_index is not None  # counts were refused
    found = []
    for at, entry in enumerate(changed.itertuples(index=False)):
        own = labels.of_item(int(items[at]))
        others = labels.value_index[own][labels.coder_index[own] != coder_of[str(entry.coder)]]
        old, new = int(str(entry.old)), int(str(entry.new))
        found.append(
            Change(
                item=str(entry.item),
                coder=str(entry.coder),
                old=texts[old],
                new=texts[new],
                direction=_direction(before, others, old, new),
            )
        )
    return tuple(sorted(found, key=lambda each: (each.item, each.coder)))


def _direction(before: Agreement, others: np.ndarray[Any, Any], old: int, new: int) -> str:
    if not others.size:
        return "alone"
    apart = [
        float(np.sum(before.differences.between(np.full(others.size, label), others)))
        for label in (old, new)
    ]
    if abs(apart[1] - apart[0]) <= 1e-12 * max(apart):
        return "neither"
    return "toward" if apart[1] < apart[0] else "away"
