"""What a worksheet is made of; shared by whoever plans, writes and reads one.

A worksheet is written from these alone, so nothing can reach an adjudicator that is not here: no
coder, tally, rank or kind of row unless the lead chose to reveal it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

FORMAT = 1
SHEET_START = "Start here"
SHEET_QUEUE = "Queue"
SHEET_ITEMS = "Items"
SHEET_CODE_BOOK = "Code book"
SHEET_LISTS = "_lists"
#: The field of the first sheet for another name.
FILLED_IN_BY = "Filled in by"

#: Headers of the columns that every queue sheet has. Shown columns stand between item and variable,
#: competing labels between variable and decision. Headers are matched case-folded on reading.
#: A coding sheet has "label" where a queue sheet has "decision", and no reason.
HEADER_KEY = "row code"
HEADER_ITEM = "item"
HEADER_VARIABLE = "variable"
HEADER_COMPETING = "label {number}"
HEADER_DECISION = "decision"
HEADER_LABEL = "label"
HEADER_REASON = "reason"
HEADER_NOTE = "note"
#: A column per label of a set variable, between the evidence and the decision. Any mark in it means
#: that the label belongs to the item's set; the decision cell then stays empty. Which labels have
#: such a column: `relook.worksheet.layout.tick_labels`.
HEADER_TICK = "has {label}"
TICK = "x"

CANNOT_BE_CODED = "cannot be coded"
WITHDRAW = "withdraw"

#: Names of the string properties by which a returned file is recognised, whatever it is called now.
PROPERTY_PROJECT = "relook project"
PROPERTY_WORKSHEET = "relook worksheet"
PROPERTY_FORMAT = "relook format"

#: How much a worksheet shows of who said what.
Reveal = Literal["nothing", "labels", "tallies", "names"]
#: What a worksheet is for: labels that are given again after somebody looked twice, or fresh
#: labels that are to be independent of all that were given before.
Purpose = Literal["second look", "coding"]
#: How a decision is entered: one label from a list, a number, or any of several labels.
Entry = Literal["choice", "number", "set"]


@dataclass(frozen=True, slots=True, kw_only=True)
class CodeBookEntry:
    """One line of the code book: a label and what it means."""

    label: str
    meaning: str = ""
    example: str = ""
    parent: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetVariable:
    """A variable as an adjudicator meets it.

    Attributes
    ----------
    name : str
    entry : {"choice", "number", "set"}
    labels : tuple of str
        The labels that may be decided, in the code book's order; empty for free numbers.
    ordered : bool
        Whether the labels stand in a meaningful order (a colour ramp, not separate hues).
    low, high : float or None
        Bounds of a number.
    separator : str or None
        Between the labels of a set.
    code_book : tuple of CodeBookEntry
    """

    name: str
    entry: Entry
    labels: tuple[str, ...] = ()
    ordered: bool = False
    low: float | None = None
    high: float | None = None
    separator: str | None = None
    code_book: tuple[CodeBookEntry, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetRow:
    """One row of the queue: one variable of one item.

    Attributes
    ----------
    key : str
        The row code; keyed, so that nothing can be read out of it.
    item : str
    variable : str
    shown : tuple of str
        Texts of the shown columns, in the worksheet's order.
    competing : tuple of str
        The distinct labels to choose between, in the order shown.
    tallies : tuple of int
        How many coders gave each competing label; empty unless tallies are revealed.
    coders : tuple of tuple of (str, str)
        Coder and label; empty unless names are revealed.
    remarks : tuple of str
        Coders' remarks; empty unless shown.
    """

    key: str
    item: str
    variable: str
    shown: tuple[str, ...] = ()
    competing: tuple[str, ...] = ()
    tallies: tuple[int, ...] = ()
    coders: tuple[tuple[str, str], ...] = ()
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Worksheet:
    """Everything that goes into one adjudicator's file.

    Attributes
    ----------
    id : str
        Keyed and unique in the project.
    project : str
        The project's random id.
    title : str
        What the lead calls the project; shown on the first sheet.
    round : int
    adjudicator : str
        Name, as it is to be shown to the adjudicator.
    variables : tuple of SheetVariable
    shown_columns : tuple of str
        Headers of the shown columns.
    reasons : tuple of str
    reveal : {"nothing", "labels", "tallies", "names"}
    rows : tuple of SheetRow
        In the adjudicator's own order, an item's rows together.
    may_show_other_labels : bool
        Whether a row may show labels that nobody gave (said on the first sheet).
    stamp : str
        ISO time recorded for the round.
    purpose : {"second look", "coding"}
    """

    id: str
    project: str
    title: str
    round: int
    adjudicator: str
    variables: tuple[SheetVariable, ...]
    shown_columns: tuple[str, ...]
    reasons: tuple[str, ...]
    reveal: Reveal
    rows: tuple[SheetRow, ...]
    may_show_other_labels: bool
    stamp: str
    purpose: Purpose = "second look"

    @property
    def is_coding(self) -> bool:
        """Whether fresh labels are asked for, and so none are shown."""
        return self.purpose == "coding"

    @property
    def occasion(self) -> str:
        """What the worksheet was sent for, such as "round 1" or "coding 2"."""
        return f"{'coding' if self.is_coding else 'round'} {self.round}"

    @property
    def fields_sheet(self) -> str:
        """Title of the sheet that is filled in."""
        return SHEET_ITEMS if self.is_coding else SHEET_QUEUE
