"""Which adjudicator gets which rows, and in which order.

Ranked for selection, shuffled for presentation: the plan is made from sets of items, and every
order in it is keyed, so that a row's place says nothing of its rank or of why it was sent.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

from relook.errors import RelookError
from relook.worksheet.keys import keyed_order, row_keys, worksheet_id

RowKind = Literal["disputed", "audit", "split", "recheck"]
#: Kinds that already go to a particular further adjudicator, and so to no second one as overlap.
_NOT_DOUBLED = ("split", "recheck")


@dataclass(frozen=True, slots=True, kw_only=True)
class PlanItem:
    """Rows of one item, sent for one reason.

    Attributes
    ----------
    item : str
    variables : tuple of str
        One row each.
    kind : {"disputed", "audit", "split", "recheck"}
    stratum : str
        Where an audit item was drawn from; "" for others.
    coders : tuple of str
        Who labelled the item.
    barred : tuple of str
        Ids of adjudicators who must not get it, as those whose decisions differ.
    """

    item: str
    variables: tuple[str, ...]
    kind: RowKind
    stratum: str = ""
    coders: tuple[str, ...] = ()
    barred: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Adjudicator:
    """Somebody who rules.

    Attributes
    ----------
    id : str
    name : str
    coder : str or None
        The coder that this person also is.
    """

    id: str
    name: str
    coder: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class PlannedRow:
    """A row as it goes into a worksheet."""

    key: str
    item: str
    variable: str
    kind: RowKind
    stratum: str


@dataclass(frozen=True, slots=True, kw_only=True)
class PlannedWorksheet:
    """One file for one adjudicator.

    Attributes
    ----------
    id : str
    adjudicator : Adjudicator
    part, n_parts : int
        From 1; where a size limit split an adjudicator's rows.
    rows : tuple of PlannedRow
        In the order shown, an item's rows together.
    """

    id: str
    adjudicator: Adjudicator
    part: int
    n_parts: int
    rows: tuple[PlannedRow, ...]

    @property
    def suffix(self) -> str:
        """What sets this part's file name apart: "-1", "-2", or nothing."""
        return f"-{self.part}" if self.n_parts > 1 else ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Unplanned:
    """An item that nobody can be given, and why."""

    item: str
    variables: tuple[str, ...]
    reason: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Plan:
    """Who gets what.

    Attributes
    ----------
    worksheets : tuple of PlannedWorksheet
        In the order of the adjudicators, then by part; none for an adjudicator without rows.
    unplanned : tuple of Unplanned
        By item; left for the lead.
    n_overlap : int
        Items that go to two adjudicators.
    said : tuple of str
        What could not be had as asked, in words.
    """

    worksheets: tuple[PlannedWorksheet, ...]
    unplanned: tuple[Unplanned, ...]
    n_overlap: int
    said: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class _Bundle:
    """All the rows of one item: they stay together."""

    item: str
    parts: tuple[PlanItem, ...]
    able: tuple[int, ...]  # adjudicators who may have it

    @property
    def size(self) -> int:
        return sum(len(part.variables) for part in self.parts)

    @property
    def doubled(self) -> bool:
        return len(self.able) > 1 and all(part.kind not in _NOT_DOUBLED for part in self.parts)


