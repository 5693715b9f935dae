"""What the queue lets in, and how it marks what has been filled in."""

from __future__ import annotations

from collections.abc import Iterable

from openpyxl.formatting.rule import Rule
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.worksheet import layout, palette
from relook.worksheet.layout import Column
from relook.worksheet.lists_sheet import Lists, is_special
from relook.worksheet.looks import conditional
from relook.worksheet.model import CANNOT_BE_CODED, WITHDRAW, Worksheet


def _letters(columns: Iterable[Column], role: str) -> list[str]:
    return [get_column_letter(n) for n, c in enumerate(columns, start=1) if c.role == role]


def add_rules(
    sheet: OpenpyxlSheet,
    worksheet: Worksheet,
    columns: tuple[Column, ...],
    lists: Lists,
    last: int,
) -> None:
    """Add the dropdowns and the conditional formats of the queue.

    Parameters
    ----------
    sheet : openpyxl worksheet
    worksheet : Worksheet
    columns : tuple of Column
    lists : Lists
    last : int
        The last row of the queue.
    """
    decision = _letters(columns, "decision")[0]
    variable = "$" + _letters(columns, "variable")[0] + "2"
    ticks = _letters(columns, "tick")
    rule = _decision_rule(worksheet, lists, f"${decision}2", variable)
    rule.add(f"{decision}2:{decision}{last}")
    sheet.add_data_validation(rule)
    for reason in _letters(columns, "reason") if lists.reasons else ():
        why = DataValidation(
            type="list",
            formula1=lists.reasons,
            allow_blank=True,
            showErrorMessage=True,
            errorStyle="stop",
            errorTitle="Not one of the reasons",
            error="Choose a reason from the list (Alt+Down opens it), or leave it empty and write "
            "a note instead.",
        )
        why.add(f"{reason}2:{reason}{last}")
        sheet.add_data_validation(why)
    if ticks:
        mark = DataValidation(type="list", formula1=lists.ticks, allow_blank=True)
        mark.add(f"{ticks[0]}2:{ticks[-1]}{last}")
        sheet.add_data_validation(mark)
    _add_marks(sheet, worksheet, columns, lists, last)


def _decision_rule(
    worksheet: Worksheet, lists: Lists, decision: str, variable: str
) -> DataValidation:
    """Return the one rule of the decision column.

    Labels alone: a dropdown, and nothing else is let in. Numbers alone: a number within its
    bounds or one of the two words. Where both stand in one column, no rule could offer a list in
    one row and let a number into another, so the dropdown stays and nothing is refused; the mark
    for what does not fit (`_add_marks`) then says so at once.
    """
    kinds = {entry_kind(worksheet, v.name) for v in worksheet.variables}
    if kinds == {"number"}:
        within = lists.within_bounds(variable, decision)
        return DataValidation(
            type="custom",
            formula1=f"OR({is_special(decision)},AND(ISNUMBER({decision}),{within}))",
            allow_blank=True,
            showErrorMessage=True,
            errorStyle="stop",
            errorTitle="Not a number that fits",
            error=f"Type a number{_bounds_said(worksheet)}, or: {CANNOT_BE_CODED}. "
            f"To take back what was sent before, type: {WITHDRAW}.",
            showInputMessage=True,
            promptTitle="Your label" if worksheet.is_coding else "Your decision",
            prompt=f"A number{_bounds_said(worksheet)}, or: {CANNOT_BE_CODED}.",
        )
    only_choices = kinds == {"choice"}
    return DataValidation(
        type="list",
        formula1=lists.choices(variable),
        allow_blank=True,
        showErrorMessage=only_choices,
        errorStyle="stop",
        errorTitle="Not one of the labels",
        error="Choose a label from the list (Alt+Down opens it). If none can be given, choose "
        f"“{CANNOT_BE_CODED}”. “{WITHDRAW}” takes back what was sent before.",
    )


def entry_kind(worksheet: Worksheet, name: str) -> str:
    """Return how the decision cell of a variable is filled in: choice, number or typed set."""
    variable = next(v for v in worksheet.variables if v.name == name)
    if variable.entry == "set" and layout.tick_labels(worksheet.variables):
        return "choice"  # ticks make the set; the cell itself only takes the two words
    return variable.entry


def _bounds_said(worksheet: Worksheet) -> str:
    bounds = {(v.low, v.high) for v in worksheet.variables}
    if len(bounds) != 1:
        return " within the bounds given in the code book"
    return bounds_in_words(*bounds.pop())


def bounds_in_words(low: float | None, high: float | None) -> str:
    """Return " from 0 to 100", or less where there are fewer bounds."""
    if low is not None and high is not None:
        return f" from {low:g} to {high:g}"
    if low is not None:
        return f" of {low:g} or more"
    return "" if high is None else f" of {high:g} or less"


def _add_marks(
    sheet: OpenpyxlSheet,
    worksheet: Worksheet,
    columns: tuple[Column, ...],
    lists: Lists,
    last: int,
) -> None:
    """Mark what does not fit in red, and rows with a decision in a quiet green."""
    decision = "$" + _letters(columns, "decision")[0] + "2"
    variable = "$" + _letters(columns, "variable")[0] + "2"
    ticks = _letters(columns, "tick")
    kinds = {entry_kind(worksheet, v.name) for v in worksheet.variables}
    filled = f"LEN({decision})>0"
    if "set" not in kinds:
        # `=` ignores case, as collecting does; what would be taken is not marked.
        known = f"SUMPRODUCT(({lists.choices(variable)}=TRIM({decision}))*1)>0"
        if kinds != {"choice"}:
            number = f"IFERROR(VALUE({decision}),9.999E+307)"
            fits = f"AND({lists.is_number(variable)}=1,{lists.within_bounds(variable, number)})"
            known = f"OR({known},{fits})"
        column = _letters(columns, "decision")[0]
        sheet.conditional_formatting.add(
            f"{column}2:{column}{last}",
            Rule(
                type="expression",
                dxf=conditional(fill=palette.AMISS),
                formula=[f"AND({filled},NOT({known}))"],
                stopIfTrue=True,
            ),
        )
    if ticks:
        filled = f"OR({filled},COUNTA(${ticks[0]}2:${ticks[-1]}2)>0)"
    done = conditional(fill=palette.DONE)
    spans = [("A", get_column_letter(_count(columns, "key") + _count(columns, "item")))]
    first_field = (ticks or _letters(columns, "decision"))[0]
    spans.append((first_field, get_column_letter(len(columns))))
    for first, final in spans:
        sheet.conditional_formatting.add(
            f"{first}2:{final}{last}", Rule(type="expression", dxf=done, formula=[filled])
        )


def _count(columns: Iterable[Column], role: str) -> int:
    return sum(column.role == role for column in columns)
