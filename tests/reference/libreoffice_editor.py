"""Edit a worksheet in LibreOffice as a person would: sort, type decisions, save in three formats.

Run by a Python that has LibreOffice's `uno`:
libreoffice_editor.py SOFFICE WORKSHEET FOLDER JSON, where JSON maps items to what is typed.
"""

from __future__ import annotations

import json
import subprocess
import sys
import time
from pathlib import Path

import uno
from com.sun.star.beans import PropertyValue
from com.sun.star.table import TableSortField


def _property(name, value):
    found = PropertyValue()
    found.Name = name
    found.Value = value
    return found


def _connect(pipe):
    context = uno.getComponentContext()
    resolver = context.ServiceManager.createInstanceWithContext(
        "com.sun.star.bridge.UnoUrlResolver", context
    )
    for _ in range(240):
        try:
            remote = resolver.resolve(f"uno:pipe,name={pipe};urp;StarOffice.ComponentContext")
        except Exception:
            time.sleep(0.25)
            continue
        return remote.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", remote)
    raise SystemExit("LibreOffice did not start")


def _sort(sheet, last_row, last_column, by):
    field = TableSortField()
    field.Field = by
    field.IsAscending = False
    fields = uno.Any("[]com.sun.star.table.TableSortField", (field,))
    area = sheet.getCellRangeByPosition(0, 0, last_column, last_row)
    area.sort((_property("SortFields", fields), _property("ContainsHeader", True)))


def _edit(document, decisions):
    sheet = document.Sheets.getByName("Queue")
    cursor = sheet.createCursor()
    cursor.gotoEndOfUsedArea(False)
    last_row, last_column = cursor.RangeAddress.EndRow, cursor.RangeAddress.EndColumn
    headers = [sheet.getCellByPosition(at, 0).String for at in range(last_column + 1)]
    item, decision = headers.index("item"), headers.index("decision")
    _sort(sheet, last_row, last_column, item)
    locale = document.CharLocale
    for row in range(1, last_row + 1):
        typed = decisions.get(sheet.getCellByPosition(item, row).String)
        if typed is not None:
            cell = sheet.getCellByPosition(decision, row)
            if typed.get("number"):
                cell.NumberFormat = document.NumberFormats.getStandardFormat(1, locale)
                cell.Value = float(typed["text"])
            else:
                cell.FormulaLocal = typed["text"]  # what typing into the cell does


def main(soffice, worksheet, folder, decisions):
    """Start LibreOffice, edit, save as xlsx, ods and csv, and close it."""
    pipe = f"relook-{time.time_ns()}"
    profile = (folder / "profile").as_uri()
    command = [soffice, f"-env:UserInstallation={profile}", "--headless", "--norestore"]
    office = subprocess.Popen([*command, f"--accept=pipe,name={pipe};urp;"])
    try:
        desktop = _connect(pipe)
        hidden = _property("Hidden", True)
        document = desktop.loadComponentFromURL(worksheet.as_uri(), "_blank", 0, (hidden,))
        _edit(document, decisions)
        csv = _property("FilterOptions", "44,34,76,1,,0,false,true,false,false,false,2")
        for name, kind, more in (
            ("a.xlsx", "Calc MS Excel 2007 XML", ()),
            ("a.ods", "calc8", ()),
            ("a.csv", "Text - txt - csv (StarCalc)", (csv,)),
        ):
            document.storeToURL((folder / name).as_uri(), (_property("FilterName", kind), *more))
        document.close(True)
        try:
            desktop.terminate()
        except Exception:
            return
    finally:
        office.wait(timeout=60)


if __name__ == "__main__":
    main(sys.argv[1], Path(sys.argv[2]), Path(sys.argv[3]), json.loads(sys.argv[4]))
