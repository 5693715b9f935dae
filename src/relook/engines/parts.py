"""What a worker does with one part of the labels: read it, reduce it, look items up in it.

A part is one file, or the labels of some items that were brought together. Every function here is a
pure one of what it is given, so that a part whose worker was lost is simply done again.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import numpy.typing as npt

from relook.core.exact import IntArray
from relook.core.labels import CodedLabels
from relook.core.profiles import Profiles, collapse
from relook.errors import Problem
from relook.project.setup.item_hashes import hashed_ids
from relook.tables.labels import LabelData, VariableLabels, read_labels
from relook.tables.schema import LabelSource, Variable

Texts = npt.NDArray[np.object_]


@dataclass(frozen=True, slots=True, eq=False)
class PartOfVariable:
    """One variable's labels in one part.

    Attributes
    ----------
    texts : tuple of str
        What the value codes of `profiles` stand for.
    profiles : Profiles
    profile_of_item : int array of shape (n_items,)
    given : int array of shape (n_coders, n_entries)
        How many labels each coder of the part gave of each profile entry.
    n_missing : int
    """

    texts: tuple[str, ...]
    profiles: Profiles
    profile_of_item: IntArray
    given: IntArray
    n_missing: int


@dataclass(frozen=True, slots=True, eq=False)
class ReducedPart:
    """One part of the labels, without its items' ids and without its labels.

    Attributes
    ----------
    hashes : int array of shape (n_items,)
        Keyed hash of each item's id.
    coders : tuple of str
    variables : dict of str to PartOfVariable
    digests : dict of str to str
    said : tuple of str
    problems : tuple of Problem
    """

    hashes: IntArray
    coders: tuple[str, ...]
    variables: dict[str, PartOfVariable]
    digests: dict[str, str]
    said: tuple[str, ...]
    problems: tuple[Problem, ...]


@dataclass(frozen=True, slots=True, eq=False)
class FoundItems:
    """Chosen items of one part, with their ids and labels.

    Attributes
    ----------
    place : int array of shape (n_found,)
        Of each item among the part's items.
    ids : tuple of str
    labels : dict of str to list of (int, str, str)
        By variable: which of the found items, coder, label.
    """

    place: IntArray
    ids: tuple[str, ...]
    labels: dict[str, list[tuple[int, str, str]]]


def read_part(
    file: Path, source: LabelSource, variables: Sequence[Variable], root: Path
) -> LabelData:
    """Read one file as a label table of its own.

    Raises
    ------
    RelookError
        With every error found in it.
    """
    return read_labels(replace(source, files=(file,)), variables, root)


def reduce_part(labels: LabelData, seed: int) -> ReducedPart:
    """Reduce a part to what adds up.

    Parameters
    ----------
    labels : LabelData
    seed : int
        Keys the hashes of the items' ids.
    """
    return ReducedPart(
        hashed_ids(labels.items, seed),
        labels.coders,
        {name: _reduced(held) for name, held in labels.variables.items()},
        labels.digests,
        labels.said,
        labels.problems,
    )


def read_and_reduce(
    file: Path, source: LabelSource, variables: Sequence[Variable], root: Path, seed: int
) -> ReducedPart:
    """Read one file and reduce it."""
    return reduce_part(read_part(file, source, variables, root), seed)


def _reduced(held: VariableLabels) -> PartOfVariable:
    labels = held.labels
    profiles, profile_of_item = collapse(labels)
    wide = max(1, labels.n_values)
    keys = profiles.profile_of_entry * wide + profiles.value_index
    n_entries = keys.size
    given = np.zeros((labels.n_coders, n_entries), dtype=np.int64)
    for run in labels.blocks():
        key = profile_of_item[run.item_index] * wide + run.value_index
        coder = np.zeros(0, np.int64) if run.coder_index is None else run.coder_index
        flat = coder.astype(np.int64) * n_entries + np.searchsorted(keys, key)
        given += np.bincount(flat, minlength=given.size).reshape(given.shape)
    return PartOfVariable(
        held.texts, profiles, profile_of_item.astype(np.int32), given, held.n_missing
    )


def find_items(labels: LabelData, place: IntArray) -> FoundItems:
    """Return ids and labels of chosen items of a part.

    Parameters
    ----------
    labels : LabelData
    place : int array of shape (n_wanted,)
        Of each item among the part's items.
    """
    found: dict[str, list[tuple[int, str, str]]] = {}
    for name, held in labels.variables.items():
        found[name] = [
            (at, labels.coders[coder], held.texts[value])
            for at, item in enumerate(place.tolist())
            for coder, value in _labels_of(held.labels, item)
        ]
    return FoundItems(place, tuple(str(labels.items[item]) for item in place.tolist()), found)


def read_and_find(
    file: Path, source: LabelSource, variables: Sequence[Variable], root: Path, place: IntArray
) -> FoundItems:
    """Read one file and look items up in it."""
    return find_items(read_part(file, source, variables, root), place)


def _labels_of(labels: CodedLabels, item: int) -> list[tuple[int, int]]:
    begin, end = np.searchsorted(labels.item_index, [item, item + 1])
    assert labels.coder_index is not None
    return list(
        zip(
            labels.coder_index[begin:end].tolist(),
            labels.value_index[begin:end].tolist(),
            strict=True,
        )
    )
