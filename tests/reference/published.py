"""Published worked examples, with their sources, and exact figures computed from the definitions."""

from __future__ import annotations

import json
from collections.abc import Hashable
from functools import cache
from pathlib import Path
from typing import Any


@cache
def everything() -> dict[str, Any]:
    """Return the whole file `published.json`."""
    return dict(json.loads((Path(__file__).parent / "published.json").read_text("utf-8")))


def example(name: str) -> dict[str, Any]:
    """Return one example by its id, such as "K2011-CD"."""
    return dict(everything()["examples"][name])


def what_if(name: str) -> Any:
    """Return exact figures of an example by its id, or "paradoxes", "traps", "joint"."""
    return everything()["what_if"][name]


def coder_rows(name: str) -> dict[Hashable, list[tuple[Hashable, Any]]]:
    """Return an example given as coder -> values as a table: item -> (coder, value); items from 1."""
    table: dict[Hashable, list[tuple[Hashable, Any]]] = {}
    for coder, values in example(name)["data"].items():
        for item, value in enumerate(values, start=1):
            labels = table.setdefault(item, [])
            if value is not None:
                labels.append((coder, value))
    return table


def counts_table(rows: list[list[int]]) -> dict[Hashable, list[tuple[Hashable, Any]]]:
    """Return items × counts of values as a table; the coders are only numbered."""
    table: dict[Hashable, list[tuple[Hashable, Any]]] = {}
    for item, counts in enumerate(rows):
        values = [value for value, count in enumerate(counts) for _ in range(count)]
        table[item] = [(coder, value) for coder, value in enumerate(values)]
    return table


def two_coder_table(cells: list[list[int]]) -> dict[Hashable, list[tuple[Hashable, Any]]]:
    """Return a contingency table of two coders, A in rows, as a table."""
    table: dict[Hashable, list[tuple[Hashable, Any]]] = {}
    for first, row in enumerate(cells):
        for second, count in enumerate(row):
            for _ in range(count):
                table[len(table)] = [("A", first), ("B", second)]
    return table
