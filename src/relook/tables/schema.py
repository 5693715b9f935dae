"""What a project says about its tables: plain declarations, no reading.

These are what relook.toml declares, or what was guessed from a bare table.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from pathlib import Path
from typing import Literal

Layout = Literal["long", "by-coder", "counts"]
Duplicates = Literal["error", "first", "last"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Variable:
    """A question asked of each item.

    Attributes
    ----------
    name : str
    difference : str
        A name in `relook.core.differences.DIFFERENCE_FUNCTIONS`.
    column : str or None
        The column of its labels in a long table; for counts and by-coder tables see `LabelSource`.
    labels : tuple of str or None
        The declared labels, in order for ordinal variables; None: those that occur.
    weight : float
        Its weight in the ranking over several variables.
    tolerance : Fraction
        Numbers this close are not in dispute.
    code_book : Path or None
        Table with the columns label, meaning, example.
    options : mapping of str to object
        What the difference function needs besides (period, ends, separator, table).
    decimal : {".", ","}
        The decimal mark of labels that are numbers.
    """

    name: str
    difference: str = "nominal"
    column: str | None = None
    labels: tuple[str, ...] | None = None
    weight: float = 1.0
    tolerance: Fraction = Fraction(0)
    code_book: Path | None = None
    options: Mapping[str, object] = field(default_factory=dict)
    decimal: str = "."


@dataclass(frozen=True, slots=True, kw_only=True)
class LabelSource:
    """Where the labels are and how the table is laid out.

    Attributes
    ----------
    files : tuple of Path
        In the order to read them.
    layout : {"long", "by-coder", "counts"}
        long: a row per label. by-coder: a row per item, a column per coder. counts: a row per item,
        a column per label value holding how many coders gave it.
    item : str
        Column of the item ids.
    coder : str or None
        Column of the coder ids (long layout).
    coder_from : {"column", "file"}
        "file": one file per coder, the coder named by the file's name without its ending.
    coders : tuple of str
        by-coder, one variable: the columns that hold a coder's labels; empty: every column that is
        neither the item's nor declared otherwise.
    columns : str or None
        by-coder, several variables: pattern such as "{variable}_{coder}".
    missing : tuple of str
        Cell texts that mean "no label".
    duplicates : {"error", "first", "last"}
        What to do where a coder labelled one variable of one item twice, differently.
    leave_out : tuple of str
        Coders left out.
    remark : str or None
        Column of a coder's remark on a label (long layout).
    sheet : str or None
        Sheet of a workbook; None: the only one that fits.
    delimiter, encoding : str or None
        None: found from the file, and said.
    """

    files: tuple[Path, ...]
    layout: Layout = "long"
    item: str = "item"
    coder: str | None = None
    coder_from: Literal["column", "file"] = "column"
    coders: tuple[str, ...] = ()
    columns: str | None = None
    missing: tuple[str, ...] = ("", "NA")
    duplicates: Duplicates = "error"
    leave_out: tuple[str, ...] = ()
    remark: str | None = None
    sheet: str | None = None
    delimiter: str | None = None
    encoding: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ItemSource:
    """Where the items' texts are.

    Attributes
    ----------
    files : tuple of Path
    key : str
        Column of the item ids.
    show : tuple of str
        Columns shown to adjudicators.
    group_by : tuple of str
        Columns for the breakdown by group.
    priority : str or None
        Column of a factor on the ranking score: blank 1, 0 never.
    resample_by : str or None
        Column of the cluster that an item belongs to, for intervals.
    """

    files: tuple[Path, ...]
    key: str = "item"
    show: tuple[str, ...] = ()
    group_by: tuple[str, ...] = ()
    priority: str | None = None
    resample_by: str | None = None
