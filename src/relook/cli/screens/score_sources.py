"""Where the disagreement of one variable lies, as small tables whose bars stand beside numbers."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    bar,
    coefficient,
    count,
    counted,
    heading,
    note,
    percent,
    shortened,
    small_table,
    stacked,
)
from relook.project.figures.score_tables import (
    Row,
    coder_pair_rows,
    coder_rows,
    group_rows,
    label_pair_rows,
    label_rows,
    prospect_rows,
)
from relook.project.figures.scoring import VariableScore
from relook.project.figures.use_tables import (
    cross_table_rows,
    direction_rows,
    higher_rows,
    label_use_rows,
    two_coders,
)

_WIDE = 30
_NARROW = 14
#: A table of coders by labels has at most so many columns of numbers.
_COLUMNS = 6
#: Numbers in use above which pairs of them and tables by label say little.
_FEW_NUMBERS = 12
_PROSPECT_STEPS = 4
_CODER_PAIRS = 3


def sources(scored: VariableScore, n_rows: int) -> list[RenderableType]:
    """Coders, labels, groups and the prospect, each at most `n_rows` rows long."""
    parts: list[RenderableType] = []
    if two_coders(scored) is not None:
        parts += _two_coders(scored, n_rows)
    elif scored.coders is not None:
        parts += _coders(scored, n_rows)
    if _is_list(scored):
        parts += _label_pairs(scored, n_rows)
        parts += _labels(scored, n_rows)
    else:
        n_pairs = scored.label_pairs.first.size
        parts.append(
            note(f"{counted(n_pairs, 'pair')} of different numbers meet; --json lists them")
        )
    groups = group_rows(scored)
    for column in dict.fromkeys(row["column"] for row in groups):
        own = [row for row in groups if row["column"] == column]
        if len(own) > 1:
            parts += _section(f"groups by {column}", _groups(own, n_rows))
    return parts + _prospect(scored)


def _is_list(scored: VariableScore) -> bool:
    """Whether the labels in use are few enough to be told apart one by one."""
    numbers = scored.agreement.function.needs == "number"
    return not numbers or int((scored.agreement.marginals > 0).sum()) <= _FEW_NUMBERS


def _section(title: str, *parts: RenderableType) -> list[RenderableType]:
    return [Text(""), heading(f"  {title}"), *parts]


def _coders(scored: VariableScore, n_rows: int) -> list[RenderableType]:
    rows = coder_rows(scored)
    most = max(row["share"] for row in rows)
    without = scored.without is not None
    shown = [
        (
            shortened(row["coder"], _WIDE),
            count(row["n_labels"]),
            percent(row["share_of_labels"]),
            percent(row["share"]),
            bar(row["share"], most),
            coefficient(row["own_alpha"]),
            *(
                (coefficient(row["alpha_without"]), count(row["n_pairable_items_without"]))
                if without
                else ()
            ),
        )
        for row in _first(rows, n_rows)
    ]
    headers = (
        "coder",
        "labels",
        "of labels",
        "of D_o",
        "",
        "own alpha",
        *(("alpha without", "over items") if without else ()),
    )
    numbers = (1, 2, 3, 5, *((6, 7) if without else ()))
    parts = [small_table(headers, shown, numbers=numbers), *_left(rows, n_rows, "coder")]
    if not without:
        parts.append(note(f"Alpha without each coder is left out: {scored.no_without_because}."))
    return [*_section("coders", *parts), *_coder_pairs(scored)]


def _coder_pairs(scored: VariableScore) -> list[RenderableType]:
    """The heaviest pairs of coders in one line."""
    rows = [row for row in coder_pair_rows(scored) if row["contribution"] > 0]
    if not rows:
        return []
    said = ", ".join(
        f"{shortened(row['first'], _NARROW)} and {shortened(row['second'], _NARROW)} "
        f"{percent(row['share'])} (in {counted(row['n_items'], 'item')})"
        for row in rows[:_CODER_PAIRS]
    )
    left = len(rows) - _CODER_PAIRS
    more = f"; {counted(left, 'pair')} more in --json" if left > 0 else ""
    return [note(f"Pairs of coders that carry most of D_o: {said}{more}.")]


def _two_coders(scored: VariableScore, n_rows: int) -> list[RenderableType]:
    """Who uses which label more, and the cross table where it fits."""
    rows = direction_rows(scored)
    first, second = rows[0]["first_coder"], rows[0]["second_coder"]
    parts: list[RenderableType] = [
        note("Two coders share every disagreement equally, so neither is ranked.")
    ]
    for row in higher_rows(scored):
        said = (
            f"Of {counted(row['n_items'], 'shared item')}, {first} gave the higher label in "
            f"{count(row['first_higher'])}, {second} in {count(row['second_higher'])}"
        )
        if row["mean_difference"] is not None:
            said += f"; mean difference {row['mean_difference']:+.3g}, {first} less {second}"
        parts.append(note(f"{said}."))
    if not _is_list(scored):
        return _section("two coders", *parts)
    shown = [
        (
            shortened(row["label"], _WIDE),
            count(row["n_first"]),
            count(row["n_second"]),
            f"{row['difference']:+,}" if row["difference"] else "0",
        )
        for row in _first(rows, n_rows)
    ]
    headers = ("label", shortened(first, _NARROW), shortened(second, _NARROW), "difference")
    parts.append(note("How often each gave a label, on the same items; widest difference first:"))
    parts += [small_table(headers, shown, numbers=(1, 2, 3)), *_left(rows, n_rows, "label")]
    return _section("two coders", *parts, *_cross_table(scored, first, second, len(rows)))


def _cross_table(
    scored: VariableScore, first: str, second: str, n_used: int
) -> list[RenderableType]:
    if n_used > _COLUMNS:
        return [note("Their cross table is too wide for the screen; --json has it.")]
    cells = {(row["first"], row["second"]): row["n_items"] for row in cross_table_rows(scored)}
    counts = scored.agreement.marginals
    labels = [text for text, n in zip(scored.held.texts, counts, strict=True) if n]
    shown = [
        (shortened(one, _NARROW), *(count(cells.get((one, other), 0)) for other in labels))
        for one in labels
    ]
    headers = ("", *(shortened(label, _NARROW) for label in labels))
    return [
        note(f"Items by the label of {first} (rows) and of {second} (columns):"),
        small_table(headers, shown, numbers=tuple(range(1, len(headers)))),
    ]


def _label_pairs(scored: VariableScore, n_rows: int) -> list[RenderableType]:
    rows = label_pair_rows(scored)
    most = rows[0]["share"]
    shown = [
        (
            f"{shortened(row['first'], _WIDE)} – {shortened(row['second'], _WIDE)}",
            count(row["n_items"]),
            percent(row["share"]),
            bar(row["share"], most),
            percent(row["chance_share"]),
        )
        for row in _first(rows, n_rows)
    ]
    headers = ("labels", "items", "of D_o", "", "of D_e, by chance")
    table = small_table(headers, shown, numbers=(1, 2, 4))
    merge = '`--merge "NEW=A,B"` shows alpha with labels taken as one' if scored.mergers else ""
    return _section("pairs of labels", table, *_left(rows, n_rows, "pair", merge))


def _labels(scored: VariableScore, n_rows: int) -> list[RenderableType]:
    """Each label's uses and alpha, and by coder where they are three or more but few."""
    rows = [row for row in label_rows(scored) if row["n_labels"]]
    if len(rows) < 3:
        return []  # of two labels each is agreed on as well as the other
    rows.sort(key=lambda row: -row["involved"])
    use = {(row["coder"], row["label"]): row["share_of_coder"] for row in label_use_rows(scored)}
    coders = sorted({coder for coder, _ in use})
    by_coder = 3 <= len(coders) <= _COLUMNS
    shown = [
        (
            shortened(row["label"], _NARROW if by_coder else _WIDE),
            count(row["n_labels"]),
            percent(row["share_of_labels"]),
            percent(row["involved"]),
            coefficient(row["alpha_against_rest"]),
            *(
                (percent(use.get((coder, row["label"]), 0.0), decimals=0) for coder in coders)
                if by_coder
                else ()
            ),
        )
        for row in _first(rows, n_rows)
    ]
    headers = (
        "label",
        "uses",
        "of labels",
        "party to",
        "alone: alpha",
        *((shortened(coder, 8) for coder in coders) if by_coder else ()),
    )
    said = (
        "“party to”: the part of D_o between this label and any other. “alone”: nominal alpha of "
        "the label against all others as one."
    )
    if by_coder:
        said += " By coder: share of their labels."
    elif len(coders) > _COLUMNS:
        said += " --json has label use by coder."
    table = small_table(headers, shown, numbers=tuple(range(1, len(headers))))
    return _section("labels", table, *_left(rows, n_rows, "label"), note(said))


