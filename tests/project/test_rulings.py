"""Rulings made elsewhere, brought in from a table."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import pytest

from reference.small_project import NOW, SEVERITY, TOPIC, make_project
from relook.core.decisions import LEAD
from relook.errors import RelookError
from relook.project.archive.record import read_record
from relook.project.returning.collected import Collected
from relook.project.returning.rebuilding import rebuild
from relook.project.returning.rulings import collect_rulings
from relook.project.setup.folder import Project
from relook.worksheet.model import SheetVariable

ITEMS = ("remark 01", "remark 02", "remark 03")
BOTH = {"topic": TOPIC, "severity": SEVERITY}


@pytest.fixture
def project(tmp_path: Path) -> Project:
    return make_project(tmp_path)[0]


def bring_in(
    project: Project,
    table: str,
    *,
    variables: Mapping[str, SheetVariable] = BOTH,
    strict: bool = False,
    reinstate: bool = False,
    dry_run: bool = False,
) -> Collected:
    path = project.root / "rulings.csv"
    path.write_text(table, encoding="utf-8")
    return collect_rulings(
        project,
        path,
        variables=variables,
        items=ITEMS,
        strict=strict,
        reinstate=reinstate,
        dry_run=dry_run,
        now=NOW,
    )


GOOD = """item,variable,label,by,reason
remark 01,topic,Delay,Cleo,seen the log
remark 01,severity,"2,5",Cleo,
remark 02,topic,cannot be coded,lead,
"""


def test_taken(project: Project) -> None:
    """Labels, numbers and other rulings are taken, people stored by id."""
    result = bring_in(project, GOOD)
    assert (result.accepted, result.rejected) == (3, ())
    found = {(d.item, d.variable): d for d in read_record(project).decisions}
    assert found["remark 01", "topic"].label == "delay"
    assert found["remark 01", "topic"].reason == "seen the log"
    assert found["remark 01", "severity"].label == "2.5"
    assert found["remark 02", "topic"].adjudicator == LEAD
    assert found["remark 01", "topic"].adjudicator.startswith("a-")
    assert {d.kind for d in found.values()} == {"rulings"}


def test_again_changes_nothing(project: Project) -> None:
    """The same table again adds nothing; an older ruling comes back only if asked for."""
    bring_in(project, GOOD)
    assert bring_in(project, GOOD).unchanged == 3
    assert bring_in(project, GOOD.replace("Delay", "staff")).superseded == 1
    result = bring_in(project, GOOD)
    assert (result.accepted, len(result.older)) == (0, 1)
    assert bring_in(project, GOOD, reinstate=True).accepted == 1


@pytest.mark.parametrize(
    ("row", "column", "reason", "mend"),
    [
        ("remark 1,topic,delay,Cleo,", "A", "no item has this id", 'did you mean "remark 01"?'),
        ("remark 01,topc,delay,Cleo,", "B", "no variable has this name", "the variables are"),
        ("remark 01,topic,dely,Cleo,", "C", "no label", 'change the cell to "delay"'),
        ("remark 01,topic,delay,,", "D", "nobody is named", "write who ruled"),
        ("remark 01,topic,,Cleo,", "C", "rules nothing", "write a label"),
        ("remark 01,severity,11,Cleo,", "C", "outside the bounds", "from 0 to 10"),
    ],
)
def test_rejected(project: Project, row: str, column: str, reason: str, mend: str) -> None:
    """Each bad row is listed with its cell, and the others are taken."""
    result = bring_in(
        project, f"item,variable,label,by,reason\n{row}\nremark 03,topic,delay,Cleo,\n"
    )
    (report,) = result.rejected
    assert (report.row, report.column) == (2, column)
    assert reason in report.reason
    assert mend in report.mend
    assert result.accepted == 1


def test_one_person_two_answers(project: Project) -> None:
    """Two different rulings by one person in one table are both listed."""
    result = bring_in(
        project, "item,variable,label,by\nremark 01,topic,delay,Cleo\nremark 01,topic,staff,Cleo\n"
    )
    assert [report.row for report in result.rejected] == [2, 3]
    assert result.accepted == 0


def test_strict_and_dry_run_write_nothing(project: Project) -> None:
    """All or nothing, and a rehearsal, leave the record as it is."""
    assert bring_in(project, GOOD, dry_run=True).accepted == 3
    assert bring_in(project, GOOD + "x,topic,delay,Cleo,\n", strict=True).held_back
    assert read_record(project).files == ()


def test_one_variable_needs_no_column(project: Project) -> None:
    """Where there is one variable only, its column may be left out."""
    result = bring_in(project, "item,label,by\nremark 01,delay,Cleo\n", variables={"topic": TOPIC})
    assert result.accepted == 1


def test_missing_columns(project: Project) -> None:
    """A table without the needed columns is refused by name."""
    with pytest.raises(RelookError, match='the table has no column "by"'):
        bring_in(project, "item,variable,label\nremark 01,topic,delay\n")


def test_rebuilt(project: Project) -> None:
    """Rulings come back in a rebuild, byte for byte."""
    bring_in(project, GOOD)
    before = read_record(project)
    for file in project.decisions_folder.iterdir():
        file.unlink()
    rebuild(project)
    assert read_record(project) == before
