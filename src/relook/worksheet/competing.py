"""Which labels a row shows to choose between, so that an audit row looks like any other.

An item whose coders agreed shows one label; beside disputed items that would give it away, and an
adjudicator who knows that everybody agreed tends to agree as well. So a row that is sent at random
shows further labels, as many as disputed rows show, drawn from pairs of labels that really occur
together. The first sheet of every such worksheet says that a row may show labels nobody gave.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation

from relook.errors import RelookError
from relook.worksheet.keys import keyed_number, keyed_order
from relook.worksheet.layout import MOST_LABEL_COLUMNS
from relook.worksheet.model import Reveal
from relook.worksheet.plan import RowKind

#: Kinds whose labels alone would tell why they were sent.
PADDED: tuple[RowKind, ...] = ("audit", "recheck")
PairWeights = Mapping[tuple[str, str], float]


@dataclass(frozen=True, slots=True, kw_only=True)
class RowLabels:
    """The distinct labels that coders gave to one variable of one item.

    Attributes
    ----------
    item, variable : str
    kind : {"disputed", "audit", "split", "recheck"}
    given : tuple of str
        Distinct.
    """

    item: str
    variable: str
    kind: RowKind
    given: tuple[str, ...]


def pairs_of(rows: Iterable[RowLabels]) -> dict[str, dict[tuple[str, str], float]]:
    """Count, by variable, in how many rows each two labels were both given.

    The two labels of a pair are sorted.
    """
    counted: dict[str, dict[tuple[str, str], float]] = {}
    for row in rows:
        own = counted.setdefault(row.variable, {})
        labels = sorted(set(row.given))
        for at, first in enumerate(labels):
            for second in labels[at + 1 :]:
                own[first, second] = own.get((first, second), 0.0) + 1.0
    return counted


def competing_labels(
    rows: Sequence[RowLabels],
    pairs: Mapping[str, PairWeights],
    *,
    reveal: Reveal,
    secret: bytes,
    numeric: Iterable[str] = (),
    remarks_shown: bool = False,
) -> dict[tuple[str, str], tuple[str, ...]]:
    """Return the labels that each row is to show, in no order yet (see `shown_order`).

    Parameters
    ----------
    rows : sequence of RowLabels
        All the rows of a round, each (item, variable) once.
    pairs : mapping of str to mapping of (str, str) to float
        By variable: in how many items two labels meet (see `pairs_of`), over all items.
    reveal : {"nothing", "labels", "tallies", "names"}
        Further labels are shown under "labels" only; under "tallies" and "names" a row shows what
        was given, and audit rows can be told.
    secret : bytes
    numeric : iterable of str
        Variables whose labels are numbers.
    remarks_shown : bool

    Returns
    -------
    dict of (item, variable) to tuple of str

    Raises
    ------
    RelookError
        Remarks are shown beside audit rows that are to be hidden: a remark exists only for labels
        that were given, so it would tell them apart.
    """
    hidden = [row for row in rows if row.kind in PADDED] if reveal in ("nothing", "labels") else []
    if hidden and remarks_shown:
        raise RelookError(
            "coders' remarks would tell which rows are audits",
            mend='show no remarks, or send no audit items, or set reveal = "tallies" under '
            "[worksheet] and do without hidden audits",
        )
    if reveal == "nothing":
        return {(row.item, row.variable): () for row in rows}
    shown = {(row.item, row.variable): tuple(row.given) for row in rows}
    if reveal != "labels":
        return shown
    numbers = set(numeric)
    for row, size in _sizes(rows, hidden, secret):
        draw = _Draw(row, pairs.get(row.variable, {}), secret, numeric=row.variable in numbers)
        shown[row.item, row.variable] = draw.up_to(size)
    return shown


def shown_order(
    labels: Sequence[str], *, item: str, variable: str, worksheet: str, secret: bytes, numeric: bool
) -> tuple[str, ...]:
    """Return labels in the order in which a row shows them.

    Keyed by row and worksheet, so that neither how often a label was given nor who gave it shows;
    numbers ascend. So many that they share one cell are sorted.
    """
    if numeric:
        return tuple(sorted(labels, key=_number_key))
    if len(labels) > MOST_LABEL_COLUMNS:
        return tuple(sorted(labels))
    purpose = "\0".join(("labels", worksheet, item, variable))
    return tuple(labels[at] for at in keyed_order(secret, purpose, labels))


def _sizes(
    rows: Sequence[RowLabels], hidden: Sequence[RowLabels], secret: bytes
) -> list[tuple[RowLabels, int]]:
    """Give hidden rows numbers of labels that are spread like those of the other rows.

    The sizes of a variable's other rows are sampled at equal steps from a keyed start, and the
    largest go to the rows that already have most labels.
    """
    sized: list[tuple[RowLabels, int]] = []
    for variable in sorted({row.variable for row in hidden}):
        others = [row for row in rows if row.kind not in PADDED]
        own = [row for row in others if row.variable == variable] or others
        sizes = sorted((max(2, len(row.given)) for row in own), reverse=True) or [2]
        padded = [row for row in hidden if row.variable == variable]
        order = keyed_order(secret, f"sizes {variable}", [row.item for row in padded])
        padded = sorted((padded[at] for at in order), key=lambda row: -len(row.given))
        start = keyed_number(secret, "size start", variable)
        for at, row in enumerate(padded):
            sampled = sizes[int((at + start) / len(padded) * len(sizes))]
            sized.append((row, max(sampled, len(row.given))))
    return sized


class _Draw:
    """Draws further labels for one row, each with a chance proportional to its weight.

    Of candidates with weights w the one with the least -log(u) / w wins, u keyed and uniform: an
    exponential race, which is a weighted draw (Efraimidis & Spirakis 2006), and needs no state.
    """

    def __init__(self, row: RowLabels, pairs: PairWeights, secret: bytes, *, numeric: bool) -> None:
        self._row = row
        self._secret = secret
        self._numeric = numeric
        self._pairs = pairs
        self._beside: dict[str, dict[str, float]] = {}
        for (first, second), weight in pairs.items():
            if weight > 0 and first != second:
                for one, other in ((first, second), (second, first)):
                    known = self._beside.setdefault(one, {})
                    known[other] = known.get(other, 0.0) + weight

    def up_to(self, size: int) -> tuple[str, ...]:
        """Return the row's labels and further ones, `size` together or as many as there are."""
        labels = list(self._row.given)
        while len(labels) < size:
            further = self._winner(self._candidates(labels))
            if further is None:
                break
            labels.append(further)
        return tuple(labels)

    def _candidates(self, labels: Sequence[str]) -> dict[str, float]:
        """Weigh labels that met one of these; else numbers as far off as numbers are; else any."""
        weights: dict[str, float] = {}
        for label in labels:
            for other, weight in self._beside.get(label, {}).items():
                if other not in labels:
                    weights[other] = weights.get(other, 0.0) + weight
        if weights:
            return weights
        if self._numeric:
            weights = self._by_gap(labels)
        if weights:
            return weights
        return {
            label: sum(beside.values())
            for label, beside in self._beside.items()
            if label not in labels
        }

    def _by_gap(self, labels: Sequence[str]) -> dict[str, float]:
        """Weigh numbers that lie from a label as two labels of a real pair lie from each other.

        Numbers outside the range of labels that occur are left out.
        """
        numbers = {label: _number(label) for label in self._beside}
        known = [number for number in numbers.values() if number is not None]
        weights: dict[str, float] = {}
        taken = {_number(label) for label in labels}
        for label in labels:
            base = _number(label)
            if base is None or not known:
                continue
            for (first, second), weight in self._pairs.items():
                one, other = numbers.get(first), numbers.get(second)
                if one is None or other is None:
                    continue
                for moved in (base + (other - one), base - (other - one)):
                    if min(known) <= moved <= max(known) and moved not in taken:
                        text = format(moved, "f")
                        weights[text] = weights.get(text, 0.0) + weight
        return weights

    def _winner(self, weights: Mapping[str, float]) -> str | None:
        def time(label: str) -> tuple[float, str]:
            chance = keyed_number(
                self._secret, "further label", self._row.item, self._row.variable, label
            )
            return -math.log(1.0 - chance) / weights[label], label

        return min(weights, key=time) if weights else None


def _number(text: str) -> Decimal | None:
    try:
        number = Decimal(text.strip())
    except InvalidOperation:
        return None
    return number if number.is_finite() else None


def _number_key(text: str) -> tuple[bool, Decimal, str]:
    number = _number(text)
    return number is None, number if number is not None else Decimal(0), text
