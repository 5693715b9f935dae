"""Which column is what: the item, the coder, the labels; told by header and by shape."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from relook.core.exact import IntArray
from relook.errors import RelookError, listed
from relook.tables.guessed_grids import by_coder_columns, guess_counts, matching_headers
from relook.tables.guessed_roles import Line, Roles, View, view_of
from relook.tables.headers import fold
from relook.tables.reading import Table
from relook.tables.schema import Layout
from relook.tables.sketches import (
    CODER_WORDS,
    ITEM_WORDS,
    LABEL_WORDS,
    REMARK_WORDS,
    Sketch,
    dated,
    named_like,
)

#: A column this share of whose cells differ names items, although a few of them come twice.
MOSTLY_DISTINCT = 0.9
#: How many rows of a large table tell whether items meet a coder once: all rows of some items.
_ROWS_LOOKED_AT = 1_000_000


def guess_roles(
    tables: Sequence[Table], sketches: Sequence[list[Sketch]], told: Mapping[str, Any]
) -> Roles:
    """Guess what each column of the label tables is.

    Parameters
    ----------
    tables : sequence of Table
        At least one; they share columns.
    sketches : sequence of list of Sketch
        One list per table.
    told : mapping
        What the user said: layout, item, coder, coder_from, labels, columns, variable, remark.

    Raises
    ------
    RelookError
        A told column that is not there, or no reading that the table can defend.
    """
    view = view_of(tables, sketches)
    layout, because = _layout(view, told)
    if layout == "long":
        roles = _long(view, told)
    else:
        item = _item(view, told, unique=True)
        roles = Roles(layout, item.header)
        roles.lines.append(_item_line(item, told))
        if layout == "by-coder":
            _fill_by_coder(roles, view, item, told)
        else:
            _fill_counts(roles, view, item, told)
    what = {
        "long": "long (a row per label)",
        "by-coder": "by-coder (a row per item, a column per coder)",
        "counts": "counts (a row per item, a column per label, no coders)",
    }
    roles.lines.insert(0, ("layout", what[layout], because, "--layout"))
    return roles


def _layout(view: View, told: Mapping[str, Any]) -> tuple[Layout, str]:
    if told["layout"] is not None:
        return told["layout"], ""
    if told["columns"] is not None:
        return "by-coder", "a pattern for the columns is given"
    if told["coder"] is not None or told["coder_from"] is not None:
        return "long", "the coders are named"
    item = None if told["item"] is None else view.find(told["item"], "the items")
    coder = coder_by_header(view.without(item))
    if coder is not None:
        return "long", f'the column "{coder.header}" names a coder in every row'
    if view.n_files > 1 and _one_file_per_coder(view, item):
        return "long", "several files hold the same items, once each"
    unique = [item] if item is not None and item.unique else _unique_columns(view)
    nearly = [one for one in view.columns if _hardly_repeats(one)]
    for one in [*unique, *(one for one in nearly if item is None or one is item)]:
        others = view.without(one)
        once = "no item repeats" if one.unique else "hardly an item repeats"
        if guess_counts(others):
            return (
                "counts",
                (
                    f'{once} in "{one.header}", and the other columns hold counts that add up '
                    "alike in each row"
                ),
            )
        columns, _ = by_coder_columns(others)
        if len(columns) >= 2:
            return (
                "by-coder",
                f'{once} in "{one.header}", and {len(columns)} columns share their labels',
            )
    if unique and item is None:
        # A number per row may still hide items that repeat.
        recurring = [one for one in view.without(*unique) if one.n_distinct < len(one.codes)]
        if not any(one.words & ITEM_WORDS for one in recurring):
            raise RelookError(
                "no two columns share their labels, and no column names a coder; the columns are "
                f"{listed(view.headers)}",
                where=view.place,
                mend="say which is which: --layout, --item, --coder, --labels",
            )
    return "long", "items repeat, a row for each label"


def coder_by_header(columns: Sequence[Sketch]) -> Sketch | None:
    """Return the one column whose header names coders, or None where none or several do."""
    found = [one for one in named_like(list(columns), CODER_WORDS) if one.n_filled]
    plain = [one for one in found if one.words <= CODER_WORDS | {"id", "name", "code", "number"}]
    if len(plain) == 1:
        return plain[0] if not plain[0].prose else None
    return found[0] if len(found) == 1 and not found[0].prose else None


def _unique_columns(view: View) -> list[Sketch]:
    """Columns in which no text repeats: those named like items first, then from left to right."""
    unique = [one for one in view.columns if one.unique and not one.prose]
    named = named_like(unique, ITEM_WORDS)
    return named + [one for one in unique if all(one is not other for other in named)]


def _hardly_repeats(one: Sketch) -> bool:
    """Whether a column names items, a row or two of which were entered twice."""
    n = one.n_filled if one.n_filled == len(one.codes) and not one.prose else 0
    return MOSTLY_DISTINCT * n <= one.n_distinct < n


def _one_file_per_coder(view: View, item: Sketch | None) -> bool:
    return (item or _item_across_files(view)) is not None


def _item_across_files(view: View) -> Sketch | None:
    """A column that hardly repeats within a file while the files share most of its texts."""
    candidates = named_like(view.columns, ITEM_WORDS) + view.columns
    for one in candidates:
        # A coder who entered an item twice does not make it another column.
        once = _repeats(one.codes, view.file) <= 0.05 * len(one.codes)
        shared = one.n_distinct <= 0.75 * len(one.codes)
        if once and shared and not one.prose:
            return one
    return None


def _item(view: View, told: Mapping[str, Any], *, unique: bool) -> Sketch:
    if told["item"] is not None:
        return view.find(told["item"], "the items")
    nearly = [one for one in view.columns if _hardly_repeats(one)]
    found = (_unique_columns(view) or nearly) if unique else []
    if not found:
        found = named_like(view.columns, ITEM_WORDS)
    if not found:
        raise RelookError(
            f"no column looks like the items' ids; the columns are {listed(view.headers)}",
            where=view.place,
            mend="name it with --item",
        )
    return found[0]


def _item_line(item: Sketch, told: Mapping[str, Any]) -> Line:
    if told["item"] is not None:
        because = ""
    elif item.unique:
        because = "no two rows are alike in it"
    elif _hardly_repeats(item):
        because = "hardly two rows are alike in it"
    elif item.words & ITEM_WORDS:
        because = "of its header, and its texts recur"
    else:
        because = "its texts recur as those of items do"
    return ("items", f'column "{item.header}"', because, "--item")


def _long(view: View, told: Mapping[str, Any]) -> Roles:
    by_file = told["coder_from"] == "file"
    coder: Sketch | None = None
    because = ""
    if told["coder"] is not None:
        coder = view.find(told["coder"], "the coders")
    elif not by_file:
        given = None if told["item"] is None else view.find(told["item"], "the items")
        coder = coder_by_header(view.without(given))
        because = "of its header"
        if coder is None and view.n_files > 1 and _one_file_per_coder(view, given):
            by_file, because = True, "each file holds the same items once"
    item = _long_item(view, told, coder, by_file)
    if coder is None and not by_file:
        coder, because = _coder_by_shape(view, item)
    roles = Roles("long", item.header, coder_from_file=by_file)
    roles.lines.append(_item_line(item, told))
    if coder is not None:
        roles.coder = coder.header
        roles.lines.append(("coders", f'column "{coder.header}"', because, "--coder"))
    else:
        roles.lines.append(("coders", "one per file, named by it", because, "--coder"))
    taken: list[Sketch | None] = [item, coder]
    remark = _remark(view, told, taken, item)
    if remark is not None:
        roles.remark = remark.header
        taken.append(remark)
        why = "" if told["remark"] is not None else "of its header and its few or free texts"
        roles.lines.append(("coders' remarks", f'column "{remark.header}"', why, "--remark"))
    _fill_long_variables(roles, view, told, taken, item, coder)
    return roles


def _long_item(view: View, told: Mapping[str, Any], coder: Sketch | None, by_file: bool) -> Sketch:
    if told["item"] is not None:
        return view.find(told["item"], "the items")
    if by_file:
        found = _item_across_files(view)
        if found is not None:
            return found
    candidates = [one for one in view.without(coder) if one.n_filled and not one.prose]
    named = named_like(candidates, ITEM_WORDS)
    recurring = [one for one in named if one.n_distinct < len(one.codes)]
    if coder is not None:
        # Items meet a coder once: among the named ones, that which repeats pairs least.
        recurring = [one for one in recurring if _rarely_repeats(one.codes, coder.codes)]
    if recurring:
        return recurring[0]
    spread = [
        one
        for one in candidates
        if one.n_distinct < len(one.codes)
        and (coder is None or _rarely_repeats(one.codes, coder.codes))
    ]
    if spread:
        return max(spread, key=lambda one: one.n_distinct)
    if named:
        return named[0]
    raise RelookError(
        f"no column looks like the items' ids; the columns are {listed(view.headers)}",
        where=view.place,
        mend="name it with --item",
    )


def _rarely_repeats(item: IntArray, coder: IntArray) -> bool:
    """Whether few rows repeat an item and a coder, by the items that come first in the table."""
    if item.size > _ROWS_LOOKED_AT:
        among = item < int(item.max()) * _ROWS_LOOKED_AT // item.size + 1
        item, coder = item[among], coder[among]
    return _repeats(item, coder) < 0.2 * item.size


def _repeats(first: IntArray, second: IntArray) -> int:
    """Rows whose pair of codes stood in an earlier row already."""
    pair = first.astype(np.int64) * (int(second.max(initial=0)) + 1) + second
    pair.sort()
    return int(np.count_nonzero(pair[1:] == pair[:-1]))


def _coder_by_shape(view: View, item: Sketch) -> tuple[Sketch, str]:
    """The only column that never repeats within an item; several, and nothing can be said."""
    fitting = [
        one
        for one in view.without(item)
        if one.label_like
        and one.n_distinct >= 2
        and not one.constant_within(item.codes)
        and not dated(one)
        and _repeats(item.codes, one.codes) == 0
    ]
    if len(fitting) == 1:
        return fitting[0], "it is the only one that never repeats within an item"
    candidates = fitting or view.without(item)
    raise RelookError(
        f"it cannot be told which column names the coder: {listed(o.header for o in candidates)}",
        where=view.place,
        mend="name it with --coder",
    )


def _remark(
    view: View, told: Mapping[str, Any], taken: Sequence[Sketch | None], item: Sketch
) -> Sketch | None:
    if told["remark"] is not None:
        return view.find(told["remark"], "the remarks")
    labels = {fold(name) for name in told["labels"]}
    for one in named_like(view.without(*taken), REMARK_WORDS):
        sparse = one.n_filled < 0.3 * len(one.codes)
        free = sparse or one.prose or one.n_distinct > 0.5 * one.n_filled
        if free and fold(one.header) not in labels and not one.constant_within(item.codes):
            return one
    return None


def _fill_long_variables(
    roles: Roles,
    view: View,
    told: Mapping[str, Any],
    taken: Sequence[Sketch | None],
    item: Sketch,
    coder: Sketch | None,
) -> None:
    if told["labels"]:
        chosen = [view.find(name, "the labels") for name in told["labels"]]
        because = ""
    else:
        others = view.without(*taken)
        chosen = [one for one in others if _may_be_labels(one, item, coder)]
        because = "its texts recur and differ within items"
        if not chosen:
            chosen = [one for one in named_like(others, LABEL_WORDS) if one.n_filled][:1]
            because = "of its header"
        if not chosen and len(others) == 1:
            chosen, because = others, "no other column is left"
    if not chosen:
        raise RelookError(
            f"no column looks like labels; the columns are {listed(view.headers)}",
            where=view.place,
            mend="name it with --labels",
        )
    for one in chosen:
        name = told["variable"] if told["variable"] and len(chosen) == 1 else one.header.strip()
        roles.variables.append((name, one.header))
        roles.columns_of[name] = [one]
    said = ", ".join(f'column "{one.header}"' for one in chosen)
    what = "labels" if len(chosen) == 1 else "labels of several variables"
    roles.lines.append((what, said, because, "--labels"))


def _may_be_labels(one: Sketch, item: Sketch, coder: Sketch | None) -> bool:
    if not one.label_like or one.unique or dated(one) or one.constant_within(item.codes):
        return False
    return coder is None or not one.constant_within(coder.codes) or coder.n_distinct < 2


def _fill_by_coder(roles: Roles, view: View, item: Sketch, told: Mapping[str, Any]) -> None:
    others = view.without(item)
    if told["columns"] is not None:
        pattern, because = told["columns"], ""
        matched = matching_headers(others, pattern, view.place)
    elif told["labels"]:
        pattern, because = None, ""
        matched = [
            ("", one.header, one) for one in (view.find(n, "a coder") for n in told["labels"])
        ]
    else:
        columns, pattern = by_coder_columns(others)
        because = "they share their labels"
        if len(columns) < 2:
            raise RelookError(
                f"no columns look like coders; the columns are {listed(view.headers)}",
                where=view.place,
                mend="name them with --labels",
            )
        matched = (
            [("", one.header, one) for one in columns]
            if pattern is None
            else matching_headers(columns, pattern, view.place)
        )
    for variable, _, one in matched:
        name = variable or told["variable"] or "label"
        roles.columns_of.setdefault(name, []).append(one)
    roles.variables = [(name, None) for name in roles.columns_of]
    coders = list(dict.fromkeys(coder for _, coder, _ in matched))
    if pattern is None:
        roles.coder_columns = tuple(coders)
        roles.lines.append(("coders", f"the columns {listed(coders)}", because, "--labels"))
        return
    roles.pattern = pattern
    said = f"{listed(coders)}, by columns named {pattern}"
    roles.lines.append(("coders", said, because and "headers fit that pattern", "--columns"))
    names = [name for name, _ in roles.variables]
    roles.lines.append(("variables", listed(names), because and "of the same headers", "--columns"))


def _fill_counts(roles: Roles, view: View, item: Sketch, told: Mapping[str, Any]) -> None:
    if told["labels"]:
        columns = [view.find(name, "a label") for name in told["labels"]]
        because = ""
    else:
        columns = guess_counts(view.without(item), certain=False)
        because = "their cells are whole numbers"
    if not columns:
        raise RelookError(
            f"no columns hold counts; the columns are {listed(view.headers)}",
            where=view.place,
            mend="name them with --labels",
        )
    name = told["variable"] or "label"
    roles.variables = [(name, None)]
    roles.columns_of[name] = columns
    headers = tuple(one.header for one in columns)
    roles.coder_columns = headers
    roles.lines.append(("labels", f"the columns {listed(headers)}", because, "--labels"))
