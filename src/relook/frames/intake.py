"""Labels and items of a DataFrame, or of an array, brought to the form of tables that were read.

Only distinct values become text; labels themselves stay codes, however many there are.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from relook.core.differences import parse_difference
from relook.core.exact import IntArray
from relook.errors import Place, Problem, RelookError, listed, nearest
from relook.project.setup.folder import Project
from relook.project.setup.loading import Loaded, measure
from relook.project.setup.settings import Settings
from relook.tables.columns import LabelColumn, labels_of_columns
from relook.tables.items import ItemData
from relook.tables.reading import Texts
from relook.tables.schema import ItemSource, LabelSource, Variable

SOURCE = "the labels"
ITEMS = "the items"
#: Names of the columns of the tables that a queue keeps.
ITEM, CODER = "item", "coder"
#: Files of the same.
LABELS_FILE, ITEMS_FILE = "labels.csv", "items.csv"


@dataclass(frozen=True, slots=True, kw_only=True)
class Declared:
    """What is said of the labels: see `relook.measure`."""

    item: str | None
    coder: str | None
    label: str | None
    coders: Sequence[str] | None
    difference: str
    order: Sequence[object] | None
    tolerance: Fraction | int | str
    show: Sequence[str] | None
    group_by: Sequence[str]


def loaded_of(
    labels: pd.DataFrame | npt.ArrayLike, items: pd.DataFrame | None, declared: Declared
) -> Loaded:
    """Return the labels of a DataFrame or array as those of a project's tables are returned.

    Raises
    ------
    RelookError
        A column that is not there, labels that do not fit, an item twice in `items`.
    """
    frame = labels if isinstance(labels, pd.DataFrame) else _frame_of(labels)
    variable, column, item_ids, coders, of_items = _parts(frame, declared)
    root = Path.cwd()
    data = labels_of_columns(
        {variable.name: column},
        [variable],
        items=item_ids,
        coders=coders,
        source=SOURCE,
        root=root,
    )
    source = None
    held = None
    if items is not None:
        source, held = _items(items, declared, of_items)
    settings = Settings(
        project="",
        labels=LabelSource(
            files=(Path(LABELS_FILE),), layout="long", item=ITEM, coder=CODER, missing=("",)
        ),
        variables=(variable,),
        items=source,
    )
    agreements = {name: measure(found) for name, found in data.variables.items()}
    return Loaded(Project(root, settings), data, held, agreements)


def _frame_of(labels: npt.ArrayLike) -> pd.DataFrame:
    values = np.asarray(labels, dtype=object) if isinstance(labels, list) else np.asarray(labels)
    if values.ndim != 2:
        raise RelookError(
            f"an array of labels has two axes, items by coders; got {values.ndim}",
            mend="give a row per item and a column per coder, or a DataFrame",
        )
    return pd.DataFrame(values)


def _parts(
    frame: pd.DataFrame, declared: Declared
) -> tuple[Variable, LabelColumn, Texts, Texts, str]:
    """The variable, its labels, the items, the coders, and what the items are called."""
    if declared.coder is not None:
        return _long(frame, declared)
    return _by_coder(frame, declared)


def _long(
    frame: pd.DataFrame, declared: Declared
) -> tuple[Variable, LabelColumn, Texts, Texts, str]:
    if declared.label is None or declared.item is None or declared.coders is not None:
        raise RelookError(
            "a long table needs its columns of items, coders and labels",
            mend="give item=, coder= and label=; or leave out coder= for a table with a column per "
            "coder",
        )
    assert declared.coder is not None
    given = [_column(frame, name, SOURCE) for name in (declared.item, declared.coder)]
    labels = _column(frame, declared.label, SOURCE)
    variable, text_of = _variable(declared, declared.label, [labels.dtype])
    (item, items), (coder, coders) = (_coded(column, _id_text) for column in given)
    text, texts = _coded(labels, text_of)
    problems = [
        Problem(
            f"{int(lacking.sum()):,} labels have no {name}",
            Place(SOURCE, None, int(np.flatnonzero(lacking)[0]), name),
            "fill them in, or leave these rows out",
        )
        for name, codes in ((declared.item, item), (declared.coder, coder))
        if (lacking := (codes < 0) & (text >= 0)).any()
    ]
    if problems:
        raise RelookError.from_problems(problems)
    kept = np.flatnonzero(text >= 0)
    column = LabelColumn(
        item=item[kept],
        coder=coder[kept],
        text=text[kept],
        row=kept,
        texts=texts,
        n_missing=text.size - kept.size,
    )
    return variable, column, items, coders, str(declared.item)


def _by_coder(
    frame: pd.DataFrame, declared: Declared
) -> tuple[Variable, LabelColumn, Texts, Texts, str]:
    if declared.label is not None:
        raise RelookError(
            "a column of labels needs a column of coders",
            mend="give coder= too, or leave out label=",
        )
    named = [name for name in frame.columns if name != declared.item]
    chosen = list(declared.coders) if declared.coders is not None else named
    columns = [_column(frame, name, SOURCE) for name in chosen]
    if len(columns) < 2:
        raise RelookError(
            f"a table with a column per coder needs two coders or more; got {len(columns)}",
            mend="name the columns with coders=, or give item=, coder= and label= for a long table",
        )
    ids = pd.Series(frame.index) if declared.item is None else _column(frame, declared.item, SOURCE)
    item, items = _coded(ids, _id_text)
    if (item < 0).any():
        raise RelookError(
            "an item has no id",
            where=Place(SOURCE, None, int(np.flatnonzero(item < 0)[0])),
            mend="fill it in, or leave the row out",
        )
    variable, text_of = _variable(declared, "label", [column.dtype for column in columns])
    text, texts = _coded(pd.concat(columns, ignore_index=True), text_of)
    n = len(frame)
    kept = np.flatnonzero(text >= 0)
    column = LabelColumn(
        item=item[kept % n],
        coder=kept // n,
        text=text[kept],
        row=kept % n,
        texts=texts,
        n_missing=text.size - kept.size,
    )
    coders = np.array([_id_text(name) for name in chosen], dtype=object)
    return variable, column, items, coders, declared.item or ITEM


def _column(frame: pd.DataFrame, name: object, where: str) -> pd.Series:
    if name not in frame.columns:
        known = [str(each) for each in frame.columns]
        close = nearest(str(name), known)
        raise RelookError(
            f'{where} have no column "{name}"',
            mend=f'did you mean "{close}"?' if close else f"the columns are {listed(known)}",
        )
    column = frame[name]
    if not isinstance(column, pd.Series):
        raise RelookError(f'{where} have several columns "{name}"', mend="rename all but one")
    return column.reset_index(drop=True)


def _variable(
    declared: Declared, name: str, dtypes: Sequence[object]
) -> tuple[Variable, Callable[[Any], str]]:
    """The variable, and how its labels become text."""
    function, options = parse_difference(declared.difference)
    separator = options.get("separator")

    def text_of(value: object) -> str:
        return _label_text(value, separator if isinstance(separator, str) else None)

    order = declared.order
    if order is None and function == "ordinal":
        ordered = [t for t in dtypes if isinstance(t, pd.CategoricalDtype) and t.ordered]
        order = list(ordered[0].categories) if ordered else None
    return Variable(
        name=name,
        difference=function,
        options=options,
        column=name,
        labels=None if order is None else tuple(text_of(label) for label in order),
        tolerance=Fraction(declared.tolerance),
    ), text_of


def _coded(column: pd.Series, text_of: Callable[[Any], str]) -> tuple[IntArray, Texts]:
    """Codes of a column's values, -1 where missing, and the text of each code."""
    if isinstance(column.dtype, pd.CategoricalDtype):
        codes, values = column.cat.codes.to_numpy(), column.cat.categories
    else:
        try:
            codes, values = pd.factorize(column)
        except TypeError:  # sets and lists cannot be hashed as they are
            codes, values = pd.factorize(column.map(_hashable))
    texts = np.array([text_of(value) for value in values.tolist()], dtype=object)
    # Several values may be written alike (1 and "1"), and some as nothing at all.
    of_value, distinct = pd.factorize(texts)
    blank = np.flatnonzero(distinct == "")
    table = np.append(of_value, -1).astype(np.int64)
    found = table[np.asarray(codes, dtype=np.int64)]
    if blank.size:
        found[found == blank[0]] = -1
    return found, np.asarray(distinct, dtype=object)


