"""What the record of decisions amounts to, item by item and variable by variable."""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction

from relook.core.decisions import Settlement, fold
from relook.project.archive.decidable import takes_numbers
from relook.project.archive.record import Record
from relook.project.setup.loading import Loaded
from relook.project.setup.settings import Settings


def tolerances(settings: Settings) -> dict[str, Fraction]:
    """Return the tolerance of each variable whose decisions are numbers."""
    return {
        variable.name: variable.tolerance
        for variable in settings.variables
        if takes_numbers(variable)
    }


def unanimous_labels(
    loaded: Loaded, among: Iterable[tuple[str, str]]
) -> dict[tuple[str, str], str]:
    """Return the label of those (item, variable) on which two coders or more agree to the letter.

    Parameters
    ----------
    loaded : Loaded
    among : iterable of (item, variable)
        Those to look at; one that is not in the label table is passed over.
    """
    keys = sorted(set(among))
    found: dict[tuple[str, str], str] = {}
    for key, item in zip(keys, loaded.item_numbers([item for item, _ in keys]), strict=True):
        agreement = loaded.agreements.get(key[1])
        if agreement is None or item < 0:
            continue
        profile = int(agreement.profile_of_item[item])
        profiles = agreement.profiles
        if profile < 0 or profiles.n_distinct[profile] > 1 or profiles.size[profile] < 2:
            continue
        value = profiles.value_index[profiles.start[profile]]
        found[key] = loaded.labels.variables[key[1]].texts[value]
    return found


def settlements(loaded: Loaded, record: Record) -> dict[tuple[str, str], Settlement]:
    """Fold the record into settlements by (item, variable).

    A ruling against coders who all agree stands as "unconfirmed" until a second adjudicator rules
    the same way.
    """
    decisions = record.decisions
    if not decisions:
        return {}
    ruled = {(decision.item, decision.variable) for decision in decisions}
    return fold(
        decisions,
        tolerances=tolerances(loaded.project.settings),
        unanimous=unanimous_labels(loaded, ruled),
    )
