"""relook.toml: what a project is, read and checked in one pass."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction
from pathlib import Path
from typing import Any, Literal

from relook.errors import Place, RelookError, listed, nearest
from relook.project.setup.settings_schema import OPTIONS, settings_problems
from relook.tables.schema import ItemSource, LabelSource, Variable
from relook.worksheet.model import Reveal

SETTINGS_FILE = "relook.toml"
RankBy = Literal["contribution", "doubt", "intensity"]
REASONS = (
    "coder slip",
    "instructions unclear",
    "item ambiguous",
    "context missing",
    "no fitting label",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class QueueSettings:
    """The table [queue]: what ranks the items and how many are sent.

    `None` for `top`, `share` and `hours` means that they do not bind; where none does, half of the
    observed disagreement is sent, at most 100 items.
    """

    rank_by: RankBy = "contribution"
    top: int | None = None
    share: float | None = None
    hours: float | None = None
    seconds_per_item: float = 45.0
    audit: int = 20
    include_single: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class WorksheetSettings:
    """The table [worksheet]: who adjudicates and what they see.

    Attributes
    ----------
    adjudicators : mapping of str to (str or None)
        Names, in order; the value is the coder id of an adjudicator who is also a coder.
    """

    adjudicators: Mapping[str, str | None] = field(default_factory=lambda: {"adjudicator": None})
    overlap: float = 0.1
    reveal: Reveal = "labels"
    reasons: tuple[str, ...] = REASONS
    rows_per_sheet: int = 500
    title: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """Everything that relook.toml says.

    Attributes
    ----------
    project : str
        Random id, by which worksheets of another project are recognised.
    bar : float or None
        The alpha that `score --require` asks for, of independently made labels only.
    """

    project: str
    labels: LabelSource
    variables: tuple[Variable, ...]
    items: ItemSource | None = None
    queue: QueueSettings = field(default_factory=QueueSettings)
    worksheet: WorksheetSettings = field(default_factory=WorksheetSettings)
    bar: float | None = None

    def variable(self, name: str) -> Variable:
        """Return a variable by its name.

        Raises
        ------
        RelookError
            No such variable; names the nearest.
        """
        for variable in self.variables:
            if variable.name == name:
                return variable
        names = [variable.name for variable in self.variables]
        close = nearest(name, names)
        raise RelookError(
            f'no variable "{name}"',
            mend=f'did you mean "{close}"?' if close else f"the variables are {listed(names)}",
        )


def load_settings(file: Path) -> Settings:
    """Read a relook.toml, naming every fault in it at once.

    Parameters
    ----------
    file : Path

    Raises
    ------
    RelookError
        No such file, not TOML, or any faults, each with its table and key and how to mend it.
    """
    where = Place(file.name)
    try:
        text = file.read_text(encoding="utf-8")
    except FileNotFoundError:
        raise RelookError(
            f"no {SETTINGS_FILE} in this folder",
            where=Place(str(file.parent)),
            mend="name a project folder or a label table, or run `relook new TABLE`",
        ) from None
    except UnicodeDecodeError:
        raise RelookError("not UTF-8 text", where=where, mend="save the file as UTF-8") from None
    try:
        held = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise RelookError(
            f"not valid TOML: {error}", where=where, mend="mend the line that is named"
        ) from None
    problems = settings_problems(held, file.name)
    if problems:
        raise RelookError.from_problems(problems)
    return _settings(held, file.parent)


def _settings(held: dict[str, Any], root: Path) -> Settings:
    labels = dict(held["labels"])
    source = LabelSource(
        files=tuple(Path(entry) for entry in labels.pop("files")),
        **_lists_as_tuples(labels),
    )
    if source.layout == "long" and source.coder is None and source.coder_from == "column":
        raise RelookError(
            "[labels] coder is missing, which a long table needs",
            where=Place(SETTINGS_FILE),
            mend='name the column of the coders, or write coder_from = "file"',
        )
    variables = tuple(
        _variable(name, dict(table), root) for name, table in held.get("variables", {}).items()
    ) or (Variable(name="label", column="label"),)
    items = None
    if "items" in held:
        table = dict(held["items"])
        items = ItemSource(
            files=tuple(Path(entry) for entry in table.pop("files")),
            **_lists_as_tuples(table),
        )
    worksheet = dict(held.get("worksheet", {}))
    people = worksheet.pop("adjudicators", None)
    if isinstance(people, list):
        people = dict.fromkeys(people)
    elif isinstance(people, dict):
        people = {name: coder or None for name, coder in people.items()}
    if "reasons" in worksheet:
        worksheet["reasons"] = tuple(worksheet["reasons"])
    if people is not None:
        worksheet["adjudicators"] = people
    return Settings(
        project=held.get("project", ""),
        labels=source,
        variables=variables,
        items=items,
        queue=QueueSettings(**held.get("queue", {})),
        worksheet=WorksheetSettings(**worksheet),
        bar=held.get("bar", {}).get("alpha"),
    )


def _variable(name: str, table: dict[str, Any], root: Path) -> Variable:
    options = {key: table.pop(key) for key in OPTIONS if key in table}
    if "ends" in options:
        options["ends"] = tuple(options["ends"])
    return Variable(
        name=name,
        column=table.get("column"),
        difference=table.get("difference", "nominal"),
        labels=tuple(table["labels"]) if "labels" in table else None,
        weight=float(table.get("weight", 1.0)),
        # Through its decimal text, so that 0.1 is a tenth and not the nearest binary float.
        tolerance=Fraction(Decimal(str(table.get("tolerance", 0)))),
        code_book=root / table["code_book"] if "code_book" in table else None,
        decimal=table.get("decimal", "."),
        options=options,
    )


def _lists_as_tuples(table: Mapping[str, Any]) -> dict[str, Any]:
    return {key: tuple(value) if isinstance(value, list) else value for key, value in table.items()}
