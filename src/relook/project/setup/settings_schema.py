"""What may stand in relook.toml: every table and key, and what its value must be."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from relook.core.differences import DIFFERENCE_FUNCTIONS
from relook.errors import Place, Problem, listed, nearest

FORMAT = 1

_Check = Callable[[Any], str | None]  # what is wanted, where the value is not that


def _is_text(value: Any) -> str | None:
    return None if isinstance(value, str) and value != "" else "a text in quotes"


def _is_texts(value: Any) -> str | None:
    fine = isinstance(value, list) and all(isinstance(entry, str) for entry in value)
    return None if fine else 'a list of texts, such as ["a", "b"]'


def _is_labels(value: Any) -> str | None:
    if (wanted := _is_texts(value)) is not None:
        return wanted
    return None if len(set(value)) == len(value) and value else "a list of different labels"


def _is_share(value: Any) -> str | None:
    return None if _is_number(value) and 0 <= value <= 1 else "a number from 0 to 1"


def _is_number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _is_amount(value: Any) -> str | None:
    return None if _is_number(value) and value > 0 else "a number above 0"


def _is_amount_or_none(value: Any) -> str | None:
    return None if _is_number(value) and value >= 0 else "a number of 0 or more"


def _is_count(value: Any) -> str | None:
    fine = isinstance(value, int) and not isinstance(value, bool) and value >= 0
    return None if fine else "a whole number of 0 or more"


def _is_flag(value: Any) -> str | None:
    return None if isinstance(value, bool) else "true or false"


def _is_alpha(value: Any) -> str | None:
    return None if _is_number(value) and -1 <= value <= 1 else "a number from -1 to 1"


def _is_people(value: Any) -> str | None:
    wanted = 'a list of names such as ["Ada", "Ben"], or a table such as {Ada = "c03"}'
    if isinstance(value, list):
        fine = all(isinstance(name, str) and name.strip() for name in value)
        return None if fine and value and len(set(value)) == len(value) else wanted
    fine = isinstance(value, dict) and all(isinstance(coder, str) for coder in value.values())
    return None if fine and value else wanted


def _is_ends(value: Any) -> str | None:
    fine = isinstance(value, list) and len(value) == 2 and all(map(_is_number, value))
    return None if fine and value[0] < value[1] else "two numbers, the lower first: [0, 10]"


def _one_of(*words: str) -> _Check:
    return lambda value: None if value in words else "one of " + listed(words)


_ROOT: dict[str, _Check] = {
    "format": lambda value: None if value == FORMAT else f"{FORMAT}",
    "project": _is_text,
}
_LABELS: dict[str, _Check] = {
    "files": _is_texts,
    "layout": _one_of("long", "by-coder", "counts"),
    "item": _is_text,
    "coder": _is_text,
    "coder_from": _one_of("column", "file"),
    "coders": _is_texts,
    "columns": _is_text,
    "missing": _is_texts,
    "duplicates": _one_of("error", "first", "last"),
    "leave_out": _is_texts,
    "remark": _is_text,
    "sheet": _is_text,
    "delimiter": _is_text,
    "encoding": _is_text,
}
OPTIONS: dict[str, _Check] = {
    "period": _is_amount,
    "ends": _is_ends,
    "separator": _is_text,
    "table": _is_text,
}
_VARIABLE: dict[str, _Check] = {
    "column": _is_text,
    "difference": lambda value: _one_of(*DIFFERENCE_FUNCTIONS)(value),
    "labels": _is_labels,
    "code_book": _is_text,
    "weight": _is_amount_or_none,
    "tolerance": _is_amount_or_none,
    "decimal": _one_of(".", ","),
    **OPTIONS,
}
_ITEMS: dict[str, _Check] = {
    "files": _is_texts,
    "key": _is_text,
    "show": _is_texts,
    "group_by": _is_texts,
    "priority": _is_text,
    "resample_by": _is_text,
}
_QUEUE: dict[str, _Check] = {
    "rank_by": _one_of("contribution", "doubt", "intensity"),
    "top": lambda value: None if _is_count(value) is None and value else "1 or more",
    "share": lambda value: (
        None if _is_share(value) is None and value > 0 else "a number above 0 and up to 1"
    ),
    "hours": _is_amount,
    "seconds_per_item": _is_amount,
    "audit": _is_count,
    "include_single": _is_flag,
}
_WORKSHEET: dict[str, _Check] = {
    "adjudicators": _is_people,
    "overlap": _is_share,
    "reveal": _one_of("nothing", "labels", "tallies", "names"),
    "reasons": _is_texts,
    "rows_per_sheet": lambda value: None if _is_count(value) is None and value else "1 or more",
    "title": _is_text,
}
_BAR: dict[str, _Check] = {"alpha": _is_alpha}
_TABLES = {
    "labels": _LABELS,
    "items": _ITEMS,
    "queue": _QUEUE,
    "worksheet": _WORKSHEET,
    "bar": _BAR,
}


def settings_problems(held: Mapping[str, Any], file: str) -> list[Problem]:
    """Return every fault of a parsed relook.toml.

    Parameters
    ----------
    held : mapping
        The parsed TOML.
    file : str
        How to name the file in messages.
    """
    problems: list[Problem] = []

    def look(table: Mapping[str, Any], checks: Mapping[str, _Check], name: str) -> None:
        for key, value in table.items():
            title = f"[{name}] {key}" if name else key
            if key not in checks:
                close = nearest(key, checks)
                problems.append(
                    Problem(
                        f"unknown key {title}",
                        Place(file),
                        f'did you mean "{close}"?'
                        if close
                        else f"the keys here are {listed(checks, most=20)}",
                    )
                )
            elif (wanted := checks[key](value)) is not None:
                problems.append(Problem(f"{title} is {value!r}", Place(file), f"write {wanted}"))

    tables = {key: value for key, value in held.items() if isinstance(value, dict)}
    known = [*_TABLES, "variables"]
    for key, value in held.items():
        if key in tables and key not in known:
            close = nearest(key, known)
            mend = f"did you mean [{close}]?" if close else f"the tables are {listed(known)}"
            problems.append(Problem(f"unknown table [{key}]", Place(file), mend))
        elif key not in tables and key in known:
            problems.append(
                Problem(f"[{key}] must be a table; got {value!r}", Place(file), f"write [{key}]")
            )
    bare = {key: value for key, value in held.items() if key not in tables and key not in known}
    look(bare, _ROOT, "")
    for name, checks in _TABLES.items():
        look(tables.get(name, {}), checks, name)
    for name, table in tables.get("variables", {}).items():
        if isinstance(table, dict):
            look(table, _VARIABLE, f"variables.{name}")
            problems.extend(_missing_for_difference(name, table, file))
        else:
            problems.append(
                Problem(
                    f"[variables.{name}] must be a table; got {table!r}",
                    Place(file),
                    f"write [variables.{name}] and its keys below",
                )
            )
    if "labels" not in tables and "labels" not in held:
        problems.append(
            Problem("[labels] is missing", Place(file), 'write [labels] and files = ["labels.csv"]')
        )
    elif "files" not in tables.get("labels", {}):
        problems.append(
            Problem("[labels] files is missing", Place(file), 'write files = ["labels.csv"]')
        )
    if "items" in tables and "files" not in tables["items"]:
        problems.append(
            Problem("[items] files is missing", Place(file), 'write files = ["items.csv"]')
        )
    return problems


#: What a difference function cannot do without, and which keys serve it at all.
_NEEDED = {
    "circular": ("period",),
    "polar": ("ends",),
    "jaccard": ("separator",),
    "masi": ("separator",),
    "tree": ("separator",),
    "table": ("table",),
}


def _missing_for_difference(name: str, table: Mapping[str, Any], file: str) -> list[Problem]:
    difference = table.get("difference", "nominal")
    if difference not in DIFFERENCE_FUNCTIONS:
        return []  # said already, and what it needs is anybody's guess
    needed = _NEEDED.get(difference, ())
    problems = [
        Problem(
            f"[variables.{name}] {key} is missing, which {difference} differences need",
            Place(file),
            f"write {key} = …",
        )
        for key in needed
        if key not in table
    ]
    problems.extend(
        Problem(
            f"[variables.{name}] {key} has no meaning for {difference} differences",
            Place(file),
            "remove it, or change the difference function",
        )
        for key in OPTIONS
        if key in table and key not in needed
    )
    return problems
