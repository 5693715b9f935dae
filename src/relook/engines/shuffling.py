"""Labels brought together by item, where an item may lie in several files.

Each file is read and checked where it lies; its labels are then sent, as text, to the part that the
hash of their item names. Only labels move, through dask's shuffle, which spills to disk.
"""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from relook.core.exact import IntArray
from relook.engines.parts import FoundItems, ReducedPart, find_items, read_part, reduce_part
from relook.project.setup.item_hashes import hashed_ids
from relook.tables.columns import LabelColumn, labels_of_columns
from relook.tables.labels import LabelData
from relook.tables.schema import LabelSource, Variable

_META = {"item": "str", "coder": "str", "variable": "str", "label": "str", "part": "int64"}


def rows_of_file(
    file: Path, source: LabelSource, variables: Sequence[Variable], root: Path, n_parts: int
) -> pd.DataFrame:
    """Return the labels of a file as rows, each with the part that it belongs to.

    An item without a label goes along as a row without one, and how many labels of a variable are
    missing as the label of no item.
    """
    data = read_part(file, source, variables, root)
    part = hashed_ids(data.items, 0) % n_parts
    items = pd.Series(data.items, dtype="str")
    coders = pd.Series(list(data.coders), dtype="str")
    frames = [pd.DataFrame({"item": items, "coder": "", "variable": "", "label": "", "part": part})]
    for name, held in data.variables.items():
        labels = held.labels
        assert labels.coder_index is not None
        texts = pd.Series(list(held.texts), dtype="str")
        frames.append(
            pd.DataFrame(
                {
                    "item": items.take(labels.item_index).to_numpy(),
                    "coder": coders.take(labels.coder_index).to_numpy(),
                    "variable": name,
                    "label": texts.take(labels.value_index).to_numpy(),
                    "part": part[labels.item_index],
                }
            )
        )
        missing = {
            "item": "",
            "coder": "",
            "variable": name,
            "label": str(held.n_missing),
            "part": 0,
        }
        frames.append(pd.DataFrame([missing]))
    return pd.concat(frames, ignore_index=True).astype(_META)


def labels_of_rows(
    rows: pd.DataFrame, source: LabelSource, variables: Sequence[Variable], root: Path
) -> LabelData:
    """Return the rows of one part as label data; a coder twice on one item is an error as ever."""
    counted = rows["item"] == ""
    missing = rows[counted]
    rows = rows[~counted].reset_index(drop=True)
    item, items = pd.factorize(rows["item"])
    named = rows["coder"] != ""
    coder, coders = pd.factorize(rows["coder"].where(named))
    columns = {}
    for variable in variables:
        own = np.flatnonzero(rows["variable"].to_numpy() == variable.name)
        text, texts = pd.factorize(rows["label"].to_numpy()[own])
        lacking = missing.loc[missing["variable"] == variable.name, "label"].astype(int)
        columns[variable.name] = LabelColumn(
            item=item[own], coder=coder[own], text=text, row=own,
            texts=np.asarray(texts, dtype=object),
            n_missing=int(lacking.sum()),
        )  # fmt: skip
    return labels_of_columns(
        columns,
        variables,
        items=np.asarray(items, dtype=object),
        coders=np.asarray(coders, dtype=object),
        source="labels of several files",
        root=root,
        duplicates=source.duplicates,
    )


def shuffled(
    files: Sequence[Path], source: LabelSource, variables: Sequence[Variable], root: Path
) -> tuple[Any, int]:
    """Return a dask frame with each item in one of its partitions, and how many there are."""
    import dask.dataframe as dd

    n_parts = max(1, len(files))
    frame = dd.from_map(  # type: ignore[no-untyped-call]
        rows_of_file,
        list(files),
        source=source,
        variables=list(variables),
        root=root,
        n_parts=n_parts,
        meta=pd.DataFrame({name: pd.Series(dtype=kind) for name, kind in _META.items()}),
    )
    return frame.shuffle("part", npartitions=n_parts), n_parts


def digest_of(file: Path) -> str:
    """Return the SHA-256 of a file's bytes, in hex."""
    with file.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def reduce_rows(
    rows: pd.DataFrame,
    source: LabelSource,
    variables: Sequence[Variable],
    root: Path,
    seed: int,
) -> ReducedPart:
    """Reduce one part of shuffled rows."""
    return reduce_part(labels_of_rows(rows, source, variables, root), seed)


def find_rows(
    rows: pd.DataFrame,
    source: LabelSource,
    variables: Sequence[Variable],
    root: Path,
    place: IntArray,
) -> FoundItems:
    """Look items up in one part of shuffled rows."""
    return find_items(labels_of_rows(rows, source, variables, root), place)