def _groups(rows: Sequence[Row], n_rows: int) -> RenderableType:
    most = max(row["share"] for row in rows)
    shown = [
        (
            shortened(row["group"] or "(blank)", _WIDE),
            count(row["n_items"]),
            percent(row["share_of_labels"]),
            percent(row["share"]),
            bar(row["share"], most),
            coefficient(row["own_alpha"]),
        )
        for row in _first(rows, n_rows)
    ]
    headers = ("group", "items", "of labels", "of D_o", "", "own alpha")
    table = small_table(headers, shown, numbers=(1, 2, 3, 5))
    return stacked(table, *_left(rows, n_rows, "group"))


def _first(rows: Sequence[Row], n_rows: int) -> Sequence[Row]:
    """The first rows; one more takes no more room than saying that it is left out."""
    return rows if len(rows) <= n_rows + 1 else rows[:n_rows]


def _left(rows: Sequence[Row], n_rows: int, word: str, further: str = "") -> list[RenderableType]:
    """What the table leaves out, if anything, and another remark on the same line."""
    left = len(rows) - len(_first(rows, n_rows))
    said = [f"and {counted(left, word)} more; --json has them all"] if left else []
    said += [further] if further else []
    return [note("; ".join(said))] if said else []


def _prospect(scored: VariableScore) -> list[RenderableType]:
    rows, prospect = prospect_rows(scored), scored.prospect
    last = len(rows) - 1
    if last < 1:
        return []
    steps = sorted({round(last * step / _PROSPECT_STEPS) for step in range(_PROSPECT_STEPS + 1)})
    shown = [
        (
            count(rows[step]["n_settled"]),
            coefficient(rows[step]["low"]),
            coefficient(rows[step]["high"]),
        )
        for step in steps
    ]
    said = (
        "Agreement in the corrected data, not a reliability, if the head of the queue took its "
        "consensus labels"
    )
    ties = rows[-1]["n_ties"]
    said += f"; {counted(ties, 'tie')} settled both ways." if ties else "."
    if prospect.falls.size:
        said += f" It falls at {counted(int(prospect.falls.size), 'step')}."
    if prospect.undefined_because is not None:
        said += f" Where undefined: {prospect.undefined_because}."
    headers = ("items settled", "agreement from", "to")
    return _section("prospect", small_table(headers, shown, numbers=(0, 1, 2)), note(said))
