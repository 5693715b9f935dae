"""Columns that belong together: a column per coder, headers of variable and coder, counts."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence

import numpy as np

from relook.errors import Place, RelookError, listed
from relook.tables.headers import fold
from relook.tables.numbers import parse_number
from relook.tables.sketches import CODER_WORDS, Sketch, dated

_SEPARATORS = ("_", " ", "-", ".", ":", "/")
_CODER_NAME = re.compile(
    r"([a-z]{1,2}|coder|rater|annotator|judge|reviewer|expert|model)?\s?\d+|[a-z]"
)


def by_coder_columns(columns: Sequence[Sketch]) -> tuple[list[Sketch], str | None]:
    """Return the columns that look like a column per coder, and the pattern of their headers.

    Returns
    -------
    columns : list of Sketch
        From left to right; fewer than two where nothing can be defended.
    pattern : str or None
        Such as "{variable}_{coder}" where the headers hold both.
    """
    among = [one for one in columns if one.label_like and not dated(one)]
    grid = _grid(among)
    if grid is not None:
        return grid
    family = _family(among)
    pattern = _one_variable_pattern(family) if len(family) >= 2 else None
    return family, pattern


def matching_headers(
    columns: Sequence[Sketch], pattern: str, place: Place
) -> list[tuple[str, str, Sketch]]:
    """Return variable, coder and column of every header that fits a pattern.

    Raises
    ------
    RelookError
        The pattern does not hold both names once, or no header fits.
    """
    if pattern.count("{variable}") != 1 or pattern.count("{coder}") != 1:
        raise RelookError(
            f'the pattern "{pattern}" must hold {{variable}} and {{coder}} once each',
            mend='write for instance --columns "{variable}_{coder}"',
        )
    splits = [(_possible_splits(one.header.strip(), pattern), one) for one in columns]
    often = Counter(variable for found, _ in splits for variable in {name for name, _ in found})
    matched = []
    for found, one in splits:
        if found:
            # A name with the separator in it fits in several ways; that of most columns is meant,
            # and where it makes no difference the longest variable.
            variable, coder = max(found, key=lambda split: (often[split[0]], len(split[0])))
            matched.append((variable, coder, one))
    if not matched:
        raise RelookError(
            f'no column fits "{pattern}"; the columns are {listed(one.header for one in columns)}',
            where=place,
            mend="change the pattern",
        )
    return matched


def _possible_splits(header: str, pattern: str) -> list[tuple[str, str]]:
    """Every way in which a header can be a variable and a coder by a pattern."""
    variable_first = pattern.index("{variable}") < pattern.index("{coder}")
    before, between, after = re.split(r"\{variable\}|\{coder\}", pattern)
    if not header.startswith(before) or not header.endswith(after):
        return []
    body = header[len(before) : len(header) - len(after)]
    cuts = (
        [found.start() for found in re.finditer(f"(?={re.escape(between)})", body)]
        if between
        else range(len(body))
    )
    parts = [(body[:cut], body[cut + len(between) :]) for cut in cuts]
    return [
        (one, other) if variable_first else (other, one) for one, other in parts if one and other
    ]


def guess_counts(columns: Sequence[Sketch], *, certain: bool = True) -> list[Sketch]:
    """Return the columns that hold how many coders gave a label, none where that is not plain.

    Numbers may be labels as well as counts. Only where every row adds up to nearly the same total,
    above any one cell's usual size, and many cells are 0 or empty, are they taken for counts.
    """
    whole = [one for one in columns if one.n_filled and one.whole and not one.unique]
    if not certain:
        return whole
    if len(whole) < 2 or any(len(fold(one.header).split()[-1:]) == 0 for one in whole):
        return []
    if sum(_CODER_NAME.fullmatch(fold(one.header)) is not None for one in whole) * 2 > len(whole):
        return []
    if any(one.words & CODER_WORDS for one in whole):
        return []
    cells = np.stack([_numbers(one)[one.codes] for one in whole])
    if cells.min() < 0:
        return []
    totals = cells.sum(axis=0)
    usual = int(np.bincount(totals.astype(np.int64)).argmax()) if totals.max() < 10_000 else 0
    alike = float(np.mean(totals == usual))
    return whole if usual >= 2 and alike >= 0.8 and float(np.mean(cells == 0)) >= 0.2 else []


def _numbers(one: Sketch) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    parsed = [parse_number(str(text)) for text in one.texts]
    return np.array([float(n) if n is not None else 0.0 for n in parsed])


def overlap(first: frozenset[str], second: frozenset[str]) -> float:
    """Return the share of the smaller vocabulary that the larger one holds, 0 for an empty one."""
    smaller = min(len(first), len(second))
    return len(first & second) / smaller if smaller else 0.0


def _family(columns: Sequence[Sketch]) -> list[Sketch]:
    """The largest set of columns linked by vocabularies that overlap by half."""
    groups: list[list[Sketch]] = []
    vocabulary = {one.at: one.vocabulary for one in columns}
    for one in columns:
        kin = [
            group
            for group in groups
            if any(overlap(vocabulary[one.at], vocabulary[other.at]) >= 0.5 for other in group)
        ]
        merged = [member for group in kin for member in group] + [one]
        groups = [group for group in groups if all(group is not other for other in kin)]
        groups.append(merged)
    best = max(groups, key=len, default=[])
    return sorted(best, key=lambda one: one.at)


def _splits(header: str, separator: str, last: bool) -> tuple[str, str] | None:
    text = header.strip()
    first, found, second = text.rpartition(separator) if last else text.partition(separator)
    return (first, second) if found and first and second else None


def _grid(columns: Sequence[Sketch]) -> tuple[list[Sketch], str] | None:
    """Headers that cross two lists of two names or more, nearly all crossings being there."""
    for separator in _SEPARATORS:
        for last in (True, False):
            parts = {}
            for one in columns:
                split = _splits(one.header, separator, last)
                if split is not None:
                    parts[split] = one
            firsts = list(dict.fromkeys(first for first, _ in parts))
            seconds = list(dict.fromkeys(second for _, second in parts))
            full = len(firsts) * len(seconds)
            if len(firsts) < 2 or len(seconds) < 2 or len(parts) < 0.8 * full:
                continue
            if len(parts) < 0.6 * len(columns):
                continue
            variable_first = _variable_stands_first(parts, firsts, seconds)
            names = ("variable", "coder") if variable_first else ("coder", "variable")
            pattern = f"{{{names[0]}}}{separator}{{{names[1]}}}"
            return sorted(parts.values(), key=lambda one: one.at), pattern
    return None


def _variable_stands_first(
    parts: dict[tuple[str, str], Sketch], firsts: Sequence[str], seconds: Sequence[str]
) -> bool:
    """Columns of one variable share labels; where both sides do, a name like c1 is a coder's."""
    by_first = _cohesion([[o for (f, _), o in parts.items() if f == name] for name in firsts])
    by_second = _cohesion([[o for (_, s), o in parts.items() if s == name] for name in seconds])
    if abs(by_first - by_second) > 0.1:
        return by_first > by_second
    like_coders = [
        sum(_CODER_NAME.fullmatch(fold(name)) is not None for name in names) / len(names)
        for names in (firsts, seconds)
    ]
    return like_coders[0] <= like_coders[1]


def _cohesion(groups: Sequence[Sequence[Sketch]]) -> float:
    shares = [
        overlap(first.vocabulary, second.vocabulary)
        for group in groups
        for at, first in enumerate(group)
        for second in group[at + 1 :]
    ]
    return float(np.mean(shares)) if shares else 0.0


def _one_variable_pattern(columns: Sequence[Sketch]) -> str | None:
    """`stance_c1`, `stance_c2`: one variable named before its coders, or after them."""
    for separator in _SEPARATORS:
        for last in (True, False):
            splits = [_splits(one.header, separator, last) for one in columns]
            found = [split for split in splits if split is not None]
            if len(found) < len(columns):
                continue
            for side, pattern in ((0, "{variable}SEP{coder}"), (1, "{coder}SEP{variable}")):
                names = {split[side] for split in found}
                if len(names) == 1 and not set(fold(next(iter(names))).split()) & CODER_WORDS:
                    return pattern.replace("SEP", separator)
    return None
