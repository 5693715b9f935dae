"""What a decision cell is read as: from exact to lenient, a unique hit only."""

from __future__ import annotations

from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from relook.cells.model import EMPTY, Cell
from relook.worksheet.matching import decimal_of, decimal_text, match_decision, match_ticks
from relook.worksheet.model import SheetVariable


def choice(*labels: str) -> SheetVariable:
    return SheetVariable(name="topic", entry="choice", labels=labels)


def text(value: str) -> Cell:
    return Cell("text", value)


NUMBER = SheetVariable(name="severity", entry="number", low=0.0, high=10.0)
SET = SheetVariable(name="themes", entry="set", labels=("food", "noise", "view"), separator=";")


@pytest.mark.parametrize(
    ("cell", "labels", "label", "exact"),
    [
        (text("delay"), ("delay", "staff"), "delay", True),
        (text("cafe\u0301"), ("caf\u00e9",), "caf\u00e9", True),
        (text("a\r\nb"), ("a\nb",), "a\nb", True),
        (text(" delay\u00a0"), ("delay",), "delay", False),
        (text("de\u200blay"), ("delay",), "delay", False),
        (text("long  wait"), ("long wait",), "long wait", False),
        (text("DELAY"), ("delay",), "delay", False),
        (text("Yes"), ("Yes", "yes"), "Yes", True),
        (Cell("number", "3"), ("3", "4"), "3", True),
        (Cell("number", "3"), ("3.0",), "3.0", False),
        (text("3.0"), ("3", "4"), "3", False),
        (Cell("number", "7"), ("007", "8"), "007", False),
        (Cell("number", "100000"), ("1E5",), "1E5", False),
        (text("0,5"), ("0.5",), "0.5", False),
        (Cell("number", "0.5", "0%"), ("50%", "100%"), "50%", False),
        (Cell("bool", "TRUE"), ("true", "false"), "true", False),
        (Cell("bool", "FALSE"), ("Yes", "No"), "No", False),
        (Cell("bool", "TRUE"), ("TRUE", "FALSE"), "TRUE", True),
    ],
)
def test_matched(cell: Cell, labels: tuple[str, ...], label: str, exact: bool) -> None:
    """The one label that a cell means is taken, and told where it was not written exactly so."""
    read = match_decision(cell, choice(*labels))
    assert (read.state, read.ruling, read.label, not read.adjusted) == (
        "matched",
        "label",
        label,
        exact,
    )


@pytest.mark.parametrize(
    ("cell", "labels", "reason", "mend"),
    [
        (text("dely"), ("delay", "staff"), 'no label of "topic"', 'change the cell to "delay"'),
        (
            text("qqq"),
            ("delay", "staff"),
            'no label of "topic"',
            'one of "delay", "staff", "cannot',
        ),
        (text("YES"), ("Yes", "yes"), 'could mean "Yes", "yes"', "exactly"),
        (Cell("number", "1"), ("1.0", "1.00"), "could mean", "exactly"),
        (Cell("date", "2024-01-02"), ("1-2",), "date or time", "format the cell as text"),
        (Cell("error", "#N/A"), ("N/A",), "error value", "type the label"),
        (Cell("formula", "=A1", "", "delay"), ("delay",), "formula", "type the label"),
        (Cell("bool", "TRUE"), ("delay",), "no label", "change"),
        (text("1,500"), ("1500",), "no label", "change"),
    ],
)
def test_not_matched(cell: Cell, labels: tuple[str, ...], reason: str, mend: str) -> None:
    """What could mean two labels, or none, is not taken; the mend names the nearest."""
    read = match_decision(cell, choice(*labels))
    assert read.state == "unmatched"
    assert reason in read.reason
    assert mend in read.mend


@pytest.mark.parametrize("variable", [choice("delay"), NUMBER, SET])
@pytest.mark.parametrize("written", ["cannot be coded", " Cannot be  coded", "CANNOT BE CODED"])
def test_cannot_be_coded(variable: SheetVariable, written: str) -> None:
    """That no label can be given is matched like a label, whatever is asked."""
    assert match_decision(text(written), variable).ruling == "cannot be coded"