def plan_worksheets(
    items: Sequence[PlanItem],
    adjudicators: Sequence[Adjudicator],
    *,
    secret: bytes,
    round_number: int,
    overlap: float = 0.0,
    size_limit: int | None = None,
) -> Plan:
    """Deal items out to adjudicators.

    Parameters
    ----------
    items : sequence of PlanItem
        Their order does not matter. Entries of the same item are kept together.
    adjudicators : sequence of Adjudicator
    secret : bytes
    round_number : int
    overlap : float
        Share of the items that go to two adjudicators, 0 to 1.
    size_limit : int, optional
        Most rows of one file; an item's rows are never parted, so one item may exceed it.

    Returns
    -------
    Plan
        The same one for the same items, whatever their order.

    Raises
    ------
    RelookError
        No adjudicators, two with one id, or a share or limit out of bounds.
    """
    _check(adjudicators, overlap, size_limit)
    bundles, unplanned = _bundled(items, adjudicators)
    place = f"round {round_number}"
    order = keyed_order(secret, f"deal {place}", [bundle.item for bundle in bundles])
    bundles = [bundles[at] for at in order]
    shared, said = _overlapping(bundles, overlap)
    dealt = _deal(bundles, shared, len(adjudicators))
    worksheets: list[PlannedWorksheet] = []
    for at, adjudicator in enumerate(adjudicators):
        own = [bundles[index] for index in sorted(dealt[at])]
        purpose = f"order {place} {adjudicator.id}"
        own = [own[index] for index in keyed_order(secret, purpose, [b.item for b in own])]
        parts = _parts(own, size_limit)
        for number, part in enumerate(parts, start=1):
            name = worksheet_id(secret, round_number, adjudicator.id, number)
            worksheets.append(
                PlannedWorksheet(
                    id=name,
                    adjudicator=adjudicator,
                    part=number,
                    n_parts=len(parts),
                    rows=_rows(part, name, secret),
                )
            )
    if unplanned:
        said.append(
            f"{len(unplanned):,} items can be given to nobody: every adjudicator labelled them or "
            "has ruled on them already"
        )
    return Plan(
        worksheets=tuple(worksheets),
        unplanned=unplanned,
        n_overlap=len(shared),
        said=tuple(said),
    )


def _check(adjudicators: Sequence[Adjudicator], overlap: float, size_limit: int | None) -> None:
    if not adjudicators:
        raise RelookError(
            "there is no adjudicator",
            mend='name one under [worksheet], such as adjudicators = ["Ada"]',
        )
    if len({adjudicator.id for adjudicator in adjudicators}) < len(adjudicators):
        raise RelookError(
            "an adjudicator is named twice", mend="name each one once under [worksheet]"
        )
    if not 0 <= overlap <= 1:
        raise RelookError(f"`overlap` must be from 0 to 1; got {overlap:g}")
    if size_limit is not None and size_limit < 1:
        raise RelookError(f"the most rows of a worksheet must be 1 or more; got {size_limit}")


def _bundled(
    items: Sequence[PlanItem], adjudicators: Sequence[Adjudicator]
) -> tuple[list[_Bundle], tuple[Unplanned, ...]]:
    by_item: dict[str, list[PlanItem]] = {}
    for item in items:
        by_item.setdefault(item.item, []).append(item)
    bundles, unplanned = [], []
    for name, entries in sorted(by_item.items()):
        parts = tuple(sorted(entries, key=lambda entry: (entry.kind, entry.variables)))
        coders = {coder for part in parts for coder in part.coders}
        barred = {each for part in parts for each in part.barred}
        coded = [a.coder is not None and a.coder in coders for a in adjudicators]
        able = tuple(
            at
            for at, adjudicator in enumerate(adjudicators)
            if not coded[at] and adjudicator.id not in barred
        )
        if able:
            bundles.append(_Bundle(name, parts, able))
            continue
        variables = tuple(variable for part in parts for variable in part.variables)
        reason = (
            "every adjudicator labelled it as a coder"
            if all(coded)
            else "every adjudicator has ruled on it already or labelled it as a coder"
        )
        unplanned.append(Unplanned(item=name, variables=variables, reason=reason))
    return bundles, tuple(unplanned)


def _overlapping(bundles: Sequence[_Bundle], share: float) -> tuple[set[int], list[str]]:
    """Choose the items that go to two: the first ones, in the keyed order that they come in."""
    wanted = int(share * len(bundles) + 0.5)
    possible = [at for at, bundle in enumerate(bundles) if bundle.doubled]
    said = []
    if wanted > len(possible):
        said.append(f"{wanted:,} items were to go to two adjudicators; only {len(possible):,} can")
    return set(possible[:wanted]), said


