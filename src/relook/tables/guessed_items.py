"""Which table holds the items' texts, by matching ids, and which of its columns to show."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from relook.errors import RelookError
from relook.tables.guessed_roles import Line, Roles
from relook.tables.headers import find_column, fold
from relook.tables.reading import Table
from relook.tables.schema import ItemSource
from relook.tables.sketches import GROUP_WORDS, Sketch, dated, sketch

_MOST_SHOWN = 4


def guess_items(
    labelled: Sequence[tuple[Path, Table]],
    others: Sequence[tuple[Path, Table, bool]],
    roles: Roles,
    *,
    key: str | None,
    show: tuple[str, ...] | None,
    group_by: tuple[str, ...] | None,
) -> tuple[ItemSource | None, list[Line], set[Path]]:
    """Find the item table among the files that hold no labels, or in the label table itself.

    Parameters
    ----------
    labelled : sequence of (path, table)
    others : sequence of (path, table, named)
        `named` where the user said that it is an item table.
    roles : Roles
    key, show, group_by : optional
        What the user said.

    Returns
    -------
    items : ItemSource or None
    lines : list of Line
    used : set of Path
        The files among `others` that serve.

    Raises
    ------
    RelookError
        A named item table without a column of the items' ids, or a told column that is not there.
    """
    ids: set[str] = set()
    for _, table in labelled if others else ():
        ids.update(table.coded(table.find(roles.item))[1].tolist())
    found: list[tuple[Path, Table, str]] = []
    for path, table, named in others:
        column = key if key is not None and named else _key_column(table, ids)
        if column is None and named:
            raise RelookError(
                "no column of the item table holds the items' ids",
                where=table.place,
                mend="name it with --key, or check the ids",
            )
        if column is not None:
            found.append((path, table, table.header[table.find(column, "the items")]))
    if found:
        first = found[0]
        alike = [one for one in found if fold(one[2]) == fold(first[2])]
        return _from_table(alike, roles, ids, show, group_by, own=False)
    if len(labelled) == 1:
        path, table = labelled[0]
        return _from_table([(path, table, roles.item)], roles, ids, show, group_by, own=True)
    return None, [], set()


def _key_column(table: Table, ids: set[str]) -> str | None:
    """The column without repeats that knows most of the labelled items, at least half of them."""
    best, most = None, 0.5
    for one in sketch(table):
        texts = set(one.texts.tolist())
        share = len(ids & texts) / len(ids) if ids else 0.0
        if one.n_distinct == len(one.codes) and share >= most and (best is None or share > most):
            best, most = one.header, share
    return best


def _from_table(
    found: Sequence[tuple[Path, Table, str]],
    roles: Roles,
    ids: set[str],
    show: tuple[str, ...] | None,
    group_by: tuple[str, ...] | None,
    *,
    own: bool,
) -> tuple[ItemSource | None, list[Line], set[Path]]:
    _, table, key = found[0]
    taken = {fold(key)}
    if own:
        taken |= {fold(one.header) for one in roles.label_sketches}
        taken |= {fold(name) for name in (roles.item, roles.coder, roles.remark) if name}
    columns = [one for one in sketch(table) if fold(one.header) not in taken]
    if own:
        item, items = table.coded(table.find(roles.item))
        repeats = len(items) < item.size
        columns = [one for one in columns if not repeats or one.constant_within(item)]
    shown = _told(show, table) if show is not None else _to_show(columns, own)
    groups = _told(group_by, table) if group_by is not None else _to_group(columns)
    if own and not shown and not groups:
        return None, [], set()
    source = ItemSource(
        files=tuple(path for path, _, _ in found), key=key, show=shown, group_by=groups
    )
    lines: list[Line] = []
    names = ", ".join(one.file for _, one, _ in found)
    if own:
        lines.append(("item table", f"{names} itself", "it holds the items' texts", "--items"))
    else:
        keys = {str(text) for text in table.coded(table.find(key))[1]}
        known = len(ids & keys)
        lines.append(
            (
                "item table",
                f'{names}, by column "{key}"',
                f"it knows {known:,} of {len(ids):,} labelled items",
                "--items, --key",
            )
        )
    quoted = ", ".join(f'"{name}"' for name in shown) or "none"
    why = "" if show is not None else "texts to read come first, ids and dates are left out"
    lines.append(("columns shown to adjudicators", quoted, why, "--show"))
    if groups:
        quoted = ", ".join(f'"{name}"' for name in groups)
        why = "" if group_by is not None else "few texts recur in each"
        lines.append(("columns to break figures down by", quoted, why, "--group-by"))
    return source, lines, {path for path, _, _ in found}


def _told(names: tuple[str, ...], table: Table) -> tuple[str, ...]:
    return tuple(table.header[find_column(table.header, name, table.place)] for name in names)


def _to_show(columns: Sequence[Sketch], own: bool) -> tuple[str, ...]:
    """Prose first, then what varies; in a label table prose and what is named like a group only."""
    filled = [one for one in columns if one.n_filled]
    prose = [one for one in filled if _readable(one)]
    rest = [
        one
        for one in filled
        if all(one is not other for other in prose)
        and not one.unique
        and (one.words & GROUP_WORDS or (not own and one.label_like and not dated(one)))
    ]
    return tuple(one.header for one in (prose + rest)[:_MOST_SHOWN])


def _readable(one: Sketch) -> bool:
    if one.prose:
        return True
    texts = [str(text) for text in one.texts[one.filled][:500]]
    spaced = sum(" " in text.strip() for text in texts)
    return bool(texts) and spaced * 2 > len(texts) and one.n_distinct > 0.5 * one.n_filled


def _to_group(columns: Sequence[Sketch]) -> tuple[str, ...]:
    """Columns of 2 to 12 texts, each with five items on average."""
    return tuple(
        one.header
        for one in columns
        if 2 <= one.n_distinct <= 12 and one.n_filled >= 5 * one.n_distinct and not one.prose
    )[:_MOST_SHOWN]
