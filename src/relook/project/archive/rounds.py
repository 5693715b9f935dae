"""Rounds: what was sent to whom, and why, as it stood when it was sent."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from typing import Any

from relook.core.audit import STRATA, Stratum
from relook.errors import Place, RelookError
from relook.project.setup.folder import Project

FORMAT = 1
ROUND_FILE = "round.json"


@dataclass(frozen=True, slots=True, kw_only=True)
class RoundRow:
    """One row of one worksheet: one variable of one item, sent to one adjudicator.

    Attributes
    ----------
    key : str
        The row code.
    item, variable : str
    worksheet, adjudicator : str
        Ids.
    kind : str
        disputed, audit, split or recheck.
    stratum : str
        For audit rows: the stratum that the item was drawn from.
    rank : int or None
        Place in the ranking of items, 1 the heaviest; None for audit rows.
    contribution : float or None
        The item's part of D_o on this variable.
    labels_digest : str
        Digest of the item's labels on this variable as they stood.
    competing : tuple of str
        The labels that the row shows, in its order; an audit row shows some that nobody gave.
    evidence : mapping of str to str
        Digest of the text of each evidence cell as sent, by its header.
    """

    key: str
    item: str
    variable: str
    worksheet: str
    adjudicator: str
    kind: str
    stratum: str = ""
    rank: int | None = None
    contribution: float | None = None
    labels_digest: str = ""
    competing: tuple[str, ...] = ()
    evidence: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, kw_only=True)
class RoundWorksheet:
    """A worksheet that was written: its id, whose it is, its file and the file's digest."""

    id: str
    adjudicator: str
    file: str
    digest: str
    n_rows: int


@dataclass(frozen=True, slots=True, kw_only=True)
class RoundVariable:
    """Agreement on one variable, of independently made labels, when the round was written."""

    variable: str
    difference: str
    alpha: float | None
    undefined_because: str | None
    observed_disagreement: float | None
    expected_disagreement: float | None
    n_items: int
    n_pairable_items: int
    n_disputed_items: int
    n_labels: int
    n_pairable_labels: int
    n_coders: int


@dataclass(frozen=True, slots=True, kw_only=True)
class RoundStratum:
    """Items that would be released without a decision, and how many were drawn for the audit.

    `n_tied` of the `n_items`, and `n_drawn_tied` of those drawn, have labels that tie, and so no
    label to be released with.
    """

    variable: str
    stratum: str
    n_items: int
    n_drawn: int
    n_tied: int = 0
    n_drawn_tied: int = 0


def stratum_of(name: str) -> Stratum:
    """Return a stratum by the name that a round keeps.

    Raises
    ------
    RelookError
        The round was written by a later relook.
    """
    for stratum in STRATA:
        if stratum == name:
            return stratum
    raise RelookError(
        f'a round names the stratum "{name}", which this relook does not know', mend="update relook"
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Round:
    """One batch of worksheets.

    Attributes
    ----------
    number : int
    made : str
        ISO time.
    relook : str
        Version that wrote it.
    project : str
        The project's id.
    seed : int
    settings : mapping
        Everything that decided what was selected.
    label_files : mapping of str to str
        SHA-256 of each label file, by its path from the project folder.
    """

    number: int
    made: str
    relook: str
    project: str
    seed: int
    settings: Mapping[str, Any]
    label_files: Mapping[str, str]
    variables: tuple[RoundVariable, ...]
    strata: tuple[RoundStratum, ...]
    worksheets: tuple[RoundWorksheet, ...]
    rows: tuple[RoundRow, ...]

    def to_json(self) -> bytes:
        """Return the bytes of round.json: keys in a fixed order, a line per row."""
        head = {
            "format": FORMAT,
            "relook": self.relook,
            "project": self.project,
            "round": self.number,
            "made": self.made,
            "seed": self.seed,
            "settings": dict(self.settings),
            "label_files": dict(self.label_files),
        }
        body = json.dumps(head, ensure_ascii=False, indent=1)[:-2]
        for name in ("variables", "strata", "worksheets", "rows"):
            lines = ",\n  ".join(
                json.dumps(asdict(entry), ensure_ascii=False) for entry in getattr(self, name)
            )
            body += f',\n "{name}": [\n  {lines}\n ]' if lines else f',\n "{name}": []'
        return (body + "\n}\n").encode("utf-8")

    @classmethod
    def from_json(cls, data: bytes, file: str) -> Round:
        """Read the bytes of a round.json.

        Raises
        ------
        RelookError
            Not readable, of a newer format, or with parts missing.
        """
        where = Place(file)
        mend = "restore the file from a copy of the project folder"
        try:
            held = json.loads(data)
            if not isinstance(held, dict):
                raise TypeError
            if int(held["format"]) > FORMAT:
                raise RelookError(
                    f"written by a newer relook (format {held['format']})",
                    where=where,
                    mend="update relook",
                )
            return cls(
                number=int(held["round"]),
                made=str(held["made"]),
                relook=str(held["relook"]),
                project=str(held["project"]),
                seed=int(held["seed"]),
                settings=held["settings"],
                label_files=held["label_files"],
                variables=tuple(RoundVariable(**entry) for entry in held["variables"]),
                strata=tuple(RoundStratum(**entry) for entry in held["strata"]),
                worksheets=tuple(RoundWorksheet(**entry) for entry in held["worksheets"]),
                rows=tuple(
                    RoundRow(**{**entry, "competing": tuple(entry.get("competing", ()))})
                    for entry in held["rows"]
                ),
            )
        except (ValueError, TypeError, KeyError) as error:
            raise RelookError(
                f"not a readable round file ({type(error).__name__})", where=where, mend=mend
            ) from None


def read_rounds(project: Project) -> list[Round]:
    """Return every round of a project, first to last.

    Raises
    ------
    RelookError
        A round file that cannot be read, or that belongs to another project.
    """
    rounds = []
    for file in sorted(project.rounds_folder.glob(f"*/{ROUND_FILE}")):
        name = project.relative(file)
        found = Round.from_json(file.read_bytes(), name)
        if found.project != project.settings.project:
            raise RelookError(
                "this round belongs to another project",
                where=Place(name),
                mend="move the round to its own project folder",
            )
        rounds.append(found)
    return sorted(rounds, key=lambda found: found.number)
