"""Parts added up to one agreement, as if all labels had been read here."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from relook.core.differences import difference_function
from relook.core.exact import IntArray
from relook.core.labels import CodedLabels
from relook.core.profiles import Profiles, merge
from relook.core.summed import add_up
from relook.engines.parts import FoundItems, PartOfVariable, ReducedPart
from relook.errors import Problem, RelookError
from relook.project.setup.folder import Project
from relook.project.setup.item_hashes import hashed_ids
from relook.project.setup.loading import Loaded
from relook.tables.items import ItemData
from relook.tables.labels import LabelData, VariableLabels
from relook.tables.schema import Variable
from relook.tables.values import CodedValues, code_values

#: Looks items up in a part: which part, and their places in it.
Find = Callable[[dict[int, IntArray]], dict[int, FoundItems]]


@dataclass(frozen=True, slots=True, eq=False)
class _Sums:
    """One variable over all parts."""

    coded: CodedValues
    profiles: Profiles
    profile_of_item: IntArray
    given: IntArray
    n_missing: int


@dataclass(frozen=True)
class PartedLoaded(Loaded):
    """A project whose labels lie elsewhere: sums of all of them, and labels of chosen items."""

    seed: int = 0

    def item_numbers(self, items: Sequence[str]) -> IntArray:
        """Return the index of each item by the hash of its id, -1 for those without an entry."""
        known = self.hashes[self.seed]
        order = np.argsort(known)
        wanted = hashed_ids(np.array(list(items), dtype=object), self.seed)
        at = np.minimum(np.searchsorted(known, wanted, sorter=order), max(0, known.size - 1))
        if not known.size or not wanted.size:
            return np.full(wanted.size, -1, dtype=np.int64)
        return np.where(known[order[at]] == wanted, order[at], -1)


def add_parts(
    project: Project,
    variables: Sequence[Variable],
    parts: Sequence[ReducedPart],
    items: ItemData | None,
    seed: int,
) -> PartedLoaded:
    """Add up the sums of all parts.

    Parameters
    ----------
    project : Project
    variables : sequence of Variable
    parts : sequence of ReducedPart
    items : ItemData or None
    seed : int
        That the hashes are keyed with.

    Returns
    -------
    PartedLoaded
        Without ids and labels of items; `with_items` brings in those of chosen ones.

    Raises
    ------
    RelookError
        An item lies in several parts.
    """
    hashes = np.concatenate([part.hashes for part in parts])
    _refuse_scattered(hashes)
    coders = tuple(dict.fromkeys(coder for part in parts for coder in part.coders))
    if not parts[0].said:  # shuffled, so that who comes first means nothing
        coders = tuple(sorted(coders))
    held: dict[str, VariableLabels] = {}
    agreements = {}
    for variable in variables:
        sums = _sums(variable, [part.variables[variable.name] for part in parts], parts, coders)
        stub = _no_labels(hashes.size, len(sums.coded.texts), len(coders))
        function = difference_function(variable.difference, variable.options)
        agreements[variable.name] = add_up(
            sums.profiles,
            sums.profile_of_item,
            sums.given,
            stub,
            function,
            sums.coded.values,
            tolerance=variable.tolerance,
        )
        none = np.zeros(0, dtype=np.int64)
        held[variable.name] = VariableLabels(
            variable,
            sums.coded.texts,
            stub,
            sums.coded.values,
            sums.n_missing,
            none,
            none,
            none,
        )
    digests = {name: digest for part in parts for name, digest in part.digests.items()}
    labels = LabelData(
        np.full(hashes.size, "", dtype=object),
        coders,
        held,
        digests,
        _few([problem for part in parts for problem in part.problems]),
        tuple(line for part in parts for line in part.said),
        tuple(digests),
        (None,) * len(digests),
        ((),) * len(digests),
    )
    return PartedLoaded(project, labels, items, dict(agreements), {seed: hashes}, seed)


def with_items(
    loaded: PartedLoaded, parts: Sequence[ReducedPart], chosen: IntArray, find: Find
) -> PartedLoaded:
    """Bring in ids and labels of chosen items.

    Parameters
    ----------
    loaded : PartedLoaded
    parts : sequence of ReducedPart
    chosen : int array of shape (n_chosen,)
    find : callable
        Asks the parts.
    """
    begins = np.cumsum([0, *(part.hashes.size for part in parts)])
    wanted = np.unique(chosen)
    part_of = np.searchsorted(begins, wanted, side="right") - 1
    places = {
        int(part): wanted[part_of == part] - begins[part] for part in np.unique(part_of).tolist()
    }
    found = find(places)
    ids = loaded.labels.items.copy()
    rows: dict[str, list[tuple[int, str, str]]] = {name: [] for name in loaded.agreements}
    for part, held in found.items():
        index = held.place + begins[part]
        ids[index] = np.array(held.ids, dtype=object)
        for name, labels in held.labels.items():
            rows[name] += [(int(index[at]), coder, label) for at, coder, label in labels]
    coder_code = {name: code for code, name in enumerate(loaded.labels.coders)}
    variables, agreements = {}, {}
    for name, held_labels in loaded.labels.variables.items():
        code = {text: value for value, text in enumerate(held_labels.texts)}
        given = sorted((item, coder_code[coder], code[label]) for item, coder, label in rows[name])
        columns = np.array(given, dtype=np.int64).reshape(-1, 3)
        labels_here = CodedLabels(
            columns[:, 0],
            columns[:, 2],
            columns[:, 1],
            n_items=ids.size,
            n_values=len(held_labels.texts),
            n_coders=len(coder_code),
        )
        variables[name] = replace(held_labels, labels=labels_here)
        agreements[name] = replace(loaded.agreements[name], labels=labels_here)
    return replace(
        loaded,
        labels=replace(loaded.labels, items=ids, variables=variables),
        agreements=agreements,
    )


def _sums(
    variable: Variable,
    own: Sequence[PartOfVariable],
    parts: Sequence[ReducedPart],
    coders: tuple[str, ...],
) -> _Sums:
    """Bring the parts to one set of value, coder and profile codes, and add."""
    # A part's texts are its labels in their final form, so coding them again keeps them apart.
    texts = list(dict.fromkeys(text for part in own for text in part.texts))
    coded = code_values(variable, texts)
    code_of = dict(zip(texts, coded.code_of_text.tolist(), strict=True))
    recoded = [
        _recoded(part.profiles, [code_of[text] for text in part.texts], len(coded.texts))
        for part in own
    ]
    together, place = merge([profiles for profiles, _ in recoded], len(coded.texts))
    wide = max(1, len(coded.texts))
    keys = together.profile_of_entry * wide + together.value_index
    given = np.zeros((len(coders), keys.size), dtype=np.int64)
    coder_code = {name: code for code, name in enumerate(coders)}
    of_item = []
    for part, held, (profiles, order), profile in zip(parts, own, recoded, place, strict=True):
        entry = np.searchsorted(
            keys, profile[profiles.profile_of_entry] * wide + profiles.value_index
        )
        rows = np.array([coder_code[name] for name in part.coders], dtype=np.int64)
        np.add.at(given, (rows[:, None], entry[None, :]), held.given[:, order])
        of_item.append(np.append(profile, -1)[held.profile_of_item])
    return _Sums(
        coded,
        together,
        np.concatenate(of_item),
        given,
        sum(part.n_missing for part in own),
    )


def _recoded(profiles: Profiles, codes: Sequence[int], n_values: int) -> tuple[Profiles, IntArray]:
    """The same profiles in other value codes, values ascending; and where each entry came from."""
    value = np.array(codes, dtype=np.int64)[profiles.value_index]
    order = np.lexsort((value, profiles.profile_of_entry))
    return (
        Profiles(
            value[order], profiles.count[order], profiles.start, profiles.multiplicity, n_values
        ),
        order,
    )


def _no_labels(n_items: int, n_values: int, n_coders: int) -> CodedLabels:
    none = np.zeros(0, dtype=np.int64)
    return CodedLabels(none, none, none, n_items=n_items, n_values=n_values, n_coders=n_coders)


def _refuse_scattered(hashes: IntArray) -> None:
    ordered = np.sort(hashes)
    twice = int(np.count_nonzero(ordered[1:] == ordered[:-1]))
    if twice:
        raise RelookError(
            f"{twice:,} items lie in more than one part, so they would be counted as several",
            mend="leave out --by-item: parts are then shuffled until each item lies in one",
        )


def _few(problems: Sequence[Problem], most: int = 200) -> tuple[Problem, ...]:
    """Warnings of many parts, the first of them; the others are much the same."""
    return tuple(problems[:most])
