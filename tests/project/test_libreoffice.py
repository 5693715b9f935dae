"""LibreOffice as the adjudicator's program: open, sort, type, save, and collect what comes out."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
from pathlib import Path

import pytest

from reference.small_project import NOW, give_back, make_project
from relook.project.archive.record import read_record
from relook.project.returning.collecting import collect

SOFFICE = shutil.which("soffice")
SYSTEM_PYTHON = "/usr/bin/python3"
EDITOR = Path(__file__).parents[1] / "reference" / "libreoffice_editor.py"
TYPED = {
    "remark 01": {"text": "delay"},
    "remark 02": {"text": "cannot be coded"},
    "remark 03": {"text": "7", "number": True},
    "remark 04": {"text": "ja"},
    "remark 05": {"text": "dely"},
}


def _has_uno() -> bool:
    if not Path(SYSTEM_PYTHON).exists():
        return False
    return subprocess.run([SYSTEM_PYTHON, "-c", "import uno"], capture_output=True).returncode == 0


pytestmark = [
    pytest.mark.libreoffice,
    pytest.mark.skipif(
        os.environ.get("CI") != "true" and (SOFFICE is None or not _has_uno()),
        reason="LibreOffice and its Python bridge (soffice, python3-uno) are not installed",
    ),
]


@pytest.fixture(scope="module")
def saved(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The folder in which LibreOffice saved the edited worksheet, three times."""
    folder = tmp_path_factory.mktemp("office")
    _, sent = make_project(folder / "project")
    worksheet = folder / "Ada.xlsx"
    worksheet.write_bytes(sent["Ada"])
    assert SOFFICE is not None, "soffice is not on the path"
    command = [SYSTEM_PYTHON, str(EDITOR), SOFFICE, str(worksheet), str(folder), json.dumps(TYPED)]
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONPATH"}
    subprocess.run(command, check=True, timeout=180, env=environment)
    return folder


@pytest.mark.parametrize("suffix", ["xlsx", "ods", "csv"])
def test_sorted_typed_saved_and_collected(saved: Path, tmp_path: Path, suffix: str) -> None:
    """Whatever format it was saved in, every decision is taken and the slip named by its cell."""
    (file,) = saved.glob(f"a*.{suffix}")
    project, _ = make_project(tmp_path)
    give_back(project, file.name, file.read_bytes())
    result = collect(project, None, now=NOW)
    found = {held.item: held.label or held.ruling for held in read_record(project).decisions}
    assert found == {
        "remark 01": "delay",
        "remark 02": "cannot be coded",
        "remark 03": "7",
        "remark 04": "Ja",
    }
    assert result.unreadable == ()
    assert result.edited == ()
    assert result.blank == 1
    (slip,) = result.rejected
    assert (slip.row, slip.column, slip.found) == (3, "G", "dely")  # sorted from the last item
    assert slip.mend == 'change the cell to "delay"'
