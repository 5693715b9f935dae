"""Whether the labels are still those that coders made before anybody was shown a worksheet."""

from __future__ import annotations

from collections.abc import Sequence

from relook.errors import Place, RelookError, listed
from relook.project.archive.record import read_record
from relook.project.archive.rounds import Round, read_rounds
from relook.project.setup.loading import Loaded, labels_digest, labels_of_item


def changed_since_first_round(loaded: Loaded) -> tuple[str, ...]:
    """Return the label files that differ from those of the first round, are new or are gone.

    Labels that were changed after a round may have been changed because of it. Alpha speaks of
    independently made labels, so whoever relies on it must know.

    Returns
    -------
    tuple of str
        By name; empty where nothing changed or no round was sent.
    """
    project = loaded.project
    if not project.settings.project:
        return ()  # a bare table belongs to no project
    rounds = read_rounds(project)
    if not rounds:
        return ()
    then, now = rounds[0].label_files, loaded.labels.digests
    return tuple(sorted(file for file in {*then, *now} if then.get(file) != now.get(file)))


def check_independence(
    loaded: Loaded, rounds: Sequence[Round], *, relabelled: bool
) -> tuple[str, ...]:
    """Return the label files that changed since the first round.

    Parameters
    ----------
    loaded : Loaded
    rounds : sequence of Round
    relabelled : bool
        Whether to go on all the same.

    Raises
    ------
    RelookError
        Files changed and `relabelled` is false; names the items that were sent with other labels.
    """
    changed = changed_since_first_round(loaded)
    if changed and not relabelled:
        raise _changed_labels(loaded, rounds, changed)
    return changed


def _changed_labels(loaded: Loaded, rounds: Sequence[Round], changed: Sequence[str]) -> RelookError:
    rows = {(row.item, row.variable): row for held in rounds for row in held.rows}
    numbers = loaded.item_numbers([item for item, _ in rows])
    items = []
    for (key, row), number in zip(rows.items(), numbers, strict=True):
        if key[1] not in loaded.agreements or not row.labels_digest:
            continue
        now = "" if number < 0 else labels_digest(labels_of_item(loaded, key[1], int(number)))
        if now != row.labels_digest:
            items.append(key[0])
    said = (
        f"{len(items):,} of the items that were sent have other labels now: "
        f"{listed(dict.fromkeys(items))}"
        if items
        else "no item that was sent has other labels now"
    )
    message = (
        "the label files are not those of the first round, so alpha would not be of independently "
        f"made labels: {listed(changed)}; {said}"
    )
    if not read_record(loaded.project).decisions:
        mend = (
            "no decision is in yet, so nothing is lost by starting over: take the folder "
            f"{loaded.project.relative(loaded.project.rounds_folder)} away and queue anew. "
            "Or put the files of the first round back"
        )
        return RelookError(message, where=Place(changed[0]), mend=mend)
    return RelookError(
        message,
        where=Place(changed[0]),
        mend="put the files of the first round back, and give the changed ones by --against; or "
        "add --relabelled to go on with labels that may have been changed because of the "
        "worksheets",
    )
