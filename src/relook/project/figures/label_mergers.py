"""What alpha would be if labels were merged, as asked for on the command line."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass

from relook.core.agreement import Agreement
from relook.core.merging import Merger, best_mergers, merged_agreement, why_not_mergeable
from relook.errors import RelookError, listed, nearest
from relook.project.setup.loading import Loaded
from relook.tables.labels import VariableLabels

#: To be said beside every figure after a merger.
CAUTION = (
    "a coarser code book measures less: this alpha answers another question, and is no better one"
)


@dataclass(frozen=True, slots=True)
class MergeGroup:
    """Labels to be taken as one.

    Attributes
    ----------
    name : str
        What they are called together.
    labels : tuple of str
        Two or more.
    """

    name: str
    labels: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class MergedScore:
    """One variable with labels merged.

    Attributes
    ----------
    variable : str
    groups : tuple of MergeGroup
        Those of its labels that were merged.
    agreement : Agreement or None
        With the labels merged; None where they cannot be.
    not_merged_because : str or None
    """

    variable: str
    groups: tuple[MergeGroup, ...]
    agreement: Agreement | None
    not_merged_because: str | None


def parse_merge_group(text: str) -> MergeGroup:
    """Read a merger written in one word, such as `late=delayed,cancelled`.

    Parameters
    ----------
    text : str
        The new name, an equals sign, and the labels with commas between; a label that holds a comma
        stands in double quotes.

    Raises
    ------
    RelookError
        No name, no equals sign, fewer than two labels, or a label twice.

    Examples
    --------
    >>> parse_merge_group("late=delayed, cancelled").labels
    ('delayed', 'cancelled')
    """
    mend = 'write it like --merge "late=delayed,cancelled"'
    name, equals, rest = text.partition("=")
    name = name.strip()
    if not equals or not name:
        raise RelookError(f'--merge "{text}" does not say NAME=LABEL,LABEL', mend=mend)
    try:
        rows = list(csv.reader([rest], skipinitialspace=True, strict=True))
    except csv.Error as error:
        raise RelookError(f'--merge "{text}" cannot be read: {error}', mend=mend) from None
    labels = tuple(label.strip() for label in (rows[0] if rows else []) if label.strip())
    twice = [label for label in dict.fromkeys(labels) if labels.count(label) > 1]
    if twice:
        raise RelookError(f'--merge "{text}" names {listed(twice)} twice', mend="name it once")
    if len(labels) < 2:
        raise RelookError(
            f'--merge "{text}" names {len(labels) or "no"} label; a merger needs two or more',
            mend=mend,
        )
    return MergeGroup(name, labels)


def merge_labels(loaded: Loaded, groups: Sequence[MergeGroup]) -> tuple[MergedScore, ...]:
    """Measure agreement with labels merged, on each variable that has the labels of a group.

    Parameters
    ----------
    loaded : Loaded
    groups : sequence of MergeGroup

    Returns
    -------
    tuple of MergedScore
        In the order of the variables; those without any of the groups are not among them.

    Raises
    ------
    RelookError
        A label that no variable has, a label in two groups, a new name that is another label, or
        labels of which no variable allows a merger.
    """
    if not groups:
        return ()
    _refuse_overlap(groups)
    found: dict[str, list[MergeGroup]] = {name: [] for name in loaded.agreements}
    for group in groups:
        for name in _variables_with(loaded, group):
            found[name].append(group)
    merged = tuple(
        _merge(loaded.labels.variables[name], loaded.agreements[name], own)
        for name, own in found.items()
        if own
    )
    if all(each.agreement is None for each in merged):
        raise RelookError(
            f"{merged[0].variable}: {merged[0].not_merged_because}", mend="leave --merge out"
        )
    return merged


def mergers_that_lift(agreement: Agreement, most: int = 10) -> list[Merger]:
    """Return the pairs of labels whose merger would lift alpha most; none where none can merge."""
    if why_not_mergeable(agreement) is not None:
        return []
    return best_mergers(agreement, most)


def _refuse_overlap(groups: Sequence[MergeGroup]) -> None:
    first: dict[str, MergeGroup] = {}
    names: set[str] = set()
    for group in groups:
        if group.name in names:
            raise RelookError(
                f'two mergers are called "{group.name}"', mend="give each a name of its own"
            )
        names.add(group.name)
        for label in group.labels:
            if label in first:
                raise RelookError(
                    f'"{label}" is to be merged into "{first[label].name}" and into "{group.name}"',
                    mend="name each label in one merger only",
                )
            first[label] = group


def _variables_with(loaded: Loaded, group: MergeGroup) -> list[str]:
    """The variables that have all labels of a group."""
    texts = {name: set(held.texts) for name, held in loaded.labels.variables.items()}
    known = [name for name, labels in texts.items() if labels.issuperset(group.labels)]
    if not known:
        raise _unknown(loaded, group, texts)
    for name in known:
        if group.name in texts[name] and group.name not in group.labels:
            raise RelookError(
                f'"{group.name}" is another label of {name}, not one of those merged',
                mend=f'add it to the labels to be merged, "{group.name}={group.name},…", or choose '
                "another name",
            )
    return known


def _unknown(loaded: Loaded, group: MergeGroup, texts: dict[str, set[str]]) -> RelookError:
    # The variable that was meant is the one that knows most of them.
    meant = max(texts, key=lambda name: len(texts[name].intersection(group.labels)))
    missing = next(label for label in group.labels if label not in texts[meant])
    ordered = loaded.labels.variables[meant].texts
    close = nearest(missing, [label for label in ordered if label not in group.labels])
    return RelookError(
        f'{meant} has no label "{missing}"',
        mend=f'did you mean "{close}"?' if close else f"its labels are {listed(ordered)}",
    )


def _merge(held: VariableLabels, agreement: Agreement, groups: Sequence[MergeGroup]) -> MergedScore:
    name = held.variable.name
    because = why_not_mergeable(agreement)
    if because is not None:
        return MergedScore(
            variable=name, groups=tuple(groups), agreement=None, not_merged_because=because
        )
    codes = [[held.texts.index(label) for label in group.labels] for group in groups]
    try:
        after = merged_agreement(agreement, codes)[0]
    except RelookError as error:
        raise RelookError(f"{name}: {error.message}", mend=error.mend) from None
    return MergedScore(
        variable=name,
        groups=tuple(groups),
        agreement=after,
        not_merged_because=None,
    )
