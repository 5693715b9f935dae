"""What a bare table most likely means: said in full, and open to correction in every part.

Nothing is guessed beyond what the table can defend. Where two readings are possible the weaker
assumption is taken, and the line that says so names the flag that changes it.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from relook.errors import RelookError, listed
from relook.tables.arrow_columns import release_memory
from relook.tables.guessed_columns import guess_roles
from relook.tables.guessed_items import guess_items
from relook.tables.guessed_roles import Roles
from relook.tables.headers import fold
from relook.tables.reading import Doing, Table, find_files, read_table, silently
from relook.tables.schema import Duplicates, ItemSource, LabelSource, Layout, Variable
from relook.tables.sketches import CODER_WORDS, MISSING_MARKS, Sketch, sketch


@dataclass(frozen=True, slots=True, kw_only=True)
class Overrides:
    """What the user says outright; None and empty mean: to be guessed.

    Attributes
    ----------
    layout : {"long", "by-coder", "counts"} or None
    item, coder, remark : str or None
        Columns.
    coder_from : {"column", "file"} or None
    labels : tuple of str
        The columns that hold labels: one per variable (long), or one per coder (by-coder), or one
        per label value (counts).
    columns : str or None
        Pattern of by-coder columns with several variables.
    variable : str or None
        Name of the variable in a table that has one.
    difference : mapping of str to str
        Difference function by variable; the key "" is for every variable not named.
    declared : mapping of str to tuple of str
        Declared labels by variable; the key "" likewise.
    options : mapping of str to mapping
        Options of the difference function by variable; the key "" likewise.
    missing : tuple of str or None
    items : tuple of Path
        Item tables.
    key : str or None
        Column of the item ids in the item table.
    show, group_by : tuple of str or None
    sheet, delimiter, encoding : str or None
    duplicates : {"error", "first", "last"} or None
    leave_out : tuple of str
    """

    layout: Layout | None = None
    item: str | None = None
    coder: str | None = None
    coder_from: str | None = None
    labels: tuple[str, ...] = ()
    columns: str | None = None
    variable: str | None = None
    remark: str | None = None
    difference: Mapping[str, str] = field(default_factory=dict)
    declared: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    options: Mapping[str, Mapping[str, object]] = field(default_factory=dict)
    missing: tuple[str, ...] | None = None
    items: tuple[Path, ...] = ()
    key: str | None = None
    show: tuple[str, ...] | None = None
    group_by: tuple[str, ...] | None = None
    sheet: str | None = None
    delimiter: str | None = None
    encoding: str | None = None
    duplicates: Duplicates | None = None
    leave_out: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Guessed:
    """One thing that was guessed.

    Attributes
    ----------
    what, value : str
    because : str
        From what it was guessed; "" where the user said it.
    change : str
        The flag that changes it.
    """

    what: str
    value: str
    because: str
    change: str

    def __str__(self) -> str:
        if not self.because:
            return f"{self.what}: {self.value} (as told)"
        return f"{self.what}: {self.value}, because {self.because} (change: {self.change})"


@dataclass(frozen=True, slots=True)
class Guess:
    """A whole guess.

    Attributes
    ----------
    source : LabelSource
    variables : tuple of Variable
    items : ItemSource or None
    said : tuple of str
        A line per file read and a line per thing guessed, ready to print.
    guesses : tuple of Guessed
        The same guesses in parts.
    unused : tuple of str
        Files that were given and are of no use here.
    tables : dict of Path to Table
        What was read on the way, by whole path; a large table need not be read again.
    """

    source: LabelSource
    variables: tuple[Variable, ...]
    items: ItemSource | None
    said: tuple[str, ...]
    guesses: tuple[Guessed, ...] = ()
    unused: tuple[str, ...] = ()
    tables: dict[Path, Table] = field(default_factory=dict)


def guess(
    paths: Sequence[Path | str],
    overrides: Overrides | None = None,
    root: Path | None = None,
    doing: Doing = silently,
) -> Guess:
    """Guess what label tables mean.

    Parameters
    ----------
    paths : sequence of Path or str
        Label tables, and item tables among them if there are any; patterns are allowed.
    overrides : Overrides, optional
    root : Path, optional
        The folder that paths are relative to; the current one where left out.
    doing : callable, optional
        Told what is being done, in words for the user.

    Returns
    -------
    Guess

    Raises
    ------
    RelookError
        A file that cannot be read, a column that is not there, or a table in which no reading can
        be defended.
    """
    told = overrides or Overrides()
    root = Path() if root is None else root
    files = find_files([*paths, *told.items], root)
    wanted = () if told.item is None else (told.item,)
    tables: list[Table] = []
    for path in files:
        is_items = path in told.items
        doing(f"reading {path}")
        tables.append(
            read_table(
                path,
                root,
                sheet=None if is_items else told.sheet,
                delimiter=None if is_items else told.delimiter,
                encoding=None if is_items else told.encoding,
                wanted=() if is_items else wanted,
            )
        )
        if tables[-1].n_rows == 0:
            raise RelookError(
                "the table has a header and no rows",
                where=tables[-1].place,
                mend="give a table with labels",
            )
    doing("looking at the columns")
    named = {Path(path) for path in told.items}
    labelled, others = _label_tables(
        [at for at, path in enumerate(files) if path not in named], tables
    )
    others += [at for at, path in enumerate(files) if path in named]
    sketches = [sketch(tables[at]) for at in labelled]
    roles = guess_roles([tables[at] for at in labelled], sketches, told_roles(told))
    missing, missing_line = _missing(roles, told)
    variables, variable_lines = _variables(roles, told)
    items, item_lines, used = guess_items(
        [(files[at], tables[at]) for at in labelled],
        [(files[at], tables[at], files[at] in named) for at in others],
        roles,
        key=told.key,
        show=told.show,
        group_by=told.group_by,
    )
    source = LabelSource(
        files=tuple(files[at] for at in labelled),
        layout=roles.layout,
        item=roles.item,
        coder=roles.coder,
        coder_from="file" if roles.coder_from_file else "column",
        coders=() if roles.layout == "counts" else roles.coder_columns,
        columns=roles.pattern,
        missing=missing,
        duplicates=told.duplicates or "error",
        leave_out=told.leave_out,
        remark=roles.remark,
        sheet=told.sheet,
        delimiter=told.delimiter,
        encoding=told.encoding,
    )
    lines = [Guessed(*line) for line in [*roles.lines, missing_line, *variable_lines, *item_lines]]
    unused = tuple(tables[at].file for at in others if files[at] not in used)
    said = [table.said for table in tables] + [str(line) for line in lines]
    said += [f"{file}: not used, no column holds the items' ids" for file in unused]
    read = {
        (root / path).resolve(): table.without_cells()
        for path, table in zip(files, tables, strict=True)
        # In a workbook the settings may mean another sheet than the one that was looked at.
        if table.sheet is None
    }
    tables.clear()
    release_memory()
    return Guess(source, variables, items, tuple(said), tuple(lines), unused, read)


def told_roles(told: Overrides) -> dict[str, object]:
    """Return the overrides that concern columns."""
    names = ("layout", "item", "coder", "coder_from", "labels", "columns", "variable", "remark")
    return {name: getattr(told, name) for name in names}


def _label_tables(among: Sequence[int], tables: Sequence[Table]) -> tuple[list[int], list[int]]:
    """Part the label tables from the rest: label tables share two headers or more.

    The largest family is taken; among equal ones that with a column named like a coder's, then the
    one with most rows.
    """
    if not among:
        raise RelookError("no label table is named", mend="name a table with labels")
    headers = {at: {fold(h) for h in tables[at].header if h.strip()} for at in among}
    families: list[list[int]] = []
    for at in among:
        kin = [
            family
            for family in families
            if any(_alike(headers[at], headers[other]) for other in family)
        ]
        merged = sorted([at, *(one for family in kin for one in family)])
        families = [family for family in families if family not in kin] + [merged]

    def weight(family: list[int]) -> tuple[int, bool, int]:
        words = {word for one in family for header in headers[one] for word in header.split()}
        rows = sum(tables[one].n_rows for one in family)
        return len(family), bool(words & CODER_WORDS), rows

    chosen = max(families, key=weight)
    return chosen, [at for at in among if at not in chosen]


def _alike(first: set[str], second: set[str]) -> bool:
    shared = len(first & second)
    return shared >= 2 and shared * 2 >= min(len(first), len(second))


def _missing(roles: Roles, told: Overrides) -> tuple[tuple[str, ...], tuple[str, str, str, str]]:
    flag = "--missing"
    if told.missing is not None:
        return told.missing, ("missing labels", listed(told.missing), "", flag)
    texts = {str(text) for one in roles.label_sketches for text in one.texts}
    found = [mark for mark in MISSING_MARKS if mark in texts and mark]
    missing = tuple(dict.fromkeys(["", "NA", *found]))
    because = f"{listed(found)} stands in label cells" if found else "nothing else looks like one"
    return missing, ("missing labels", listed(missing), because, flag)


def _variables(
    roles: Roles, told: Overrides
) -> tuple[tuple[Variable, ...], list[tuple[str, str, str, str]]]:
    variables, lines = [], []
    for name, column in roles.variables:
        columns = roles.sketches_of(name)
        level, because = _level(columns, roles)
        difference = told.difference.get(name, told.difference.get(""))
        declared = told.declared.get(name, told.declared.get(""))
        if roles.layout == "counts" and declared is None:
            declared = roles.coder_columns
        options = told.options.get(name, told.options.get("", {}))
        if difference is not None:
            because = ""
        variables.append(
            Variable(
                name=name,
                column=column,
                difference=difference or level,
                labels=declared,
                options=options,
            )
        )
        lines.append(
            (
                f'difference function of "{name}"',
                difference or level,
                because,
                "--difference",
            )
        )
    return tuple(variables), lines


def _level(columns: Sequence[Sketch], roles: Roles) -> tuple[str, str]:
    """The weakest level of measurement that the labels allow, and why."""
    if roles.layout == "counts":
        return "nominal", "column names are labels without a known order"
    if columns and all(one.whole for one in columns if one.n_filled):
        return (
            "nominal",
            (
                "whole numbers may be codes, ranks or amounts, and the weakest reading is taken; "
                "use ordinal if they are ranks, interval if equal steps mean equal differences"
            ),
        )
    if columns and all(one.numeric for one in columns if one.n_filled):
        return (
            "ordinal",
            (
                "numbers with decimals have an order, and no more is taken for granted; use "
                "interval if equal steps mean equal differences"
            ),
        )
    texts = [str(text) for one in columns for text in one.texts[one.filled]]
    for separator in (";", "|", ","):
        parts = [text.split(separator) for text in texts]
        several = [part for part in parts if len(part) > 1]
        if len(several) * 3 > len(parts) > 0 and _recur(several):
            return (
                "nominal",
                (
                    f'the labels are words; some cells hold several joined by "{separator}": use '
                    f"jaccard:{separator} if they are sets of labels"
                ),
            )
    return "nominal", "the labels are words; use ordinal and declare their order if they have one"


def _recur(several: Sequence[Sequence[str]]) -> bool:
    """Whether the pieces of joined labels occur again and again, as labels do."""
    pieces = [fold(piece) for part in several for piece in part]
    return len(set(pieces)) * 2 <= len(pieces)
