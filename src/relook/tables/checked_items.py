"""Whether the item table fits the labels, and whether what is shown stays blind."""

from __future__ import annotations

import numpy as np
import pandas as pd

from relook.core.exact import BoolArray
from relook.errors import Place, listed
from relook.tables.findings import Findings, counted
from relook.tables.headers import fold
from relook.tables.items import ItemData
from relook.tables.labels import LabelData
from relook.tables.schema import ItemSource
from relook.tables.sketches import CODER_WORDS
from relook.tables.twins import skeleton

_NAMED = 5
#: A shown column that matches this share of the labels, or of the coders' names, tells them.
_TELLING = 0.8


def check_item_table(labels: LabelData, items: ItemData, findings: Findings) -> None:
    """Compare the ids of the label tables with those of the item table."""
    labelled = pd.Index(labels.items, dtype=object)
    known = items.frame.index
    file = next(iter(items.digests), None)
    lacking = labelled[~labelled.isin(known)]
    if len(lacking):
        close = _close_ids([str(one) for one in lacking[:_NAMED]], known)
        findings.add(
            f"{counted(len(lacking), 'labelled item')} without an entry in the item table: "
            f"{_some([str(one) for one in lacking])}",
            Place(file),
            close or "add them; their worksheet rows show no text otherwise",
            "warning",
        )
    idle = known[~known.isin(labelled)]
    if len(idle):
        findings.add(
            f"{counted(len(idle), 'item')} of the item table without a label: "
            f"{_some([str(one) for one in idle])}",
            Place(file),
            None,
            "note",
        )


def _some(names: list[str]) -> str:
    return listed(names, most=_NAMED)


def _close_ids(lacking: list[str], known: pd.Index) -> str | None:
    """Say which ids of the item table were perhaps meant, alike but for zeros, case, spaces."""
    plain: dict[str, str] = {}
    for one in known:
        plain.setdefault(skeleton(str(one)).lstrip("0"), str(one))
    for one in lacking:
        found = plain.get(skeleton(one).lstrip("0"))
        if found is not None and found != one:
            return f'write ids alike in both tables: "{one}" here is perhaps "{found}" there'
    return None


def check_shown_columns(
    labels: LabelData, items: ItemData, source: ItemSource, findings: Findings
) -> None:
    """Warn where a shown column tells adjudicators who labelled, or what was said."""
    file = next(iter(items.digests), None)
    for column in source.show:
        texts = items.frame[column]
        filled = texts[texts.map(lambda text: bool(str(text).strip()))]
        if len(filled) == 0:
            findings.add(
                "the shown column is empty", Place(file, column=column), "leave it out", "note"
            )
            continue
        where = Place(file, column=column)
        named = filled.map(lambda text: fold(str(text))).isin({fold(c) for c in labels.coders})
        if float(named.mean()) >= _TELLING or set(fold(column).split()) & CODER_WORDS:
            findings.add(
                "the shown column seems to name coders, which adjudicators should not see",
                where,
                "leave it out of `show`",
                "warning",
            )
            continue
        for name in labels.variables:
            share = _share_told(labels, name, texts)
            if share >= _TELLING:
                findings.add(
                    f'the shown column matches {share:.0%} of the labels of "{name}", so it gives '
                    "them away",
                    where,
                    "leave it out of `show`",
                    "warning",
                )


def _share_told(labels: LabelData, name: str, texts: pd.Series) -> float:
    """The share of labels that the item's text in this column repeats."""
    held = labels.variables[name].labels
    if held.n_labels == 0:
        return 0.0
    codes = {fold(text): at for at, text in enumerate(labels.variables[name].texts)}
    of_item = texts.reindex(labels.items).map(lambda text: codes.get(fold(str(text)), -1))
    told = of_item.to_numpy(dtype=np.int64)[held.item_index]
    same: BoolArray = told == held.value_index
    # A column that is always the same tells nothing.
    return float(same.mean()) if np.unique(told[told >= 0]).size > 1 else 0.0
