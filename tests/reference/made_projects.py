"""Projects made from label tables held in memory, for tests of the figures."""

from __future__ import annotations

import csv
import io
from collections.abc import Hashable, Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

from relook.project.figures.scoring import Score, score
from relook.project.setup.folder import Project
from relook.project.setup.loading import Loaded, load
from relook.project.setup.settings import QueueSettings


def long_csv(table: Mapping[Hashable, Iterable[tuple[Hashable, Any]]]) -> str:
    """Return item -> (coder, label) as a table with a row per label."""
    rows = [(item, coder, label) for item, labels in table.items() for coder, label in labels]
    return csv_text(("item", "coder", "label"), rows)


def csv_text(header: Sequence[object], rows: Iterable[Sequence[object]]) -> str:
    """Return a table as CSV."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(header)
    writer.writerows(rows)
    return out.getvalue()


def make(
    root: Path,
    labels: str,
    *,
    variables: str = '[variables.label]\ncolumn = "label"\n',
    label_settings: str = 'item = "item"\ncoder = "coder"\n',
    items: str | None = None,
    item_settings: str = 'key = "item"\n',
    rest: str = "",
) -> Project:
    """Write a project folder and open it; `variables`, `…_settings` and `rest` are TOML."""
    root.mkdir(parents=True, exist_ok=True)
    (root / "labels.csv").write_text(labels, encoding="utf-8")
    text = f'format = 1\nproject = "made"\n[labels]\nfiles = ["labels.csv"]\n{label_settings}'
    text += variables
    if items is not None:
        (root / "items.csv").write_text(items, encoding="utf-8")
        text += f'[items]\nfiles = ["items.csv"]\n{item_settings}'
    (root / "relook.toml").write_text(text + rest, encoding="utf-8")
    return Project.open(root)


def scored(project: Project, **how: Any) -> Score:
    """Score a project with a fixed seed and few resamples."""
    loaded: Loaded = load(project)
    how = {"resamples": 200, "seed": 1, **how}
    queue = how.pop("queue", QueueSettings())
    return score(loaded, queue, **how)


def difference(name: str, **options: object) -> str:
    """Return the TOML of one variable, "label"."""
    lines = [
        f"{key} = {value if isinstance(value, list) else repr(value)}"
        for key, value in options.items()
    ]
    return "\n".join(
        ["[variables.label]", 'column = "label"', f'difference = "{name}"', *lines, ""]
    )
