"""One call of `relook recode`, from the project folder to coding sheets."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from relook.errors import RelookError, listed, nearest
from relook.project.archive.codings import FIRST_CODING, read_codings
from relook.project.archive.rounds import read_rounds
from relook.project.figures.scoring import NeededItems, needed_for
from relook.project.recoding.coding_sheets import issue_coding
from relook.project.recoding.drawing import Sample, deal, draw_sample
from relook.project.sending.issuing import IssuedRound, write_round
from relook.project.setup.folder import Project
from relook.project.setup.loading import Loaded, load

#: Coders of the labels beyond which they must be named: a crowd is not asked again as a whole.
MOST_CODERS_UNASKED = 12


@dataclass(frozen=True, slots=True, kw_only=True)
class RecodeRequest:
    """What is asked for.

    Attributes
    ----------
    n_items : int or None
        None: as many as the published rule says that two coders need.
    by : str or None
        Column of the item table whose groups get draws in proportion to their sizes.
    unseen : bool
        Draw only from items that no worksheet and no earlier coding has shown.
    coders : tuple of str
        None given: those of the label tables.
    overlap : int or None
        Coders of each item; None: all of them.
    variables : tuple of str
        None given: all.
    seed : int
    """

    n_items: int | None = None
    by: str | None = None
    unseen: bool = False
    coders: tuple[str, ...] = ()
    overlap: int | None = None
    variables: tuple[str, ...] = ()
    seed: int


@dataclass(frozen=True, slots=True, kw_only=True)
class RecodeRun:
    """What a call of `relook recode` did, or would do.

    Attributes
    ----------
    loaded : Loaded
    number : int
        Of the coding.
    sample : Sample
    needed : NeededItems or None
        The published rule's number, where it decided how many items were drawn.
    n_wanted : int
        How many items were asked for.
    coders : tuple of str
    overlap : int
    same_coders : bool
        Whether all of them have labels in the label tables.
    unseen : bool
    n_shown : int
        Items left out of the draw because they had been shown.
    by : str or None
    issued : IssuedRound
    dry_run : bool
    """

    loaded: Loaded
    number: int
    sample: Sample
    needed: NeededItems | None
    n_wanted: int
    coders: tuple[str, ...]
    overlap: int
    same_coders: bool
    unseen: bool
    n_shown: int
    by: str | None
    issued: IssuedRound
    dry_run: bool


def run_recode(
    project: Project,
    request: RecodeRequest,
    *,
    stamp: str,
    dry_run: bool = False,
    force: bool = False,
) -> RecodeRun:
    """Draw a sample, deal it to coders and write their coding sheets.

    Parameters
    ----------
    project : Project
    request : RecodeRequest
    stamp : str
        ISO time to record.
    dry_run : bool
        Write nothing.
    force : bool
        Replace a coding whose files exist already.

    Raises
    ------
    RelookError
        Problems in the tables, a column, coder or number that cannot be, or files that cannot be
        written.
    """
    loaded = load(project, only=request.variables or None)
    if dry_run:
        return _plan(loaded, request, project.secret_or_new(), stamp, dry_run=True)
    with project.lock():
        secret = project.secret()
        run = _plan(loaded, request, secret, stamp, dry_run=False)
        write_round(project.codings, run.issued, force=force)
    return run


def _plan(
    loaded: Loaded, request: RecodeRequest, secret: bytes, stamp: str, *, dry_run: bool
) -> RecodeRun:
    project = loaded.project
    codings = read_codings(project)
    number = 1 + max((held.number for held in codings), default=FIRST_CODING)
    coders = _coders(loaded, request.coders)
    overlap = len(coders) if request.overlap is None else request.overlap
    needed = _needed(loaded) if request.n_items is None else None
    n_wanted = request.n_items if needed is None else needed.n_items
    assert n_wanted is not None
    everything = _population(loaded)
    shown: set[str] = set()
    if request.unseen:
        shown = {row.item for held in (*read_rounds(project), *codings) for row in held.rows}
    population = [item for item in everything if item not in shown]
    sample = draw_sample(
        population,
        n_wanted,
        seed=request.seed,
        number=number,
        group_of=None if request.by is None else _groups(loaded, request.by, population),
    )
    dealt = deal(sample.items, coders, overlap)
    issued = issue_coding(
        loaded,
        number,
        sample,
        dealt,
        seed=request.seed,
        unseen=request.unseen,
        overlap=overlap,
        secret=secret,
        stamp=stamp,
    )
    return RecodeRun(
        loaded=loaded,
        number=number,
        sample=sample,
        needed=needed,
        n_wanted=n_wanted,
        coders=coders,
        overlap=overlap,
        same_coders=set(coders) <= set(loaded.labels.coders),
        unseen=request.unseen,
        n_shown=len(everything) - len(population),
        by=request.by,
        issued=issued,
        dry_run=dry_run,
    )


def _coders(loaded: Loaded, named: Sequence[str]) -> tuple[str, ...]:
    """The coders who are asked: those named, else those of the label tables."""
    names = [" ".join(name.split()) for name in named] or list(loaded.labels.coders)
    twice = sorted({name for name in names if names.count(name) > 1 or not name})
    if twice:
        raise RelookError(
            f"the coder {listed(twice)} is named twice" if twice[0] else "a coder has no name",
            mend="name each coder once",
        )
    if not named and not 2 <= len(names) <= MOST_CODERS_UNASKED:
        raise RelookError(
            f"the label tables have {len(names):,} coders"
            if names
            else "the label tables do not say who the coders are",
            mend="name those who are to code anew: --coder NAME for each",
        )
    return tuple(names)


def _needed(loaded: Loaded) -> NeededItems:
    """The largest number that the published rule asks for, over the variables."""
    found = []
    for name, agreement in loaded.agreements.items():
        needed = needed_for(loaded.labels.variables[name], agreement)
        if needed is None:
            raise RelookError(
                f'no published rule says how many items "{name}" needs: it speaks of nominal '
                "labels whose alpha is defined",
                mend="say how many with --items",
            )
        found.append(needed)
    return max(found, key=lambda needed: needed.n_items)


def _population(loaded: Loaded) -> list[str]:
    """Every item that is known: labelled ones, and those of the item table."""
    items = [str(item) for item in loaded.labels.items]
    if loaded.items is not None:
        items += [str(item) for item in loaded.items.frame.index]
    return list(dict.fromkeys(items))


def _groups(loaded: Loaded, column: str, items: Sequence[str]) -> dict[str, str]:
    """The group of each item by a column of the item table, "" where it has no entry."""
    frame = None if loaded.items is None else loaded.items.frame
    if frame is None or column not in frame.columns:
        known = [] if frame is None else [str(name) for name in frame.columns]
        close = nearest(column, known)
        raise RelookError(
            f'the item table has no column "{column}"'
            if known
            else "the project has no item table, so it has no groups",
            mend=f'did you mean "{close}"?'
            if close
            else f"name one of {listed(known)}"
            if known
            else "leave out --by, or name an item table in relook.toml",
        )
    texts = frame[column].reindex(list(items)).fillna("")
    return dict(zip(items, (str(text) for text in texts), strict=True))


def recode_object(run: RecodeRun) -> dict[str, Any]:
    """Return everything that `relook recode --json` writes, but for its format number."""
    root = run.loaded.project.root
    return {
        "project": str(root),
        "coding": run.number,
        "written": not run.dry_run,
        "seed": run.issued.round.seed,
        "n_items": len(run.sample.items),
        "n_population": run.sample.n_population,
        "unseen": run.unseen,
        "n_shown": run.n_shown,
        "by": run.by,
        "groups": [
            {"group": name, "n_items": size, "n_drawn": drawn}
            for name, (size, drawn) in run.sample.groups.items()
        ],
        "needed_items": None if run.needed is None else run.needed.n_items,
        "coders": list(run.coders),
        "same_coders": run.same_coders,
        "overlap": run.overlap,
        "variables": list(run.loaded.agreements),
        "items": list(run.sample.items),
        "worksheets": [
            {"coder": name, "file": str(root / held.file), "n_rows": held.n_rows}
            for name, held in zip(run.coders, run.issued.round.worksheets, strict=True)
        ],
    }
