"""What may be wrong with labels that can all be read: twins, idle coders, odd columns."""

from __future__ import annotations

import numpy as np
import pandas as pd

from relook.core.differences import difference_function
from relook.core.exact import IntArray
from relook.core.labels import CodedLabels
from relook.errors import Place, listed
from relook.tables.findings import Findings, counted
from relook.tables.labels import LabelData, VariableLabels
from relook.tables.numbers import parse_number
from relook.tables.twins import likely_slips, near_twins
from relook.tables.values import kind_of

#: Alpha from fewer items than this is hardly more than an anecdote, so the lead is told.
FEW_ITEMS = 20
#: A coder who always gives one label, or the labels of another, is remarked on from here.
_FEW_LABELS = 5
_SHARED_ITEMS = 20
#: Pairs of coders are compared label by label only up to this many pairs.
_MOST_PAIRS = 20_000_000
_NAMED = 5


def check_variable(data: LabelData, name: str, findings: Findings) -> None:
    """Look at the labels of one variable."""
    held = data.variables[name]
    labels = held.labels
    if labels.n_labels == 0:
        return
    counts = np.bincount(labels.value_index, minlength=len(held.texts))
    used = {held.texts[at]: int(counts[at]) for at in np.flatnonzero(counts).tolist()}
    _check_twins(data, name, used, findings)
    _check_numbers_of(data, name, used, findings)
    kind = kind_of(difference_function(held.variable.difference, held.variable.options))
    if kind == "words":
        _check_mixed(data, name, used, findings)
        if len(used) > max(20, labels.n_labels / 2):
            findings.add(
                f'"{name}" has {len(used):,} different labels among {labels.n_labels:,}, as a '
                "column of ids or free text would",
                _column(data, held),
                "check that this is the column of labels",
                "warning",
            )
    if len(used) == 1:
        findings.add(
            f'"{name}" has one label only, "{next(iter(used))}", so alpha is undefined',
            _column(data, held),
            "check the column and the missing markers",
            "warning",
        )


def _check_twins(data: LabelData, name: str, used: dict[str, int], findings: Findings) -> None:
    held = data.variables[name]
    for pair in near_twins(used):
        findings.add(
            f'the labels "{pair.kept}" ({used[pair.kept]:,} times) and "{pair.other}" '
            f"({used[pair.other]:,}) differ only by {pair.how}",
            _first_place(data, name, held.texts.index(pair.other)),
            f'write "{pair.kept}" throughout if they are one label, since where they meet they '
            "count as disagreement",
            "warning",
        )
    for rare, common in likely_slips(used):
        findings.add(
            f'the label "{rare}" ({counted(used[rare], "time")}) is one letter away from '
            f'"{common}" ({used[common]:,} times)',
            _first_place(data, name, held.texts.index(rare)),
            f'write "{common}", if it is a slip',
            "note",
        )


def _check_numbers_of(data: LabelData, name: str, used: dict[str, int], findings: Findings) -> None:
    """Items with one label, with none, and too few to go by."""
    per_item = data.variables[name].labels.labels_per_item
    where = Place(data.files[0]) if len(data.files) == 1 else None
    single, none = int(np.sum(per_item == 1)), np.flatnonzero(per_item == 0)
    pairable = int(np.sum(per_item >= 2))
    if single and pairable:
        findings.add(
            f'{counted(single, "item")} with one label of "{name}" only: nothing to compare there',
            where,
            None,
            "note",
        )
    if none.size:
        first = listed([str(data.items[at]) for at in none[:_NAMED].tolist()])
        more = f" and {none.size - _NAMED:,} more" if none.size > _NAMED else ""
        findings.add(
            f'{counted(none.size, "item")} without a label of "{name}": {first}{more}',
            where,
            None,
            "note",
        )
    if pairable == 0:
        findings.add(
            f'no item has two labels of "{name}", so nothing can be compared',
            where,
            "check the columns of items and coders",
            "warning",
        )
    elif pairable < FEW_ITEMS:
        findings.add(
            f'only {counted(pairable, "item")} with two labels of "{name}" or more; '
            "figures from so few can turn on one item",
            where,
            "have more items labelled, and read the interval before the figure",
            "warning",
        )


def _check_mixed(data: LabelData, name: str, used: dict[str, int], findings: Findings) -> None:
    held = data.variables[name]
    if held.variable.labels is not None:
        return
    numbers = [text for text in used if parse_number(text) is not None]
    words = [text for text in used if parse_number(text) is None]
    if numbers and words:
        rarer = min(numbers, words, key=lambda texts: sum(used[text] for text in texts))
        findings.add(
            f'the labels of "{name}" mix numbers ({listed(numbers, most=_NAMED)}) and words '
            f"({listed(words, most=_NAMED)})",
            _first_place(data, name, held.texts.index(rarer[0])),
            "use one or the other, or declare the labels",
            "warning",
        )


