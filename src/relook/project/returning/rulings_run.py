"""One call of `relook collect --rulings`: rulings are checked against the labels as they stand."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

from relook.project.returning.collected import Collected
from relook.project.returning.rulings import collect_rulings
from relook.project.sending.sheets import sheet_variable
from relook.project.setup.folder import Project
from relook.project.setup.loading import labels_digest, labels_of_item, load


def run_rulings(
    project: Project, path: Path, *, strict: bool, reinstate: bool, dry_run: bool, now: datetime
) -> Collected:
    """Bring rulings made elsewhere into the record.

    Parameters
    ----------
    project : Project
    path : Path
    strict, reinstate, dry_run, now
        As for `relook.project.returning.collecting.collect`.
    """
    loaded = load(project)
    variables = {
        name: sheet_variable(held, loaded.agreements[name], project.root)
        for name, held in loaded.labels.variables.items()
    }

    def digest_of(item: str, variable: str) -> str:
        number = int(loaded.item_numbers([item])[0])
        return labels_digest(labels_of_item(loaded, variable, number))

    return collect_rulings(
        project,
        path,
        variables=variables,
        items=set(map(str, loaded.labels.items)),
        labels_digest_of=digest_of,
        strict=strict,
        reinstate=reinstate,
        dry_run=dry_run,
        now=now,
    )
