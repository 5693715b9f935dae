"""One call of `relook queue`, from the project folder to the files of a round."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any

from relook.project.archive.history import History
from relook.project.archive.record import read_record
from relook.project.archive.rounds import read_rounds
from relook.project.archive.settlements import settlements
from relook.project.figures.score_tables import defined
from relook.project.figures.scoring import Score, score
from relook.project.sending.cautions import cautions_of
from relook.project.sending.issuing import OVERVIEW_FILE, IssuedRound, issue_round, write_round
from relook.project.sending.overviews import overview_of
from relook.project.sending.queueing import PlannedRound, QueueRequest, plan_round
from relook.project.setup.folder import Project
from relook.project.setup.guessed import folder_for, write_settings
from relook.project.setup.loading import Loaded, load
from relook.tables.reading import Doing, silently
from relook.worksheet.overview import write_overview

Row = dict[str, Any]


@dataclass(frozen=True, slots=True, kw_only=True)
class QueueRun:
    """What a call of `relook queue` did, or would do.

    Attributes
    ----------
    loaded : Loaded
    score : Score
    planned : PlannedRound
    issued : IssuedRound
    overview : Path
    n_earlier_rounds : int
    dry_run : bool
    cautions : tuple of str
        What to know before the worksheets are sent.
    """

    loaded: Loaded
    score: Score
    planned: PlannedRound
    issued: IssuedRound
    overview: Path
    n_earlier_rounds: int
    dry_run: bool
    cautions: tuple[str, ...] = ()


def run_queue(
    project: Project,
    request: QueueRequest,
    *,
    stamp: str,
    new_project: bool = False,
    dry_run: bool = False,
    force: bool = False,
    doing: Doing = silently,
    loader: Callable[[Project], Loaded] | None = None,
) -> QueueRun:
    """Plan a round and write it.

    Parameters
    ----------
    project : Project
    request : QueueRequest
    stamp : str
        ISO time to record.
    new_project : bool
        Whether relook.toml must be written first: nothing is, unless there is something to queue.
    dry_run : bool
        Plan, and write nothing.
    force : bool
        Replace files that exist.
    doing : callable, optional
        Told what is being done, in words for the user.
    loader : callable, optional
        Loads the project where its labels do not lie here.

    Raises
    ------
    RelookError
        See `plan_round` and `write_round`.
    """
    loaded_by = partial(load, doing=doing) if loader is None else loader
    if new_project and not dry_run:
        with folder_for(project) as made:
            loaded = loaded_by(made)
            doing("ranking items and planning the round")
            return _write(loaded, request, stamp, new_project=True, force=force)
    loaded = loaded_by(project)
    doing("ranking items and planning the round")
    if dry_run:  # a rehearsal leaves no trace, not even a secret
        return _plan(loaded, request, project.secret_or_new(), stamp, dry_run=True)
    return _write(loaded, request, stamp, new_project=False, force=force)


def _write(
    loaded: Loaded, request: QueueRequest, stamp: str, *, new_project: bool, force: bool
) -> QueueRun:
    """Plan a round, and only then touch the folder: with nothing to queue nothing is written."""
    project = loaded.project
    secret = project.secret_or_new()
    run = _plan(loaded, request, secret, stamp, dry_run=False)
    if new_project:
        write_settings(project)
    with project.lock():
        if not project.has_secret:
            project.keep_secret(secret)
        if project.secret() != secret or len(read_rounds(project)) != run.n_earlier_rounds:
            # Somebody else wrote a round since; plan again on top of it.
            run = _plan(loaded, request, project.secret(), stamp, dry_run=False)
        overview = write_overview(overview_of(run.score, run.planned, run.issued))
        write_round(project, run.issued, overview, force=force)
    return run


def _plan(
    loaded: Loaded, request: QueueRequest, secret: bytes, stamp: str, *, dry_run: bool
) -> QueueRun:
    project = loaded.project
    record = read_record(project)
    history = History(read_rounds(project), record, settlements(loaded, record))
    planned = plan_round(loaded, request, history, secret)
    issued = issue_round(loaded, planned, request, secret, stamp)
    return QueueRun(
        loaded=loaded,
        score=score(loaded, request.queue, seed=request.seed, ordering=planned.ordering),
        planned=planned,
        issued=issued,
        overview=project.round_folder(planned.number) / OVERVIEW_FILE,
        n_earlier_rounds=len(history.rounds),
        dry_run=dry_run,
        cautions=cautions_of(loaded, planned.ordering),
    )


def queue_object(run: QueueRun) -> Row:
    """Return everything that `relook queue --json` writes, but for its format number."""
    planned, root = run.planned, run.loaded.project.root
    selection = planned.ordering.selection
    return {
        "round": planned.number,
        "written": not run.dry_run,
        "project": str(root),
        "seed": run.issued.round.seed,
        "n_items": planned.n_items,
        "n_disputed_items": selection.n_items,
        "n_rows": planned.n_rows,
        "n_audit_items": planned.n_audit_items,
        "audit_limit_if_all_upheld": planned.limit_if_all_upheld,
        "bound_by": selection.bound_by,
        "variables": [
            {
                "variable": scored.name,
                "share_of_disagreement": defined(selection.share_per_variable[position]),
                "n_rows": int(selection.rows_per_variable[position]),
                "projected_agreement": {
                    "low": defined(scored.prospect.low[-1]),
                    "high": defined(scored.prospect.high[-1]),
                },
            }
            for position, scored in enumerate(run.score.variables)
        ],
        "worksheets": [
            {
                "worksheet": held.id,
                "adjudicator": planned_sheet.adjudicator.name,
                "file": str(root / held.file),
                "n_rows": held.n_rows,
            }
            for held, planned_sheet in zip(
                run.issued.round.worksheets, planned.plan.worksheets, strict=True
            )
        ],
        "unplanned": [
            {"item": held.item, "variables": list(held.variables), "reason": held.reason}
            for held in planned.plan.unplanned
        ],
        "overview": str(run.overview),
        "cautions": list(run.cautions),
    }