def check_coders(data: LabelData, findings: Findings) -> None:
    """Look for coders who hardly label, always give one label, or repeat another's labels."""
    if not data.coders:
        return
    total = np.zeros(len(data.coders), dtype=np.int64)
    for name, held in data.variables.items():
        coder = held.labels.coder_index
        if coder is None:
            return
        counts = np.bincount(coder, minlength=len(data.coders))
        total += counts
        _check_idle(data, name, counts, findings)
        _check_copies(data, name, findings)
    for at in np.flatnonzero(total == 1).tolist():
        findings.add(
            f'coder "{data.coders[at]}" gave one label only',
            _coder_place(data, at),
            "check the name; leave the coder out if it is a stray",
            "warning",
        )
    for at in np.flatnonzero(total == 0).tolist():
        findings.add(f'coder "{data.coders[at]}" gave no label', None, None, "note")


def _check_idle(data: LabelData, name: str, counts: IntArray, findings: Findings) -> None:
    labels = data.variables[name].labels
    assert labels.coder_index is not None
    if labels.n_labels == 0:
        return
    lowest = np.full(len(data.coders), labels.n_values, dtype=np.int64)
    highest = np.full(len(data.coders), -1, dtype=np.int64)
    np.minimum.at(lowest, labels.coder_index, labels.value_index)
    np.maximum.at(highest, labels.coder_index, labels.value_index)
    several = np.unique(labels.value_index).size > 1
    for at in np.flatnonzero((lowest == highest) & (counts >= _FEW_LABELS)).tolist():
        if several:
            findings.add(
                f'coder "{data.coders[at]}" gave the same label of "{name}" every time: '
                f'"{data.variables[name].texts[int(lowest[at])]}", {int(counts[at]):,} times',
                _coder_place(data, at),
                "ask the coder; leave them out if they did not really label",
                "warning",
            )


def _check_copies(data: LabelData, name: str, findings: Findings) -> None:
    """Two coders without a single difference, while the others do differ on the same scale."""
    labels = data.variables[name].labels
    first, second, same = _meetings(labels)
    if first.size == 0:
        return
    n_coders = len(data.coders)
    which, key = pd.factorize(first.astype(np.int64) * n_coders + second)
    met = np.bincount(which, minlength=key.size)
    agreed = np.bincount(which, weights=same, minlength=key.size)
    elsewhere = met.sum() - met
    rate = (agreed.sum() - agreed) / np.maximum(elsewhere, 1)
    # Chance that as many labels agree, were these two like the rest.
    likely = rate**met
    odd = (agreed == met) & (met >= _SHARED_ITEMS) & (elsewhere > 0) & (likely < 1e-3)
    for at in sorted(np.flatnonzero(odd).tolist(), key=lambda at: int(key[at])):
        one, other = divmod(int(key[at]), n_coders)
        findings.add(
            f'coders "{data.coders[one]}" and "{data.coders[other]}" gave the same label of '
            f'"{name}" to all {int(met[at]):,} items they share; elsewhere {rate[at]:.0%} agree',
            _coder_place(data, other),
            "check that they worked apart, and that no file was copied",
            "warning",
        )


def _meetings(labels: CodedLabels) -> tuple[IntArray, IntArray, IntArray]:
    """Both coders of each pair of labels of one item, and whether the labels are the same."""
    none = np.zeros(0, dtype=np.int64)
    coder = labels.coder_index
    per_item = labels.labels_per_item
    n_pairs = int((per_item * (per_item - 1) // 2).sum())
    if coder is None or n_pairs == 0 or n_pairs > _MOST_PAIRS:
        return none, none, none
    last = np.cumsum(per_item)[labels.item_index].astype(np.int32)
    coder = coder.astype(np.int32)
    firsts, seconds, sames = [], [], []
    at = np.arange(labels.n_labels, dtype=np.int32)
    for step in range(1, int(per_item.max())):
        at = at[at + step < last[at]]
        firsts.append(np.minimum(coder[at], coder[at + step]))
        seconds.append(np.maximum(coder[at], coder[at + step]))
        sames.append(labels.value_index[at] == labels.value_index[at + step])
    return (
        np.concatenate(firsts),
        np.concatenate(seconds),
        np.concatenate(sames).astype(np.int8),
    )


def _first_place(data: LabelData, name: str, value: int) -> Place | None:
    """Where a label is used first, by file and row."""
    held = data.variables[name]
    found = np.flatnonzero(held.labels.value_index == value)
    if found.size == 0:
        return None
    order = np.lexsort((held.rows[found], held.file_index[found]))
    return data.place(name, int(found[order[0]]))


def _coder_place(data: LabelData, coder: int) -> Place | None:
    """Where a coder's first label stands."""
    for name, held in data.variables.items():
        if held.labels.coder_index is None:
            return None
        found = np.flatnonzero(held.labels.coder_index == coder)
        if found.size:
            order = np.lexsort((held.rows[found], held.file_index[found]))
            place = data.place(name, int(found[order[0]]))
            return Place(place.file, place.sheet, place.row)
    return None


def _column(data: LabelData, held: VariableLabels) -> Place:
    """The column of a variable's labels, where all stand in one."""
    file, column = int(held.file_index[0]), int(held.column_index[0])
    one = bool((held.column_index == column).all())
    name = data.headers[file][column] if one else None
    return Place(data.files[file], data.sheets[file], None, name)
