"""A queue of the items most worth a second look, and the worksheets for it."""

from __future__ import annotations

import secrets
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from pathlib import Path

import pandas as pd

from relook.errors import RelookError
from relook.frames.intake import CODER, ITEM, ITEMS_FILE, LABELS_FILE
from relook.frames.measured import Measured
from relook.frames.showing import Facts, as_html, plain
from relook.project.archive.history import History
from relook.project.sending.queue_run import run_queue
from relook.project.sending.queueing import PlannedRound, QueueRequest, plan_round
from relook.project.setup.folder import Project, write_whole
from relook.project.setup.guessed import write_settings
from relook.project.setup.loading import Loaded
from relook.project.setup.settings import QueueSettings
from relook.tables.findings import counted
from relook.tables.results import csv_bytes


@dataclass(frozen=True, slots=True, kw_only=True, eq=False, repr=False)
class Queue:
    """What is to be sent to whom; nothing is written before `write`.

    Attributes
    ----------
    n_items, n_disputed_items, n_audit_items : int
        Items in all; those taken from the head of the ranking; those drawn at random from what
        would otherwise be released without a decision.
    share : float or None
        Of D_o that the disputed ones carry.
    said : str
        How many, and what bound.
    """

    n_items: int
    n_disputed_items: int
    n_audit_items: int
    share: float | None
    said: str
    _loaded: Loaded = field(repr=False)
    _planned: PlannedRound = field(repr=False)
    _request: QueueRequest = field(repr=False)
    _secret: bytes = field(repr=False)

    @property
    def rows(self) -> pd.DataFrame:
        """Every row of every worksheet, as only the lead may see them.

        Returns
        -------
        DataFrame of shape (n_rows, 7)
            Columns row_code, item, variable, adjudicator, kind (disputed or audit), rank (missing
            for audit items) and contribution (to D_o). In the order of each worksheet, which is no
            order of rank.

        Examples
        --------
        >>> import pandas as pd, relook
        >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
        >>> held = relook.queue(relook.measure(labels), top=1, audit=1, secret=bytes(32))
        >>> held.rows.sort_values("rank")[["item", "kind", "rank"]]
          item      kind  rank
        1    2  disputed     1
        0    3     audit  <NA>
        """
        selection, ranking = self._planned.ordering.selection, self._planned.ordering.ranking
        items = self._loaded.labels.items
        at = {str(items[item]): place for place, item in enumerate(selection.item_index.tolist())}
        rows = [
            {
                "row_code": row.key,
                "item": row.item,
                "variable": row.variable,
                "adjudicator": sheet.adjudicator.name,
                "kind": row.kind,
                "rank": at[row.item] + 1 if row.kind == "disputed" else None,
                "contribution": float(ranking.row_contribution[ranking.row_start[at[row.item]]])
                if row.kind == "disputed"
                else None,
            }
            for sheet in self._planned.plan.worksheets
            for row in sheet.rows
        ]
        columns = ["row_code", "item", "variable", "adjudicator", "kind", "rank", "contribution"]
        frame = pd.DataFrame(rows, columns=columns)
        return frame.astype({"rank": "Int64", "contribution": "float64"})

    def write(self, folder: str | Path, *, made: datetime | None = None) -> tuple[Path, ...]:
        """Write the worksheets, and beside them what is needed to take them back.

        Parameters
        ----------
        folder : str or Path
            Made where missing. It will be a project folder: labels and items as tables, the
            settings, the round; every `relook` command works on it. Send only what lies in
            `rounds/01/worksheets`.
        made : datetime, optional
            The time to record; now where left out.

        Returns
        -------
        tuple of Path
            The worksheets.

        Raises
        ------
        RelookError
            There is a project in the folder already, or it cannot be written.

        Examples
        --------
        >>> import pandas as pd, relook, tempfile
        >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
        >>> held = relook.queue(relook.measure(labels), top=1, adjudicators=["Ines"])
        >>> with tempfile.TemporaryDirectory() as folder:
        ...     [sheet.name for sheet in held.write(folder)]
        ['round-01-Ines.xlsx']
        """
        root = Path(folder).absolute()
        loaded = self._loaded
        settings = replace(
            loaded.project.settings,
            project=secrets.token_hex(16),
            queue=replace(self._request.queue, audit=self.n_audit_items),
        )
        project = Project(root, settings)
        write_settings(project)
        write_whole(root / LABELS_FILE, csv_bytes(_label_table(loaded)))
        if loaded.items is not None:
            table = loaded.items.frame.rename_axis(index=ITEM).reset_index()
            write_whole(root / ITEMS_FILE, csv_bytes(table))
        project.keep_secret(self._secret)
        stamp = (made or datetime.now(UTC)).isoformat(timespec="seconds")
        run = run_queue(Project.open(root), self._request, stamp=stamp)
        return tuple(root / held.file for held in run.issued.round.worksheets)

    def _facts(self) -> Facts:
        sheets = self._planned.plan.worksheets
        return (
            ("queued", self.said),
            ("audit", f"{counted(self.n_audit_items, 'item')} drawn at random from the rest"),
            *((sheet.adjudicator.name, counted(len(sheet.rows), "row")) for sheet in sheets),
        )

    def __repr__(self) -> str:
        return plain("queue", self._facts())

    def _repr_html_(self) -> str:
        return as_html("queue", self._facts())


