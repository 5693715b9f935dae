"""What the first sheet says, for a second look and for fresh coding."""

from __future__ import annotations

from collections.abc import Sequence

from relook.worksheet import layout
from relook.worksheet.model import (
    CANNOT_BE_CODED,
    SHEET_CODE_BOOK,
    TICK,
    WITHDRAW,
    Purpose,
    SheetVariable,
    Worksheet,
)
from relook.worksheet.queue_rules import bounds_in_words

#: What a worksheet is called where the project has no title.
TITLE: dict[Purpose, str] = {"second look": "A second look", "coding": "Fresh coding"}
CAUTIONS = (
    (
        "Some of what you will read may be upsetting. Take breaks, skip a row whenever you need "
        "to, and tell whoever sent you this sheet if it is too much: nobody expects you to go on."
    ),
    (
        "What you read may be private. Keep this file to yourself, and delete it once whoever sent "
        "it says that all is settled."
    ),
    (
        "If a label could touch somebody's health, safety or legal position, local rules and "
        "licensed practice come first. This sheet settles labels for a study; it is no finding "
        "about a person."
    ),
)


def occasion(worksheet: Worksheet) -> str:
    """Return the line below the title."""
    kind = "Independent coding, coding" if worksheet.is_coding else "Second look, round"
    return f"{kind} {worksheet.round}"


def what_this_is(worksheet: Worksheet) -> str:
    """Return the paragraph that says what the sheet is for."""
    rows, items = len(worksheet.rows), len({row.item for row in worksheet.rows})
    counted = f"{items:,} {'item' if items == 1 else 'items'}"
    if rows != items:
        counted += f", {rows:,} questions in all"
    if worksheet.is_coding:
        return (
            f"Here are {counted} for you to label on your own, by the sheet “{SHEET_CODE_BOOK}”. "
            "Others label the same items without seeing your labels. How far you all come to the "
            "same labels tells how clear the instructions are; it is no test of you, and it tells "
            "nothing if anybody looks at what another has written."
        )
    return (
        f"Several people read the same items and gave each a label. Here are {counted} that are to "
        f"be looked at again. You decide which label is right, by the sheet “{SHEET_CODE_BOOK}”. "
        "There is no score and no right number of anything: what counts is what you make of each "
        "item when you read it with a fresh eye."
    )


def steps(worksheet: Worksheet) -> list[str]:
    """Return what to do, one step after the other."""
    meant = any(variable.code_book for variable in worksheet.variables)
    book = (
        f"Read the sheet “{SHEET_CODE_BOOK}” once from top to bottom"
        if meant
        else f"The sheet “{SHEET_CODE_BOOK}” lists what may be answered: look at it once"
    )
    shows_labels = worksheet.reveal != "nothing" and not worksheet.is_coding
    read = "Read the item." if worksheet.shown_columns else "Look the item up by its id."
    go_on = (
        f"Go to the sheet “{worksheet.fields_sheet}”. Each row asks one thing of one item. "
        f"{read}{' Then look at the labels beside it.' if shows_labels else ''}"
    )
    send = (
        "Save the file and send it back as it is. Half of it is better than nothing: rows you "
        "leave empty are simply still open."
    )
    none_fits = "If no label can be given (the text is missing, or in a language you do not read), "
    if worksheet.is_coding:
        return [
            f"{book}, even if you have coded with an earlier one: it may have changed.",
            go_on,
            *_how_to_fill(worksheet),
            f"{none_fits}write “{CANNOT_BE_CODED}”. That counts as an answer too.",
            (
                "Add a note where the instructions left you in doubt: such notes are what makes "
                "them better."
            ),
            send,
        ]
    return [
        f"{book}.",
        go_on,
        *_how_to_fill(worksheet),
        (
            "Choose a reason if one fits: what may have led people to differ. Add a note where it "
            "would help the next reader. Both may stay empty."
        ),
        f"{none_fits}decide “{CANNOT_BE_CODED}”. That is a decision too.",
        send,
    ]


