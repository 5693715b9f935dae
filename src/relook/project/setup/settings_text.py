"""Settings written as a relook.toml that explains itself, a comment per line."""

from __future__ import annotations

import json
from collections.abc import Iterable

from relook.project.setup.settings import Settings
from relook.project.setup.settings_schema import FORMAT
from relook.tables.numbers import plain_number
from relook.tables.schema import Variable

_Line = tuple[str, object, str]


def settings_toml(settings: Settings) -> str:
    """Return the text of a relook.toml that reads back as these settings.

    Parameters
    ----------
    settings : Settings
        Paths are written as they are held, with forward slashes.
    """
    blocks = [
        _block(
            "",
            [
                ("format", FORMAT, "version of this file's form"),
                (
                    "project",
                    settings.project,
                    "random id, by which its worksheets are known",
                ),
            ],
        ),
        _block("labels", _label_lines(settings)),
    ]
    blocks += [
        _block(f"variables.{_key(variable.name)}", _variable_lines(variable))
        for variable in settings.variables
    ]
    if settings.items is not None:
        blocks.append(_block("items", _item_lines(settings)))
    blocks.append(_block("queue", _queue_lines(settings)))
    blocks.append(_block("worksheet", _worksheet_lines(settings)))
    if settings.bar is not None:
        blocks.append(
            _block("bar", [("alpha", settings.bar, "what `score --require` asks of alpha")])
        )
    return "\n".join(blocks)


def _label_lines(settings: Settings) -> list[_Line]:
    source = settings.labels
    lines: list[_Line] = [
        ("files", [path.as_posix() for path in source.files], "label tables; * matches any text"),
        ("layout", source.layout, "long: a row per label; by-coder: a column per coder; counts"),
        ("item", source.item, "column of the item ids"),
    ]
    if source.coder_from == "file":
        lines.append(("coder_from", "file", "one file per coder, the coder named by it"))
    elif source.coder is not None:
        lines.append(("coder", source.coder, "column of the coders"))
    if source.coders:
        lines.append(("coders", list(source.coders), "columns that hold the labels"))
    if source.columns is not None:
        lines.append(("columns", source.columns, "how a column names its variable and coder"))
    lines += [
        ("missing", list(source.missing), "cell texts that mean: no label"),
        ("duplicates", source.duplicates, "same coder twice on an item: error, first or last"),
        ("leave_out", list(source.leave_out), "coders left out, said beside every figure"),
    ]
    optional = (
        ("remark", source.remark, "column of a coder's remark on a label"),
        ("sheet", source.sheet, "sheet of the workbook"),
        ("delimiter", source.delimiter, "between the cells of a row"),
        ("encoding", source.encoding, "of the text files"),
    )
    return lines + [line for line in optional if line[1] is not None]


def _variable_lines(variable: Variable) -> list[_Line]:
    lines: list[_Line] = []
    if variable.column is not None:
        lines.append(("column", variable.column, "column of its labels"))
    lines.append(("difference", variable.difference, "how far two labels are apart"))
    for name, value in variable.options.items():
        lines.append((name, value, f"what {variable.difference} differences need"))
    if variable.labels is not None:
        lines.append(("labels", list(variable.labels), "the labels, in order"))
    if variable.code_book is not None:
        lines.append(("code_book", variable.code_book.as_posix(), "table: label, meaning, example"))
    lines.append(("weight", variable.weight, "its weight beside the other variables"))
    if variable.tolerance:
        lines.append(("tolerance", variable.tolerance, "numbers this close are no dispute"))
    if variable.decimal != ".":
        lines.append(("decimal", variable.decimal, "mark before the decimals of a number"))
    return lines


def _item_lines(settings: Settings) -> list[_Line]:
    source = settings.items
    assert source is not None
    lines: list[_Line] = [
        ("files", [path.as_posix() for path in source.files], "item tables"),
        ("key", source.key, "column of the item ids"),
        ("show", list(source.show), "columns that adjudicators see"),
        ("group_by", list(source.group_by), "columns for the breakdown by group"),
    ]
    if source.priority is not None:
        lines.append(("priority", source.priority, "factor on the ranking score: blank 1, 0 never"))
    if source.resample_by is not None:
        lines.append(("resample_by", source.resample_by, "clusters, for the interval"))
    return lines


def _queue_lines(settings: Settings) -> list[_Line]:
    queue = settings.queue
    lines: list[_Line] = [("rank_by", queue.rank_by, "contribution, doubt or intensity")]
    limits = (
        ("top", queue.top, "at most so many disputed items"),
        ("share", queue.share, "the shortest head that carries this share of disagreement"),
        ("hours", queue.hours, "adjudicator time in all, audits and overlap included"),
    )
    lines += [line for line in limits if line[1] is not None]
    lines += [
        ("seconds_per_item", queue.seconds_per_item, "time that one item takes"),
        ("audit", queue.audit, "items drawn at random from those not queued"),
    ]
    if queue.include_single:
        lines.append(("include_single", True, "queue items with a single label too"))
    return lines


def _worksheet_lines(settings: Settings) -> list[_Line]:
    held = settings.worksheet
    people: object = list(held.adjudicators)
    if any(held.adjudicators.values()):
        people = {name: coder or "" for name, coder in held.adjudicators.items()}
    lines: list[_Line] = [
        ("adjudicators", people, 'who decides; {Name = "coder id"} for one who also labelled'),
        ("overlap", held.overlap, "share of the items that two adjudicators decide"),
        ("reveal", held.reveal, "nothing, labels, tallies or names"),
        ("reasons", list(held.reasons), "what an adjudicator can give as the reason"),
        ("rows_per_sheet", held.rows_per_sheet, "longer worksheets are split"),
    ]
    if held.title is not None:
        lines.append(("title", held.title, "what worksheets call the project"))
    return lines


def _block(title: str, lines: Iterable[_Line]) -> str:
    text = [f"[{title}]"] if title else []
    written = [(f"{name} = {_value(value)}", comment) for name, value, comment in lines]
    width = min(40, max(len(line) for line, _ in written))
    text += [f"{line:<{width}}  # {comment}" for line, comment in written]
    return "\n".join(text) + "\n"


def _key(name: str) -> str:
    """A bare key where TOML allows it, else a quoted one."""
    bare = name.isascii() and name.replace("-", "").replace("_", "").isalnum()
    return name if bare else _text(name)


def _value(value: object) -> str:
    match value:
        case bool():
            return "true" if value else "false"
        case str():
            return _text(value)
        case list() | tuple():
            return "[" + ", ".join(_value(entry) for entry in value) + "]"
        case dict():
            return "{" + ", ".join(f"{_key(k)} = {_value(v)}" for k, v in value.items()) + "}"
        case int() | float():
            return repr(value)
        case _:
            return plain_number(value)  # type: ignore[arg-type]  # a Fraction


def _text(text: str) -> str:
    """A TOML basic string; JSON's escapes are TOML's too, but for DEL."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")
