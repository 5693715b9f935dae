"""What was sent and decided before, and what of it is still in somebody's hands."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from relook.core.decisions import Settlement
from relook.project.archive.record import Record
from relook.project.archive.rounds import Round

#: A settlement in one of these states needs nobody's decision any more.
CLOSED = ("settled", "cannot be coded")


@dataclass(frozen=True, slots=True)
class History:
    """What was sent and decided before.

    Attributes
    ----------
    rounds : sequence of Round
    record : Record
    settled : dict of (item, variable) to Settlement
    """

    rounds: Sequence[Round] = ()
    record: Record = field(default_factory=Record)
    settled: dict[tuple[str, str], Settlement] = field(default_factory=dict)

    @property
    def closed(self) -> set[tuple[str, str]]:
        """What needs nobody's decision any more."""
        return {key for key, held in self.settled.items() if held.state in CLOSED}

    @property
    def out(self) -> set[tuple[str, str]]:
        """What was sent and has no standing decision yet."""
        ruled = {key for key, held in self.settled.items() if held.state != "open"}
        sent = {(row.item, row.variable) for held in self.rounds for row in held.rows}
        return sent - ruled

    def waiting_for_second(self) -> set[tuple[str, str]]:
        """Splits and rechecks that were sent to somebody who has not ruled yet."""
        ruled = {
            (decision.item, decision.variable, decision.adjudicator)
            for held in self.settled.values()
            for decision in held.standing
        }
        return {
            (row.item, row.variable)
            for held in self.rounds
            for row in held.rows
            if row.kind in ("split", "recheck")
            and (row.item, row.variable, row.adjudicator) not in ruled
        }

    @property
    def last_is_unanswered(self) -> bool:
        """Whether nothing at all of the last round is back."""
        if not self.rounds:
            return False
        last = self.rounds[-1].number
        return all(decision.round != last for decision in self.record.decisions)