def _hashable(value: object) -> object:
    if isinstance(value, set | frozenset | list | tuple | np.ndarray):
        return frozenset(value) if isinstance(value, set | frozenset) else tuple(value)
    return value


def _id_text(value: object) -> str:
    """An id, a coder's name or a cell of the item table as text: 7.0 is meant as 7."""
    if isinstance(value, float | np.floating):
        number = float(value)
        return str(int(number)) if number.is_integer() else repr(number)
    return str(value)


def _label_text(value: object, separator: str | None) -> str:
    if isinstance(value, frozenset | tuple | set | list):
        parts = [_label_text(part, None) for part in value]
        if separator is None:
            raise RelookError(
                f"{value!r} is a set of labels, and the difference function is of single ones",
                mend='give difference="jaccard:;" or "masi:;" with the mark between labels',
            )
        for part in parts:
            if separator in part:
                raise RelookError(
                    f'the label "{part}" has the separator "{separator}" in it',
                    mend='name another separator, as in difference="jaccard:|"',
                )
        return separator.join(sorted(parts))
    return _id_text(value)


def _items(items: pd.DataFrame, declared: Declared, name: str) -> tuple[ItemSource, ItemData]:
    """The item table: its ids are a column named as that of the labels, or else its index."""
    named = name in items.columns
    ids = items[name] if named else pd.Series(items.index)
    texts = pd.Index([_id_text(value) for value in ids], dtype=object)
    rest = items.drop(columns=[name]) if named else items
    repeated = texts[texts.duplicated()]
    if len(repeated):
        raise RelookError(
            f'the item "{repeated[0]}" stands twice in {ITEMS}', mend="keep one row per item"
        )
    for column in (*(declared.show or ()), *declared.group_by):
        _column(rest, column, ITEMS)
    frame = pd.DataFrame(
        {str(column): _cells(rest[column]) for column in rest.columns}, index=texts
    )
    shown = tuple(frame.columns) if declared.show is None else tuple(map(str, declared.show))
    source = ItemSource(
        files=(Path(ITEMS_FILE),), key=ITEM, show=shown, group_by=tuple(map(str, declared.group_by))
    )
    rows = np.arange(len(frame))
    return source, ItemData(frame, {}, (), (), rows, np.full(len(frame), ITEMS, dtype=object))


def _cells(column: pd.Series) -> list[str]:
    return ["" if pd.isna(value) else _id_text(value) for value in column]