def _deal(bundles: Sequence[_Bundle], shared: set[int], n_adjudicators: int) -> list[set[int]]:
    """Deal bundles so that everybody gets about as many rows, and of each kind a like share.

    Those whom few may have are dealt first, the largest of them first; each goes to whoever has
    least. Moves from the fullest sheet then even out what that order left uneven.
    """
    load = [0] * n_adjudicators
    dealt: list[set[int]] = [set() for _ in range(n_adjudicators)]
    by_need = sorted(
        range(len(bundles)),
        key=lambda at: (len(bundles[at].able), bundles[at].parts[0].kind, -bundles[at].size, at),
    )
    for times in (1, 2):
        for at in by_need:
            if times == 2 and at not in shared:
                continue
            free = [who for who in bundles[at].able if at not in dealt[who]]
            # Which of several equally loaded ones is next turns with the bundle, or the first
            # adjudicator would always be served first.
            who = min(free, key=lambda each: (load[each], (each - at) % n_adjudicators))
            dealt[who].add(at)
            load[who] += bundles[at].size
    _even_out(bundles, dealt, load)
    return dealt


def _even_out(bundles: Sequence[_Bundle], dealt: list[set[int]], load: list[int]) -> None:
    """Move bundles from fuller to emptier sheets as long as that evens them out."""
    moved = True
    while moved:
        moved = False
        for giver in sorted(range(len(load)), key=lambda who: (-load[who], who)):
            for taker in sorted(range(len(load)), key=lambda who: (load[who], who)):
                gap = load[giver] - load[taker]
                movable = [
                    at
                    for at in sorted(dealt[giver])
                    if bundles[at].size < gap
                    and taker in bundles[at].able
                    and at not in dealt[taker]
                ]
                if not movable:
                    continue
                best = min(movable, key=lambda at: (abs(gap - 2 * bundles[at].size), at))
                dealt[giver].remove(best)
                dealt[taker].add(best)
                load[giver] -= bundles[best].size
                load[taker] += bundles[best].size
                moved = True
                break
            if moved:
                break


def _parts(bundles: Sequence[_Bundle], size_limit: int | None) -> list[list[_Bundle]]:
    """Split into as few parts as the limit asks for, about equally long."""
    if not bundles:
        return []
    total = sum(bundle.size for bundle in bundles)
    if size_limit is None or total <= size_limit:
        return [list(bundles)]
    n_parts = -(-total // size_limit)
    while True:
        parts = _cut(bundles, -(-total // n_parts), size_limit)
        if len(parts) <= n_parts or n_parts >= len(bundles):
            return parts
        n_parts = len(parts)


def _cut(bundles: Sequence[_Bundle], aim: int, most: int) -> list[list[_Bundle]]:
    parts: list[list[_Bundle]] = [[]]
    size = 0
    for bundle in bundles:
        full = size >= aim or size + bundle.size > most
        if parts[-1] and full:
            parts.append([])
            size = 0
        parts[-1].append(bundle)
        size += bundle.size
    return parts


def _rows(bundles: Iterable[_Bundle], worksheet: str, secret: bytes) -> tuple[PlannedRow, ...]:
    rows = [
        (bundle.item, variable, part)
        for bundle in bundles
        for part in bundle.parts
        for variable in part.variables
    ]
    # Within an item by variable: the order of its parts would tell their kinds.
    place: Mapping[str, int] = {item: at for at, (item, _, _) in enumerate(rows)}
    rows.sort(key=lambda row: (place[row[0]], row[1]))
    keys = row_keys(secret, worksheet, [(item, variable) for item, variable, _ in rows])
    return tuple(
        PlannedRow(key=key, item=item, variable=variable, kind=part.kind, stratum=part.stratum)
        for key, (item, variable, part) in zip(keys, rows, strict=True)
    )
