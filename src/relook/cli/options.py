"""Options that several commands share, declared once."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

TargetArgument = Annotated[
    Path,
    typer.Argument(
        metavar="TARGET",
        help="A project folder, or a label table to be looked at as it is.",
        show_default="this folder",
    ),
]
ProjectArgument = Annotated[
    Path,
    typer.Argument(metavar="PROJECT", help="A project folder.", show_default="this folder"),
]
JsonOption = Annotated[
    bool, typer.Option("--json", help="Write one JSON object with full-precision numbers.")
]
QuietOption = Annotated[
    bool, typer.Option("--quiet", "-q", help="Leave out what is said along the way.")
]
DebugOption = Annotated[
    bool, typer.Option("--debug", help="Show the traceback of an error.", hidden=True)
]
VariableOption = Annotated[
    list[str] | None,
    typer.Option("--variable", metavar="NAME", help="Only this variable; may be repeated."),
]
DifferenceOption = Annotated[
    str | None,
    typer.Option(
        "--difference",
        metavar="FUNCTION",
        help="Difference function of the one variable: nominal, ordinal, interval, ratio, "
        "circular:12, polar:0,10, jaccard:;, masi:;, tree:/, table:FILE.csv.",
    ),
]
SeedOption = Annotated[
    int | None,
    typer.Option("--seed", min=0, help="Seed of everything random; printed and recorded."),
]
DryRunOption = Annotated[
    bool, typer.Option("--dry-run", help="Say what would be written, and write nothing.")
]
ForceOption = Annotated[bool, typer.Option("--force", help="Replace files that exist already.")]
EngineOption = Annotated[
    str | None,
    typer.Option(
        "--engine",
        metavar="NAME",
        help="dask: labels in several files are read and summed up by several processes or "
        "machines.",
    ),
]
SchedulerOption = Annotated[
    str | None,
    typer.Option(
        "--scheduler",
        metavar="ADDRESS",
        help="With --engine dask: a running scheduler; left out, a cluster on this machine.",
    ),
]
ByItemOption = Annotated[
    bool,
    typer.Option(
        "--by-item",
        help="With --engine dask: each item's labels are all in one file, so nothing is shuffled.",
    ),
]
TopOption = Annotated[
    int | None, typer.Option("--top", min=1, metavar="N", help="Send at most N disputed items.")
]
ShareOption = Annotated[
    float | None,
    typer.Option(
        "--share",
        min=0.0,
        max=1.0,
        metavar="S",
        help="Send the shortest head of the ranking that carries this share of the disagreement.",
    ),
]
HoursOption = Annotated[
    float | None,
    typer.Option("--hours", min=0.0, metavar="H", help="Adjudicator time to spend, in all."),
]
SecondsOption = Annotated[
    float | None,
    typer.Option(
        "--seconds-per-item",
        min=0.1,
        metavar="S",
        help="Time that an item takes, all its rows together.",
    ),
]
RankByOption = Annotated[
    str | None,
    typer.Option("--rank-by", metavar="ORDER", help="contribution, doubt or intensity."),
]