def _how_to_fill(worksheet: Worksheet) -> list[str]:
    """How a label is entered, for each kind of variable that the sheet has."""
    variables = worksheet.variables
    column = "label" if worksheet.is_coding else "decision"
    said = []
    choices = [v for v in variables if v.entry == "choice"]
    numbers = [v for v in variables if v.entry == "number"]
    sets = [v for v in variables if v.entry == "set"]
    if choices:
        only = "" if len(choices) == len(variables) else f" ({_names(choices)})"
        any_label = "" if worksheet.is_coding else ", shown in the row or not"
        said.append(
            f"Put your label into the column “{column}”{only}: open its list with Alt+Down, or "
            f"type the label. Any label of the list may be right{any_label}."
        )
    for bounds in dict.fromkeys((v.low, v.high) for v in numbers):
        asked = [v for v in numbers if (v.low, v.high) == bounds]
        only = "" if len(asked) == len(variables) else f" ({_names(asked)})"
        need_not = "" if worksheet.is_coding else " It need not be one of the numbers shown."
        said.append(
            f"Type a number{bounds_in_words(*bounds)} into the column “{column}”{only}.{need_not}"
        )
    if sets and layout.tick_labels(variables):
        only = "" if len(sets) == len(variables) else f" ({_names(sets)})"
        said.append(
            f"Put {TICK} into the column of every label that belongs to the item{only}, and leave "
            f"“{column}” empty."
        )
    elif sets:
        separators = " or ".join(dict.fromkeys(v.separator or ";" for v in sets))
        only = "" if len(sets) == len(variables) else f" ({_names(sets)})"
        said.append(
            f"Type every label that belongs to the item into the column “{column}”{only}, with "
            f"{separators} between them."
        )
    return said


def _names(variables: Sequence[SheetVariable]) -> str:
    names = [f"“{variable.name}”" for variable in variables[:4]]
    left = len(variables) - len(names)
    return ", ".join(names) + (f" and {left} more" if left > 0 else "")


def good_to_know(worksheet: Worksheet) -> list[str]:
    """Return what may surprise, and how to change one's mind."""
    marks = "red a label that does not" if worksheet.is_coding else "red a decision that does not"
    red = f", {marks} fit its row." if _has_red(worksheet) else "."
    what = "label" if worksheet.is_coding else "decision"
    return [
        *(_alone() if worksheet.is_coding else _what_is_shown(worksheet)),
        (
            "Sort and filter as you like; each row keeps its code, and its list follows it. Please "
            f"leave the codes and the texts as they are. Green marks a row with a {what}{red}"
        ),
        (
            f"You may change a {what} at any time before you send the file. To take back one that "
            f"was already sent, {'write' if worksheet.is_coding else 'decide'} “{WITHDRAW}”; "
            "emptying the cell does not."
        ),
    ]


def _alone() -> list[str]:
    return [
        (
            "Work alone: do not talk the items over with anybody who codes them, and do not look "
            "up labels that they were given before, by you or by others. Questions about the "
            "instructions go to whoever sent you this sheet."
        ),
        "The items stand in an order of their own in every sheet, and it means nothing.",
    ]


def _what_is_shown(worksheet: Worksheet) -> list[str]:
    notes = []
    if worksheet.reveal == "labels":
        notes.append(
            "Labels beside an item stand in no meaningful order"
            + (" (numbers from low to high)" if _has_numbers(worksheet) else "")
            + ", and how many people gave each is left out on purpose."
        )
    if worksheet.may_show_other_labels:
        notes.append(
            "A row may show labels that nobody gave. That, too, is on purpose: it keeps every row "
            "an open question."
        )
    if worksheet.reveal == "tallies":
        notes.append("The number after a label is how many people gave it. Many can be wrong.")
    if worksheet.reveal == "names":
        notes.append("The sheet shows who gave which label. Judge the item, not the person.")
    return notes


def _has_numbers(worksheet: Worksheet) -> bool:
    return any(variable.entry == "number" for variable in worksheet.variables)


def _has_red(worksheet: Worksheet) -> bool:
    typed = any(variable.entry == "set" for variable in worksheet.variables)
    return not typed or bool(layout.tick_labels(worksheet.variables))