def test_withdraw() -> None:
    """Taking a decision back is matched like a label."""
    assert match_decision(text("Withdraw "), choice("delay")).ruling == "withdraw"


@pytest.mark.parametrize("cell", [EMPTY, text("  "), text("\u00a0\u200b")])
def test_blank(cell: Cell) -> None:
    """Spaces alone are no decision."""
    assert match_decision(cell, choice("delay")).state == "blank"


@pytest.mark.parametrize(
    ("cell", "label"),
    [
        (Cell("number", "3"), "3"),
        (Cell("number", "0.5"), "0.5"),
        (text("3.0"), "3"),
        (text("3,5"), "3.5"),
        (text(" 10 "), "10"),
        (text("1e1"), "10"),
        (text("0,500"), "0.5"),
    ],
)
def test_number(cell: Cell, label: str) -> None:
    """Numbers are taken in their shortest form; a decimal comma where it can be nothing else."""
    assert match_decision(cell, NUMBER).label == label


@pytest.mark.parametrize(
    ("cell", "reason"),
    [
        (text("1,500"), "decimals or thousands"),
        (Cell("number", "11"), "outside the bounds"),
        (Cell("number", "-0.1"), "outside the bounds"),
        (Cell("number", "0.5", "0%"), "percentage"),
        (Cell("bool", "TRUE"), "truth value"),
        (text("five"), "not a number"),
        (text("nan"), "not a number"),
        (text("1" * 500), "not a number"),
        (Cell("date", "2024-03-04"), "date or time"),
    ],
)
def test_no_number(cell: Cell, reason: str) -> None:
    """What is no number within the bounds, or could be two, is not taken."""
    read = match_decision(cell, NUMBER)
    assert read.state == "unmatched"
    assert reason in read.reason
    assert read.mend


@pytest.mark.parametrize(
    ("written", "label"),
    [
        ("food", "food"),
        ("view; food", "food;view"),
        ("Noise;;VIEW;", "noise;view"),
        ("food;food", "food"),
    ],
)
def test_set(written: str, label: str) -> None:
    """A set is read element by element and written in the code book's order."""
    assert match_decision(text(written), SET).label == label


def test_set_with_a_wrong_element() -> None:
    """One wrong element keeps the whole set out, and is named."""
    read = match_decision(text("food; nose"), SET)
    assert read.state == "unmatched"
    assert '"nose"' in read.reason
    assert '"noise"' in read.mend


def test_ticks() -> None:
    """Ticked labels make a set; a decision that says otherwise beside them is not guessed at."""
    assert match_ticks(["view", "food"], EMPTY, SET).label == "food;view"
    assert match_ticks(["view"], text("view"), SET).label == "view"
    assert match_ticks(["view"], text("food"), SET).state == "unmatched"
    assert match_ticks(["delay"], EMPTY, SET).state == "unmatched"
    assert match_ticks([], text("food"), SET).label == "food"


@given(
    st.decimals(
        allow_nan=False, allow_infinity=False, min_value=-(10**9), max_value=10**9, places=4
    )
)
def test_decimal_text_keeps_the_number(number: Decimal) -> None:
    """The shortest form of a number reads as the number."""
    assert decimal_of(decimal_text(number)) == number


@given(st.text(max_size=12))
def test_any_text_is_read_without_a_fault(written: str) -> None:
    """Whatever stands in a cell, it is blank, matched or told why not."""
    for variable in (choice("delay", "7"), NUMBER, SET):
        read = match_decision(text(written), variable)
        assert read.state != "unmatched" or (read.reason and read.mend)


def test_a_cell_that_names_two_labels_gets_no_suggestion() -> None:
    """Which of them is meant is the adjudicator's to say, not the mend's."""
    variable = SheetVariable(name="topic", entry="choice", labels=("cancellation", "price", "crew"))
    got = match_decision(Cell("text", "cancellation / price"), variable)
    assert got.state == "unmatched"
    assert got.mend.startswith('it names "cancellation", "price": ask which one is meant')
