"""Whether the labels are still those that coders made before anybody was shown a worksheet."""

from __future__ import annotations

from relook.project.loading import Loaded
from relook.project.rounds import read_rounds


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
