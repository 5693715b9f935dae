"""The screens of `relook recode`, and of two codings side by side."""

from __future__ import annotations

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    amount,
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
from relook.project.outcome.codings_compared import (
    CodingsCompared,
    CodingSide,
    change_sentence,
    condition_sentences,
)
from relook.project.recoding.recode_run import RecodeRun

_SHOWN = 20


def recode_screen(run: RecodeRun) -> RenderableType:
    """Lay out what was drawn, for whom, and what to do with it."""
    parts: list[RenderableType] = [heading(f"coding {run.number}"), note(_drawn(run))]
    if run.needed is not None:
        parts.append(note(_needed(run)))
    if run.unseen:
        parts.append(
            note(
                f"{counted(run.n_shown, 'item')} that a worksheet or an earlier coding has shown "
                "took no part in the draw. If those were the disputed ones, the others are easier "
                "than all together, and alpha of this coding will be high for that reason."
            )
        )
    if run.sample.groups:
        rows = [
            (
                shortened(name, 40) or "no entry",
                count(size),
                percent(size / run.sample.n_population),
                count(drawn),
                percent(drawn / len(run.sample.items)),
            )
            for name, (size, drawn) in list(run.sample.groups.items())[:_SHOWN]
        ]
        parts += [
            Text(""),
            small_table(
                (str(run.by), "items", "of all", "drawn", "of the sample"),
                rows,
                numbers=(1, 2, 3, 4),
            ),
        ]
        left = len(run.sample.groups) - _SHOWN
        parts += (
            [note(f"and {counted(left, 'group')} more; --json has them all")] if left > 0 else []
        )
    project = run.loaded.project
    parts += [
        Text(""),
        heading("would write" if run.dry_run else "wrote"),
        small_table(
            ("coding sheet", "for", "rows"),
            [
                (held.file, name, count(held.n_rows))
                for name, held in zip(run.coders, run.issued.round.worksheets, strict=True)
            ],
            numbers=(2,),
        ),
        note(_coders(run)),
    ]
    if not run.dry_run:
        folder = project.relative(project.codings.returned_folder(run.number))
        parts += [
            Text(""),
            note(
                f"next: give each coder the mended instructions and their own sheet; put what "
                f"comes back into {folder} and run relook collect {project.shown_root}, then "
                f"relook rescore {project.shown_root}"
            ),
        ]
    return stacked(*parts)


def _drawn(run: RecodeRun) -> str:
    n = len(run.sample.items)
    said = f"Drawn at random: {n:,} of {counted(run.sample.n_population, 'item')}"
    if run.sample.groups:
        said += f", from each {run.by} in proportion to its size"
    said += f" (seed {run.issued.round.seed})."
    if n < run.n_wanted:
        said += f" {run.n_wanted:,} were asked for, and there are no more."
    return said


def _needed(run: RecodeRun) -> str:
    held = run.needed
    assert held is not None
    more = "" if run.overlap == 2 else " The rule is for two coders; with more it is cautious."
    return (
        f"{held.n_items:,} is what two coders need to tell alpha {held.bar:g} from less, "
        f"{held.error_level:.0%} error level, with the rarest label at {held.rarest_share:.1%} "
        f"(Bloch & Kraemer 1989; Krippendorff 2004, ch. 11).{more}"
    )


def _coders(run: RecodeRun) -> str:
    each = (
        "each item by all of them"
        if run.overlap == len(run.coders)
        else (f"each item by {run.overlap} of them, so that every two share about as many items")
    )
    said = f"{counted(len(run.coders), 'coder')}, {each}; no label of anybody's is shown."
    if run.same_coders:
        said += (
            " They have coded before: what they remember and have practised will have a part in "
            "the result."
        )
    return said


def compared_screen(compared: CodingsCompared) -> list[RenderableType]:
    """Lay out two codings side by side."""
    parts: list[RenderableType] = []
    for variable in compared.variables:
        parts += [
            heading(f"{variable.name}: coding 1 and coding {compared.number}"),
            small_table(
                ("", "alpha", "D_o", "D_e", "items", "disputed", "coders"),
                [
                    _side("coding 1, the label tables", variable.first),
                    _side(f"coding {compared.number}", variable.second),
                ],
                numbers=(1, 2, 3, 4, 5, 6),
            ),
            note(change_sentence(compared, variable)),
        ]
    return [*parts, *(note(said) for said in condition_sentences(compared)), Text("")]


def _side(name: str, side: CodingSide) -> tuple[str, ...]:
    return (
        name,
        coefficient(side.alpha),
        amount(side.observed_disagreement),
        amount(side.expected_disagreement),
        count(side.n_items),
        count(side.n_disputed_items),
        count(side.n_coders),
    )