def queue(
    measured: Measured,
    *,
    adjudicators: Sequence[str] = ("adjudicator",),
    top: int | None = None,
    share: float | None = None,
    hours: float | None = None,
    seconds_per_item: float = 45.0,
    audit: int = 20,
    overlap: float = 0.1,
    title: str | None = None,
    secret: bytes | None = None,
    seed: int = 1,
) -> Queue:
    """Take the head of the ranking, add items drawn at random, and deal them to adjudicators.

    Parameters
    ----------
    measured : Measured
        Its `rank_by` orders the items.
    adjudicators : sequence of str
        Who decides.
    top, share, hours : optional
        At most so many disputed items; those that carry this share of D_o; as many as fit into so
        many hours of all adjudicators together. The smallest binds; half of D_o and at most 100
        items where none is given.
    seconds_per_item : float
    audit : int
        Items drawn from those that would be released without a decision.
    overlap : float
        Share of the items that a second adjudicator gets too.
    title : str, optional
        What the worksheets are called.
    secret : bytes, optional
        Keys row codes and orders, so that they give nothing away; drawn where left out.
    seed : int
        For the audit and the last tie-break.

    Returns
    -------
    Queue

    Raises
    ------
    RelookError
        A limit out of its range, an adjudicator named twice, or nothing to send.

    Examples
    --------
    >>> import pandas as pd, relook
    >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
    >>> relook.queue(relook.measure(labels), top=1, adjudicators=["Ines"], audit=0)
    queue
      queued  1 of 2 disputed items, 50% of the disagreement; as many as were asked for
      audit   0 items drawn at random from the rest
      Ines    1 row
    """
    names = [" ".join(str(name).split()) for name in adjudicators]
    if not names or len(set(names)) < len(names) or not all(names):
        raise RelookError(
            f"adjudicators are named once each; got {names}", mend="give a list of different names"
        )
    score = measured._score
    held = score.loaded.project.settings
    wanted = QueueSettings(
        rank_by=score.ordering.ranking.rank_by,
        top=top,
        share=share,
        hours=hours,
        seconds_per_item=seconds_per_item,
        audit=audit,
    )
    settings = replace(
        held,
        queue=wanted,
        worksheet=replace(
            held.worksheet, adjudicators=dict.fromkeys(names), overlap=overlap, title=title
        ),
    )
    loaded = replace(score.loaded, project=replace(score.loaded.project, settings=settings))
    request = QueueRequest(queue=wanted, seed=seed, audit=audit)
    keyed = secrets.token_bytes(32) if secret is None else secret
    planned = plan_round(loaded, request, History(), keyed)
    selection = planned.ordering.selection
    return Queue(
        n_items=planned.n_items,
        n_disputed_items=selection.n_items,
        n_audit_items=planned.n_audit_items,
        share=selection.share,
        said=selection.sentence(planned.ordering.ranking),
        _loaded=loaded,
        _planned=planned,
        _request=request,
        _secret=keyed,
    )


def _label_table(loaded: Loaded) -> pd.DataFrame:
    """The labels as the long table that the project's settings speak of."""
    (held,) = loaded.labels.variables.values()
    labels = held.labels
    assert labels.coder_index is not None
    items = pd.Series(loaded.labels.items)
    coders = pd.Series(loaded.labels.coders, dtype=object)
    texts = pd.Series(held.texts, dtype=object)
    table = pd.DataFrame(
        {
            ITEM: items.take(labels.item_index).to_numpy(),
            CODER: coders.take(labels.coder_index).to_numpy(),
            held.variable.name: texts.take(labels.value_index).to_numpy(),
        }
    )
    # Items without a label are items all the same; an empty cell says so.
    blank = items[labels.labels_per_item == 0]
    if len(blank) and len(coders):
        rest = pd.DataFrame({ITEM: blank.to_numpy(), CODER: coders[0], held.variable.name: ""})
        table = pd.concat([table, rest], ignore_index=True)
    return table
