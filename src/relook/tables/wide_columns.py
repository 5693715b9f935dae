"""Which columns of a wide table hold whose labels: by name, or by a pattern of headers."""

from __future__ import annotations

from collections.abc import Sequence

from relook.errors import RelookError, listed
from relook.tables.findings import Findings
from relook.tables.headers import find_column, fold
from relook.tables.reading import Table
from relook.tables.schema import LabelSource, Variable


def coder_columns(
    table: Table, source: LabelSource, variables: Sequence[Variable], findings: Findings
) -> list[tuple[str, str, int]]:
    """Return variable, coder and position of each column that holds labels."""
    item = table.find(source.item)
    if source.columns is not None:
        return _columns_by_pattern(table, source.columns, variables, item, "coder", findings)
    if len(variables) > 1:
        findings.add(
            f"{len(variables)} variables need a pattern to tell their columns apart",
            table.place,
            'give one: columns = "{variable}_{coder}"',
        )
        return []
    variable = variables[0].name
    if source.coders:
        found = []
        for coder in source.coders:
            at = _find(table, coder, "a coder", findings)
            if at is not None:
                found.append((variable, coder, at))
        return found
    others = [at for at, name in enumerate(table.header) if at != item and name.strip()]
    if not others:
        findings.add(
            "there is no column beside the items'",
            table.place,
            'a by-coder table has a column per coder; for a row per label use layout = "long"',
        )
    names = [table.header[at] for at in others]
    for name in dict.fromkeys(name for name in names if names.count(name) > 1):
        _find(table, name, "a coder", findings)
    return [(variable, table.header[at], at) for at in others]


def _find(table: Table, name: str, role: str, findings: Findings) -> int | None:
    return findings.attempt(lambda: find_column(table.header, name, table.place, role))


def _columns_by_pattern(
    table: Table,
    pattern: str,
    variables: Sequence[Variable],
    item: int,
    other: str,
    findings: Findings,
) -> list[tuple[str, str, int]]:
    """Match headers to a pattern such as ``{variable}_{coder}``, longest variable name first."""
    if pattern.count("{variable}") != 1 or pattern.count(f"{{{other}}}") != 1:
        raise RelookError(
            f'the pattern "{pattern}" must hold {{variable}} and {{{other}}} once each',
            mend=f'write for instance columns = "{{variable}}_{{{other}}}"',
        )
    found: list[tuple[str, str, int]] = []
    by_length = sorted((variable.name for variable in variables), key=len, reverse=True)
    for at, header in enumerate(table.header):
        if at == item:
            continue
        for name in by_length:
            before, after = pattern.replace("{variable}", name).split(f"{{{other}}}")
            plain = header.strip()
            middle = plain[len(before) : len(plain) - len(after)]
            if middle and plain == before + middle + after:
                found.append((name, middle, at))
                break
    seen: dict[tuple[str, str], int] = {}
    for name, middle, at in found:
        if (name, middle) in seen:
            findings.add(
                f'the header "{table.header[at]}" stands over two columns',
                table.place,
                "rename one of them",
            )
        seen[name, middle] = at
    for variable in variables:
        if not any(name == variable.name for name, _, _ in found):
            findings.add(
                f'no column fits "{pattern}" for the variable "{variable.name}"; the columns are '
                f"{listed(table.header)}",
                table.place,
                "change the pattern, or the variable's name",
            )
    return found


def count_columns(
    table: Table, source: LabelSource, variables: Sequence[Variable], findings: Findings
) -> list[tuple[str, str, int]]:
    """Return variable, label and position of each column that holds counts."""
    item = table.find(source.item)
    if source.columns is not None:
        return _columns_by_pattern(table, source.columns, variables, item, "label", findings)
    if len(variables) > 1:
        findings.add(
            f"{len(variables)} variables need a pattern to tell their columns apart",
            table.place,
            'give one: columns = "{variable}_{label}"',
        )
        return []
    variable = variables[0]
    if variable.labels is None:
        return [
            (variable.name, name, at)
            for at, name in enumerate(table.header)
            if at != item and name.strip()
        ]
    found = []
    for label in variable.labels:
        at = _find(table, label, "a label", findings)
        if at is not None:
            found.append((variable.name, label, at))
    named = {fold(label) for label in variable.labels} | {fold(source.item)}
    for at, name in enumerate(table.header):
        if name.strip() and fold(name) not in named:
            findings.add(
                "the column is no declared label, so its counts are left out",
                table.at(None, at),
                "declare the label, or ignore this where the column is something else",
                "note",
            )
    return found
