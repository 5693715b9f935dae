"""One entry of the record: a decision with where it came from, and the line it is written as."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from relook.core.decisions import Decision


@dataclass(frozen=True, slots=True, kw_only=True)
class Recorded:
    """A decision as the record holds it.

    Attributes
    ----------
    decision : Decision
    key : str
        Row code of the row it came in; "" for rulings made elsewhere.
    worksheet : str
        Id of the worksheet; "" for rulings made elsewhere.
    source : str
        SHA-256 of the returned file.
    modified : str
        When that file says it was last saved; "" where it does not say.
    sheet, cell : str
        Where in the file, such as "Queue" and "F5".
    found : str
        What the cell showed, where that was not exactly the label; else "".
    supersedes : str
        Id of the decision that this one takes the place of; "" where there was none.
    labels_digest : str
        Digest of the item's labels on the variable as the adjudicator was asked about them.
    """

    decision: Decision
    key: str = ""
    worksheet: str = ""
    source: str = ""
    modified: str = ""
    sheet: str = ""
    cell: str = ""
    found: str = ""
    supersedes: str = ""
    labels_digest: str = ""

    @property
    def value(self) -> tuple[str, str | None, str, str]:
        """What was decided and said: ruling, label, reason, note."""
        held = self.decision
        return held.ruling, held.label, held.reason, held.note


def entry_to_dict(entry: Recorded) -> dict[str, Any]:
    """Return an entry as it is written; order and id come from the file and are left out."""
    held = entry.decision
    return {
        "adjudicator": held.adjudicator,
        "round": held.round,
        "kind": held.kind,
        "item": held.item,
        "variable": held.variable,
        "ruling": held.ruling,
        "label": held.label,
        "reason": held.reason,
        "note": held.note,
        "key": entry.key,
        "worksheet": entry.worksheet,
        "source": entry.source,
        "modified": entry.modified,
        "sheet": entry.sheet,
        "cell": entry.cell,
        "found": entry.found,
        "supersedes": entry.supersedes,
        "labels_digest": entry.labels_digest,
    }


def entry_from_dict(line: Mapping[str, Any], order: tuple[str, ...], name: str) -> Recorded:
    """Return the entry that a line holds; damage raises ValueError, TypeError or KeyError."""
    ruling = line["ruling"]
    if ruling not in ("label", "cannot be coded", "withdraw"):
        raise ValueError(f"{ruling!r} is no ruling")
    if (ruling == "label") != isinstance(line["label"], str):
        raise ValueError("a ruling and its label do not fit")
    number = int(line["round"])
    decision = Decision(
        item=str(line["item"]),
        variable=str(line["variable"]),
        adjudicator=str(line["adjudicator"]),
        ruling=ruling,
        label=line["label"],
        reason=str(line["reason"]),
        note=str(line["note"]),
        round=number,
        kind=str(line["kind"]),
        # A later round asks anew, so a stale sheet of an earlier one cannot outdo its answer.
        order=(f"{number:06d}", *order),
        id=name,
    )
    texts = ("key", "worksheet", "source", "modified", "sheet", "cell", "found", "supersedes")
    return Recorded(
        decision=decision,
        labels_digest=str(line["labels_digest"]),
        **{name: str(line[name]) for name in texts},
    )
