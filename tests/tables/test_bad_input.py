"""Bad tables and what is said of them: what is wrong, where, and the mend, to the letter."""

from __future__ import annotations

import io
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook

from relook.errors import RelookError
from relook.tables.code_book import read_code_book, read_difference_table
from relook.tables.guessing import guess
from relook.tables.items import read_items
from relook.tables.labels import read_labels
from relook.tables.schema import ItemSource, LabelSource, Variable

#: Kind of table, name of the case, its files (text, bytes, or the rows of sheets), what the settings
#: say, the variables, and (message, place, mend) of each problem. ROOT is the project's folder.
Case = tuple[
    str, str, dict[str, Any], dict[str, Any], list[dict[str, Any]], list[tuple[str, str, str]]
]


def written(content: Any) -> bytes:
    """Return a file's bytes; a mapping of sheet titles to rows becomes a workbook."""
    if isinstance(content, bytes):
        return content
    if isinstance(content, str):
        return content.encode()
    book = Workbook()
    book.remove(book.active)
    for title, rows in content.items():
        sheet = book.create_sheet(title)
        for row in rows:
            sheet.append(row)
    buffer = io.BytesIO()
    book.save(buffer)
    return buffer.getvalue()


def read(kind: str, root: Path, source: dict[str, Any], variables: list[dict[str, Any]]) -> None:
    """Read the tables of a case."""
    if kind == "labels":
        said = {"files": ["t.csv"], "item": "item", "coder": "coder", **source}
        said["files"] = tuple(Path(file) for file in said["files"])
        named = [Variable(**{"name": "label", **one}) for one in variables]
        read_labels(LabelSource(**said), named, root)
    elif kind == "items":
        read_items(ItemSource(files=(Path("i.csv"),), key="item", **source), root)
    elif kind == "code book":
        read_code_book(Path("c.csv"), root)
    elif kind == "differences":
        read_difference_table(Path("d.csv"), root)
    else:
        guess(["t.csv"], None, root)


def problems_of(
    kind: str,
    root: Path,
    files: dict[str, Any],
    source: dict[str, Any],
    variables: list[dict[str, Any]],
) -> list[tuple[str, str, str]]:
    """Write the files of a case, read them, and return the problems in their parts."""
    for name, content in files.items():
        path = root / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(written(content))
    with pytest.raises(RelookError) as caught:
        read(kind, root, source, variables)
    error = caught.value
    parts = error.problems or [error]
    return [
        (
            one.message,
            "" if one.where is None else str(one.where),
            (one.mend or "").replace(root.as_posix(), "ROOT"),
        )
        for one in parts
    ]


CASES: list[Case] = [
    (
        "labels",
        "no such file",
        {},
        {"files": ["labels.csv"]},
        [{}],
        [("there is no such file", "labels.csv", "check the path")],
    ),
    (
        "labels",
        "no such file, one of a similar name",
        {"labels.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"files": ["labells.csv"]},
        [{}],
        [("there is no such file", "labells.csv", 'did you mean "labels.csv"?')],
    ),
    (
        "labels",
        "pattern without a match",
        {"labels.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"files": ["tables/*.csv"]},
        [{}],
        [
            (
                "no file matches this pattern",
                "tables/*.csv",
                "check the pattern; it is looked for in ROOT",
            )
        ],
    ),
    (
        "labels",
        "a folder",
        {"labels/a.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"files": ["labels"]},
        [{}],
        [("this is a folder, not a file", "labels", "name the table in it")],
    ),
    (
        "labels",
        "empty file",
        {"t.csv": ""},
        {},
        [{}],
        [("the file is empty", "t.csv", "give a table with a header")],
    ),
    (
        "labels",
        "blank lines only",
        {"t.csv": "\n \n\r\n"},
        {},
        [{}],
        [("the file is empty", "t.csv", "give a table with a header")],
    ),
    (
        "labels",
        "header only",
        {"t.csv": "item,coder,label\n"},
        {},
        [{}],
        [("the table has a header and no rows", "t.csv", "give a table with labels")],
    ),
    (
        "labels",
        "misspelt item column",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"item": "itme"},
        [{}],
        [
            (
                'there is no column "itme" for the items; the columns are "item", "coder", "label"',
                "t.csv",
                'did you mean "item"?',
            )
        ],
    ),
    (
        "labels",
        "unlike any column",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"item": "zebra"},
        [{}],
        [
            (
                'there is no column "zebra" for the items; the columns are "item", "coder", "label"',
                "t.csv",
                "name one of these columns",
            )
        ],
    ),
    (
        "labels",
        "misspelt coder column",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"coder": "codre"},
        [{}],
        [
            (
                'there is no column "codre" for the coders; the columns are "item", "coder", "label"',
                "t.csv",
                'did you mean "coder"?',
            )
        ],
    ),
    (
        "labels",
        "misspelt label column",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {},
        [{"name": "stance", "column": "lable"}],
        [
            (
                'there is no column "lable" for the labels of "stance"; the columns are "item", "coder", "label"',
                "t.csv",
                'did you mean "label"?',
            )
        ],
    ),
    (
        "labels",
        "several missing columns at once",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"item": "id", "coder": "codr"},
        [{"column": "stance"}],
        [
            (
                'there is no column "id" for the items; the columns are "item", "coder", "label"',
                "t.csv",
                "name one of these columns",
            ),
            (
                'there is no column "codr" for the coders; the columns are "item", "coder", "label"',
                "t.csv",
                'did you mean "coder"?',
            ),
            (
                'there is no column "stance" for the labels of "label"; the columns are "item", "coder", "label"',
                "t.csv",
                "name one of these columns",
            ),
        ],
    ),
    (
        "labels",
        "missing remark column",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"remark": "note"},
        [{}],
        [
            (
                'there is no column "note" for the remarks; the columns are "item", "coder", "label"',
                "t.csv",
                "name one of these columns",
            )
        ],
    ),
    (
        "labels",
        "header twice",
        {"t.csv": "item,coder,label,label\na,x,1,2\n"},
        {},
        [{}],
        [
            (
                'the header "label" fits 2 columns, "label" (C) and "label" (D)',
                "t.csv",
                "rename all but one of them",
            )
        ],
    ),
    (
        "labels",
        "headers alike but for case",
        {"t.csv": "item,coder,Label,LABEL\na,x,1,2\n"},
        {},
        [{}],
        [
            (
                'the header "label" fits 2 columns, "Label" (C) and "LABEL" (D)',
                "t.csv",
                "rename all but one of them",
            )
        ],
    ),
    (
        "labels",
        "no coder named",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"coder": None},
        [{}],
        [
            (
                "no column is named for the coders",
                "t.csv",
                'name it: coder = "…"; or coder_from = "file" where each coder has a file',
            )
        ],
    ),
    (
        "labels",
        "row too long",
        {"t.csv": "item,coder,label\na,x,1\na,y,2,3\n"},
        {},
        [{}],
        [
            (
                "4 cells, but the header has 3",
                "t.csv, row 3",
                "bring the row to 3 cells, or quote cells that hold a comma",
            )
        ],
    ),
    (
        "labels",
        "row too short",
        {"t.csv": "item,coder,label\na,x\na,y,2\n"},
        {},
        [{}],
        [
            (
                "2 cells, but the header has 3",
                "t.csv, row 2",
                "bring the row to 3 cells, or quote cells that hold a comma",
            )
        ],
    ),
    (
        "labels",
        "ragged after a quoted line break and a blank line",
        {"t.csv": 'item,coder,label\n"a\nb",x,1\n\na,y\n'},
        {},
        [{}],
        [
            (
                "2 cells, but the header has 3",
                "t.csv, row 4",
                "bring the row to 3 cells, or quote cells that hold a comma",
            )
        ],
    ),
    (
        "labels",
        "ragged under semicolons",
        {"t.csv": "item;coder;label\na;x;1;9\n"},
        {},
        [{}],
        [
            (
                "4 cells, but the header has 3",
                "t.csv, row 2",
                "bring the row to 3 cells, or quote cells that hold a semicolon",
            )
        ],
    ),
    (
        "labels",
        "quote never closed",
        {"t.csv": 'item,coder,label\na,x,1\nb,"y,2\n'},
        {},
        [{}],
        [
            (
                "a quoted cell begins here and never ends",
                "t.csv, row 3",
                'close the quote, or double each " that belongs to the text',
            )
        ],
    ),
    (
        "labels",
        "text after a quote",
        {"t.csv": 'item,coder,label\na,x,"1"st\n'},
        {},
        [{}],
        [
            (
                "text follows the closing quote of a cell",
                "t.csv, row 2",
                'quote the whole cell and double each " that belongs to the text',
            )
        ],
    ),
    (
        "labels",
        "delimiter of two characters",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"delimiter": ";;"},
        [{}],
        [
            (
                '";;" cannot be a delimiter',
                "t.csv",
                'use one character, such as "," ";" "|" or a tab',
            )
        ],
    ),
    (
        "labels",
        "unknown encoding",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"encoding": "utf-9"},
        [{}],
        [
            (
                '"utf-9" is not an encoding',
                "t.csv",
                'use for instance "utf-8", "utf-16", "windows-1252" or "latin-1"',
            )
        ],
    ),
    (
        "labels",
        "encoding that is none of text",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"encoding": "rot13"},
        [{}],
        [
            (
                '"rot13" is not an encoding',
                "t.csv",
                'use for instance "utf-8", "utf-16", "windows-1252" or "latin-1"',
            )
        ],
    ),
    (
        "labels",
        "not the named encoding",
        {"t.csv": b"item,coder,label\na,x,\xe9\n"},
        {"encoding": "ascii"},
        [{}],
        [
            (
                "the bytes are not ascii text",
                "t.csv, row 2",
                "leave the encoding out to have it found, or save the file as UTF-8",
            )
        ],
    ),
    (
        "labels",
        "neither UTF-8 nor Windows-1252",
        {"t.csv": b"item,coder,label\na,x,\x81\n"},
        {},
        [{}],
        [
            (
                "byte 0x81 is neither UTF-8 nor Windows-1252",
                "t.csv, row 2",
                "save the file as UTF-8, or name its encoding",
            )
        ],
    ),
    (
        "labels",
        "partly UTF-8",
        {"t.csv": b"item,coder,label\na,x,\xc3\xa9\na,y,\xe9\n"},
        {},
        [{}],
        [
            (
                "byte 0xe9 is not UTF-8, though other parts of the file are",
                "t.csv, row 3",
                'save the file again as UTF-8, or name its encoding, such as "windows-1252"',
            )
        ],
    ),
    (
        "labels",
        "marked as UTF-8 but is not",
        {"t.csv": b"\xef\xbb\xbfitem,coder,label\na,x,\xe9\n"},
        {},
        [{}],
        [
            (
                "the file says that it is UTF-8, but holds a byte that is not",
                "t.csv, row 2",
                "save it again as UTF-8 from the program that wrote it",
            )
        ],
    ),
    (
        "labels",
        "half a UTF-16 character",
        {
            "t.csv": b"\xff\xfei\x00t\x00e\x00m\x00,\x00c\x00o\x00d\x00e\x00r\x00,\x00l\x00a\x00b\x00e\x00l\x00\n\x00a\x00,\x00x\x00,\x001\x00\n\x00a\x00,\x00y\x00,\x002\x00\n\x00a"
        },
        {},
        [{}],
        [
            (
                "the bytes are not utf-16 text",
                "t.csv",
                "leave the encoding out to have it found, or save the file as UTF-8",
            )
        ],
    ),
    (
        "labels",
        "NUL bytes",
        {"t.csv": b"item,coder,label\na,\x00x,1\n"},
        {},
        [{}],
        [
            (
                "the file holds NUL bytes, so it is not a text table",
                "t.csv, row 2",
                "export it as CSV in UTF-8, or as .xlsx",
            )
        ],
    ),
    (
        "labels",
        "a PDF",
        {"t.csv": b"%PDF-1.4\n"},
        {},
        [{}],
        [
            (
                "the file is a PDF, not a table",
                "t.csv",
                "give a .csv, .tsv, .xlsx, .ods, .jsonl or .parquet file",
            )
        ],
    ),
    (
        "labels",
        "a gzip file",
        {"t.csv": b"\x1f\x8b\x08\x00abc"},
        {},
        [{}],
        [
            (
                "the file is compressed with gzip, not a table",
                "t.csv",
                "give a .csv, .tsv, .xlsx, .ods, .jsonl or .parquet file",
            )
        ],
    ),
    (
        "labels",
        "a web page",
        {"t.csv": "<!DOCTYPE html>\n<table>"},
        {},
        [{}],
        [
            (
                "the file is a web page or XML, not a table",
                "t.csv",
                "export the table as CSV in UTF-8, or as .xlsx",
            )
        ],
    ),
    (
        "labels",
        "JSON that is no lines",
        {"t.json": '[{"item": 1}]'},
        {"files": ["t.json"]},
        [{}],
        [
            (
                "the file is JSON, but not one object per line",
                "t.json",
                "write a JSON object per line and call the file .jsonl, or give a CSV",
            )
        ],
    ),
    (
        "labels",
        "a line that is not JSON",
        {"t.jsonl": '{"item":"a","coder":"x","label":"1"}\n{"item":\n'},
        {"files": ["t.jsonl"]},
        [{}],
        [
            (
                "the line is not JSON",
                "t.jsonl, row 2",
                "write one JSON object per line, nothing else",
            )
        ],
    ),
    (
        "labels",
        "a line that is no object",
        {"t.jsonl": "[1, 2]\n"},
        {"files": ["t.jsonl"]},
        [{}],
        [
            (
                "the line is not a JSON object",
                "t.jsonl, row 1",
                'write {"item": …, "coder": …} per line',
            )
        ],
    ),
    (
        "labels",
        "a key twice",
        {"t.jsonl": '{"item":"a","item":"b","coder":"x","label":"1"}\n'},
        {"files": ["t.jsonl"]},
        [{}],
        [('the key "item" occurs twice', "t.jsonl, row 1", "keep one of them")],
    ),
    (
        "labels",
        "half of a character",
        {"t.jsonl": '{"item":"a","coder":"x","label":"1"}\n{"item":"b\\ud800","label":"1"}\n'},
        {"files": ["t.jsonl"]},
        [{}],
        [
            (
                (
                    "the line holds half of a character, which is no text (an escape from \\ud800 to "
                    "\\udfff without its other half)"
                ),
                "t.jsonl, row 2",
                "write the whole character, or take the escape out",
            )
        ],
    ),
    (
        "labels",
        "a nested value",
        {"t.jsonl": '{"item":"a","coder":"x","label":["1","2"]}\n'},
        {"files": ["t.jsonl"]},
        [{}],
        [
            (
                "the value is a list or an object, not a single value",
                't.jsonl, row 1, column "label"',
                "write it as text, several labels joined by a separator",
            )
        ],
    ),
    (
        "labels",
        "damaged Parquet",
        {"t.parquet": b"PAR1 and no more"},
        {"files": ["t.parquet"]},
        [{}],
        [("the Parquet file is damaged", "t.parquet", "write it again, or give the table as CSV")],
    ),
    (
        "labels",
        "a sheet of a file without sheets",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {"sheet": "Labels"},
        [{}],
        [
            (
                'a sheet "Labels" is asked for, but the file is no workbook',
                "t.csv",
                "leave the sheet out",
            )
        ],
    ),
    (
        "labels",
        "undeclared label",
        {"t.csv": "item,coder,label\na,x,agre\na,y,agree\n"},
        {},
        [{"labels": ("agree", "disagree")}],
        [
            (
                '"agre" is not a declared label',
                't.csv, row 2, column "label"',
                'change the cell to "agree", or add "agre" to the declared labels',
            )
        ],
    ),
    (
        "labels",
        "undeclared label, unlike any",
        {"t.csv": "item,coder,label\na,x,maybe\na,y,agree\n"},
        {},
        [{"labels": ("agree", "disagree")}],
        [
            (
                '"maybe" is not a declared label; they are "agree", "disagree"',
                't.csv, row 2, column "label"',
                "change the cell to one of these, or declare the label",
            )
        ],
    ),
    (
        "labels",
        "undeclared label in many rows",
        {
            "t.csv": "item,coder,label\n0,x,Agree\n1,x,Agree\n2,x,Agree\n3,x,Agree\n4,x,Agree\n5,x,Agree\n6,x,Agree\n7,x,Agree\n8,x,Agree\n"
        },
        {},
        [{"labels": ("agree", "disagree")}],
        [
            (
                '"Agree" is not a declared label (also in rows 3, 4, 5, 6, 7 and 3 more)',
                't.csv, row 2, column "label"',
                'change the cell to "agree", or add "Agree" to the declared labels',
            )
        ],
    ),
    (
        "labels",
        "undeclared labels in two files",
        {"t1.csv": "item,coder,label\na,x,agre\n", "t2.csv": "item,coder,label\na,y,agre\n"},
        {"files": ["t*.csv"]},
        [{"labels": ("agree",)}],
        [
            (
                '"agre" is not a declared label',
                't1.csv, row 2, column "label"',
                'change the cell to "agree", or add "agre" to the declared labels',
            ),
            (
                '"agre" is not a declared label',
                't2.csv, row 2, column "label"',
                'change the cell to "agree", or add "agre" to the declared labels',
            ),
        ],
    ),
    (
        "labels",
        "label declared twice",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {},
        [{"labels": ("1", "2", "1")}],
        [('the label "1" of the variable "label" is declared twice', "", "declare it once")],
    ),
    (
        "labels",
        "not a number",
        {"t.csv": "item,coder,label\na,x,3\na,y,three\n"},
        {},
        [{"difference": "interval"}],
        [
            (
                '"three" is not a number, as interval differences need',
                't.csv, row 3, column "label"',
                "write a number, or declare the text as a missing marker",
            )
        ],
    ),
    (
        "labels",
        "decimal comma",
        {"t.csv": "item;coder;label\na;x;3,5\na;y;3.5\n"},
        {},
        [{"difference": "interval"}],
        [
            (
                '"3,5" is not a number: it has a decimal comma',
                't.csv, row 2, column "label"',
                'write "3.5", or set decimal = "," for "label"',
            )
        ],
    ),
    (
        "labels",
        "thousands mark",
        {"t.csv": 'item,coder,label\na,x,"1,000.5"\n'},
        {},
        [{"difference": "ratio"}],
        [
            (
                '"1,000.5" is not a number, as ratio differences need',
                't.csv, row 2, column "label"',
                "write a number, or declare the text as a missing marker",
            )
        ],
    ),
    (
        "labels",
        "infinite",
        {"t.csv": "item,coder,label\na,x,inf\na,y,nan\n"},
        {},
        [{"difference": "interval"}],
        [
            (
                '"inf" is not a number, as interval differences need',
                't.csv, row 2, column "label"',
                "write a number, or declare the text as a missing marker",
            ),
            (
                '"nan" is not a number, as interval differences need',
                't.csv, row 3, column "label"',
                "write a number, or declare the text as a missing marker",
            ),
        ],
    ),
    (
        "labels",
        "below 0 for ratio",
        {"t.csv": "item,coder,label\na,x,-1\na,y,2\n"},
        {},
        [{"difference": "ratio"}],
        [
            (
                '"-1" is negative, and a ratio needs 0 or more',
                't.csv, row 2, column "label"',
                "correct the cell, or change the settings of ratio differences",
            )
        ],
    ),
    (
        "labels",
        "outside the ends",
        {"t.csv": "item,coder,label\na,x,11\na,y,2\n"},
        {},
        [{"difference": "polar", "options": {"ends": [0, 10]}}],
        [
            (
                '"11" lies outside the ends 0 and 10',
                't.csv, row 2, column "label"',
                "correct the cell, or change the settings of polar differences",
            )
        ],
    ),
    (
        "labels",
        "number that was not declared",
        {"t.csv": "item,coder,label\na,x,6\na,y,2.0\n"},
        {},
        [{"difference": "interval", "labels": ("1", "2", "3")}],
        [
            (
                '"6" is not a declared label; they are "1", "2", "3"',
                't.csv, row 2, column "label"',
                "change the cell to one of these, or declare the label",
            )
        ],
    ),
    (
        "labels",
        "declared label that is no number",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {},
        [{"difference": "interval", "labels": ("1", "two")}],
        [
            (
                'the declared label "two" of the variable "label" is not a number, as interval differences need',
                "",
                'declare numbers, or use difference = "ordinal"',
            )
        ],
    ),
    (
        "labels",
        "ordinal words without an order",
        {"t.csv": "item,coder,label\na,x,low\na,y,high\n"},
        {},
        [{"difference": "ordinal"}],
        [
            (
                'the order of "low" is not known: ordinal labels that are words must be declared',
                't.csv, row 2, column "label"',
                (
                    'list the labels of "label" from lowest to highest (here they stand by the '
                    'alphabet): labels = ["high", "low"]'
                ),
            )
        ],
    ),
    (
        "labels",
        "unknown difference function",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {},
        [{"difference": "nominl"}],
        [('"nominl" is not a difference function', "", 'did you mean "nominal"?')],
    ),
    (
        "labels",
        "option missing",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {},
        [{"difference": "circular"}],
        [('circular differences need "period"', "", 'declare "period" for the variable')],
    ),
    (
        "labels",
        "undeclared label within a set",
        {"t.csv": "item,coder,label\na,x,cats;dgos\n"},
        {},
        [{"difference": "jaccard", "options": {"separator": ";"}, "labels": ("cats", "dogs")}],
        [
            (
                '"dgos" is not a declared label',
                't.csv, row 2, column "label"',
                'change the cell to "dogs", or add "dgos" to the declared labels',
            )
        ],
    ),
    (
        "labels",
        "label without an item",
        {"t.csv": "item,coder,label\na,x,1\n,y,2\n"},
        {},
        [{}],
        [
            (
                "the row has a label but no item",
                't.csv, row 3, column "item"',
                "fill in which item it belongs to, or delete the row",
            )
        ],
    ),
    (
        "labels",
        "label without a coder",
        {"t.csv": "item,coder,label\na,x,1\na, ,2\n"},
        {},
        [{}],
        [
            (
                "the row has a label but no coder",
                't.csv, row 3, column "coder"',
                "fill in who gave it, or clear the label",
            )
        ],
    ),
    (
        "labels",
        "a coder's second opinion",
        {"t.csv": "item,coder,label\na,x,1\nb,x,1\na,x,2\n"},
        {},
        [{}],
        [
            (
                'coder "x" gave item "a" two labels of "label": "1" here and "2" in row 4',
                't.csv, row 2, column "label"',
                'delete one of the two rows, or set duplicates = "first" or "last"',
            )
        ],
    ),
    (
        "labels",
        "a second opinion in another file",
        {"t1.csv": "item,coder,label\na,x,1\n", "t2.csv": "item,coder,label\nb,y,1\na,x,2\n"},
        {"files": ["t1.csv", "t2.csv"]},
        [{}],
        [
            (
                'coder "x" gave item "a" two labels of "label": "1" here and "2" in t2.csv, row 3',
                't1.csv, row 2, column "label"',
                'delete one of the two rows, or set duplicates = "first" or "last"',
            )
        ],
    ),
    (
        "labels",
        "two variables with faults",
        {"t.csv": "item,coder,tone,topic\na,x,9,k\n"},
        {},
        [
            {"name": "tone", "difference": "interval", "labels": ("1", "2")},
            {"name": "topic", "labels": ("a",)},
        ],
        [
            (
                '"9" is not a declared label; they are "1", "2"',
                't.csv, row 2, column "tone"',
                "change the cell to one of these, or declare the label",
            ),
            (
                '"k" is not a declared label; they are "a"',
                't.csv, row 2, column "topic"',
                "change the cell to one of these, or declare the label",
            ),
        ],
    ),
    (
        "labels",
        "every label missing",
        {"t.csv": "item,coder,label\na,x,NA\nb,x,\n"},
        {},
        [{}],
        [
            (
                'the variable "label" has no labels: every cell is empty or a missing marker',
                "t.csv",
                "check the column and the missing markers",
            )
        ],
    ),
    (
        "labels",
        "two files of one coder",
        {"one/ada.csv": "item,label\na,1\n", "two/ada.csv": "item,label\na,2\n"},
        {"files": ["*/ada.csv"], "coder": None, "coder_from": "file"},
        [{}],
        [
            (
                'coder "ada" gave item "a" two labels of "label": "1" here and "2" in two/ada.csv, row 2',
                'one/ada.csv, row 2, column "label"',
                'delete one of the two rows, or set duplicates = "first" or "last"',
            ),
            (
                'two files stand for the coder "ada": this one and one/ada.csv',
                "two/ada.csv",
                "rename one of them, or leave it out",
            ),
        ],
    ),
    (
        "labels",
        "by-coder: a column that is not there",
        {"t.csv": "item,ada,ben\na,1,2\n"},
        {"layout": "by-coder", "coders": ("ada", "bne")},
        [{}],
        [
            (
                'there is no column "bne" for a coder; the columns are "item", "ada", "ben"',
                "t.csv",
                'did you mean "ben"?',
            )
        ],
    ),
    (
        "labels",
        "by-coder: nothing but items",
        {"t.csv": "item\na\n"},
        {"layout": "by-coder"},
        [{}],
        [
            (
                "there is no column beside the items'",
                "t.csv",
                'a by-coder table has a column per coder; for a row per label use layout = "long"',
            )
        ],
    ),
    (
        "labels",
        "by-coder: two variables without a pattern",
        {"t.csv": "item,ada,ben\na,1,2\n"},
        {"layout": "by-coder"},
        [{"name": "tone"}, {"name": "topic"}],
        [
            (
                "2 variables need a pattern to tell their columns apart",
                "t.csv",
                'give one: columns = "{variable}_{coder}"',
            )
        ],
    ),
    (
        "labels",
        "by-coder: a pattern that fits no column",
        {"t.csv": "item,tone.ada\na,1\n"},
        {"layout": "by-coder", "columns": "{variable}_{coder}"},
        [{"name": "tone"}],
        [
            (
                'no column fits "{variable}_{coder}" for the variable "tone"; the columns are "item", "tone.ada"',
                "t.csv",
                "change the pattern, or the variable's name",
            )
        ],
    ),
    (
        "labels",
        "by-coder: a pattern without coders",
        {"t.csv": "item,tone_ada\na,1\n"},
        {"layout": "by-coder", "columns": "{variable}_x"},
        [{"name": "tone"}],
        [
            (
                'the pattern "{variable}_x" must hold {variable} and {coder} once each',
                "",
                'write for instance columns = "{variable}_{coder}"',
            )
        ],
    ),
    (
        "labels",
        "by-coder: an item in two rows",
        {"t.csv": "item,ada,ben\na,1,2\na,2,2\n"},
        {"layout": "by-coder"},
        [{}],
        [
            (
                'coder "ada" gave item "a" two labels of "label": "1" here and "2" in row 3',
                't.csv, row 2, column "ada"',
                'delete one of the two rows, or set duplicates = "first" or "last"',
            )
        ],
    ),
    (
        "labels",
        "counts: not a count",
        {"t.csv": "item,yes,no\na,2,-1\nb,1.5,x\n"},
        {"layout": "counts"},
        [{}],
        [
            (
                '"-1" is not a number of coders',
                't.csv, row 2, column "no"',
                "write a whole number of 0 or more, or leave the cell empty",
            ),
            (
                '"1.5" is not a number of coders',
                't.csv, row 3, column "yes"',
                "write a whole number of 0 or more, or leave the cell empty",
            ),
            (
                '"x" is not a number of coders',
                't.csv, row 3, column "no"',
                "write a whole number of 0 or more, or leave the cell empty",
            ),
        ],
    ),
    (
        "labels",
        "counts: a label without a column",
        {"t.csv": "item,yes,no\na,2,1\n"},
        {"layout": "counts"},
        [{"labels": ("yes", "no", "unsure")}],
        [
            (
                'there is no column "unsure" for a label; the columns are "item", "yes", "no"',
                "t.csv",
                "name one of these columns",
            )
        ],
    ),
    (
        "labels",
        "no variable",
        {"t.csv": "item,coder,label\na,x,1\na,y,2\n"},
        {},
        [],
        [("no variable is named", "", "name the column that holds the labels")],
    ),
    (
        "labels",
        "no such sheet",
        {"t.xlsx": {"Labels": [["item", "coder", "label"], ["a", "x", "1"]]}},
        {"files": ["t.xlsx"], "sheet": "Lables"},
        [{}],
        [
            (
                'there is no sheet "Lables"; the sheets are "Labels"',
                "t.xlsx",
                'did you mean "Labels"?',
            )
        ],
    ),
    (
        "labels",
        "several sheets fit",
        {
            "t.xlsx": {
                "May": [["item", "coder", "label"], ["a", "x", "1"]],
                "June": [["item", "coder", "label"], ["a", "x", "1"]],
            }
        },
        {"files": ["t.xlsx"]},
        [{}],
        [
            (
                'several sheets could be meant: "May", "June"',
                "t.xlsx",
                'name the sheet: sheet = "…" in relook.toml, or --sheet',
            )
        ],
    ),
    (
        "labels",
        "no sheet fits",
        {"t.xlsx": {"May": [["item", "who", "label"], ["a", "x", "1"]], "June": [["n"], ["1"]]}},
        {"files": ["t.xlsx"]},
        [{}],
        [
            (
                'no sheet has the column "coder"; the headers are "item", "who", "label", "n"',
                "t.xlsx",
                "name columns that are there",
            )
        ],
    ),
    (
        "labels",
        "the only sheet lacks a column",
        {"t.xlsx": {"May": [["item", "codr", "label"], ["a", "x", "1"]]}},
        {"files": ["t.xlsx"]},
        [{}],
        [
            (
                'the sheet lacks the column "coder"; the headers are "item", "codr", "label"',
                't.xlsx, sheet "May"',
                'did you mean "codr"?',
            )
        ],
    ),
    (
        "labels",
        "an empty workbook",
        {"t.xlsx": {"May": []}},
        {"files": ["t.xlsx"]},
        [{}],
        [("the workbook is empty", "t.xlsx", "give a table with a header")],
    ),
    (
        "labels",
        "an error value for a label",
        {"t.xlsx": {"May": [["item", "coder", "label"], ["a", "x", "#N/A"], ["a", "y", "1"]]}},
        {"files": ["t.xlsx"]},
        [{}],
        [
            (
                "the cell holds the error value #N/A",
                't.xlsx, sheet "May", row 2, column "label"',
                "put the value itself into the cell, or clear it",
            )
        ],
    ),
    (
        "labels",
        "a formula that was never worked out",
        {"t.xlsx": {"May": [["item", "coder", "label"], ["a", "x", "=1+1"], ["a", "y", "1"]]}},
        {"files": ["t.xlsx"]},
        [{}],
        [
            (
                "the cell is a formula without a stored value",
                't.xlsx, sheet "May", row 2, column "label"',
                "put the value itself into the cell, or clear it",
            )
        ],
    ),
    (
        "labels",
        "a cell beyond the header",
        {"t.xlsx": {"May": [["item", "coder", "label"], ["a", "x", "1", None, "oops"]]}},
        {"files": ["t.xlsx"]},
        [{}],
        [
            (
                "the row has a cell beyond the last header",
                't.xlsx, sheet "May", row 2, column "D"',
                "give that column a header, or clear the cell",
            )
        ],
    ),
    (
        "labels",
        "no workbook in spite of its name",
        {"t.xlsx": "item,coder,label\na,x,1\n"},
        {"files": ["t.xlsx"], "sheet": "May"},
        [{}],
        [
            (
                'a sheet "May" is asked for, but the file is no workbook',
                "t.xlsx",
                "leave the sheet out",
            )
        ],
    ),
    (
        "items",
        "a shown column that is not there",
        {"i.csv": "item,text\na,b\n"},
        {"show": ("txt",)},
        [],
        [
            (
                'there is no column "txt"; the columns are "item", "text"',
                "i.csv",
                'did you mean "text"?',
            )
        ],
    ),
    (
        "items",
        "an item without an id",
        {"i.csv": "item,text\na,b\n,c\n"},
        {"show": ("text",)},
        [],
        [
            (
                "the row has no item id",
                'i.csv, row 3, column "item"',
                "fill in the id, or delete the row",
            )
        ],
    ),
    (
        "items",
        "an item listed twice, differently",
        {"i.csv": "item,text\na,b\na,c\n"},
        {"show": ("text",)},
        [],
        [
            (
                'item "a" is listed already in row 2, with other texts',
                "i.csv, row 3",
                "keep one of the two rows",
            )
        ],
    ),
    (
        "items",
        "a priority that is no number",
        {"i.csv": "item,p\na,high\nb,-1\nc,\nd,0\n"},
        {"priority": "p"},
        [],
        [
            (
                '"high" is not a priority',
                'i.csv, row 2, column "p"',
                "write a number of 0 or more, or leave the cell empty for 1",
            ),
            (
                '"-1" is not a priority',
                'i.csv, row 3, column "p"',
                "write a number of 0 or more, or leave the cell empty for 1",
            ),
        ],
    ),
    (
        "items",
        "only a header",
        {"i.csv": "item,text\n"},
        {"show": ("text",)},
        [],
        [("the table has a header and no rows", "i.csv", "give a table with items")],
    ),
    (
        "code book",
        "no column of labels",
        {"c.csv": "name,meaning\na,b\n"},
        {},
        [],
        [
            (
                'there is no column "label" for the labels of the code book; the columns are "name", "meaning"',
                "c.csv",
                "name one of these columns",
            )
        ],
    ),
    (
        "code book",
        "a label twice and one without text",
        {"c.csv": "label,meaning\na,b\na,c\n,d\n"},
        {},
        [],
        [
            (
                'the label "a" is in row 2 already',
                'c.csv, row 3, column "label"',
                "keep one of the two rows",
            ),
            ("the row has no label", 'c.csv, row 4, column "label"', "fill it in, or delete it"),
        ],
    ),
    (
        "differences",
        "labels that do not match",
        {"d.csv": "x,a,b\na,0,1\nc,1,0\n"},
        {},
        [],
        [
            (
                'the label "c" has a row but no column',
                'd.csv, row 3, column "x"',
                "give it a column too, in the same order",
            ),
            ('the label "b" has a column but no row', "d.csv", "give it a row too"),
        ],
    ),
    (
        "differences",
        "not a number, and an empty cell",
        {"d.csv": "x,a,b\na,0,one\nb,,0\n"},
        {},
        [],
        [
            (
                '"one" is not a number',
                'd.csv, row 2, column "b"',
                "write a difference of 0 or more",
            ),
            ("the cell is empty", 'd.csv, row 3, column "a"', "write a difference of 0 or more"),
        ],
    ),
    (
        "differences",
        "not symmetric",
        {"d.csv": "x,a,b\na,0,1\nb,2,0\n"},
        {},
        [],
        [
            (
                'the difference of "b" and "a" is not the same both ways',
                'd.csv, row 3, column "a"',
                "differences are symmetric, 0 or more, and 0 between a label and itself",
            )
        ],
    ),
    (
        "guess",
        "no column looks like coders",
        {
            "t.csv": "id,text\n1,one long text that is to be read slowly\n2,another long text that is to be read\n"
        },
        {},
        [],
        [
            (
                'no two columns share their labels, and no column names a coder; the columns are "id", "text"',
                "t.csv",
                "say which is which: --layout, --item, --coder, --labels",
            )
        ],
    ),
    (
        "guess",
        "several columns could be the coder",
        {"t.csv": "a,b,c,d\n1,x,p,k\n1,y,q,k\n2,x,p,k\n2,y,q,m\n3,x,q,k\n3,y,p,k\n"},
        {},
        [],
        [
            (
                'it cannot be told which column names the coder: "b", "c"',
                "t.csv",
                "name it with --coder",
            )
        ],
    ),
    (
        "guess",
        "a header and no rows",
        {"t.csv": "item,coder,label\n"},
        {},
        [],
        [("the table has a header and no rows", "t.csv", "give a table with labels")],
    ),
]


@pytest.mark.parametrize(
    ("kind", "files", "source", "variables", "problems"),
    [(kind, *rest) for kind, _, *rest in CASES],
    ids=[f"{kind}: {name}" for kind, name, *_ in CASES],
)
def test_a_bad_table_gets_what_where_and_the_mend(
    tmp_path: Path,
    kind: str,
    files: dict[str, Any],
    source: dict[str, Any],
    variables: list[dict[str, Any]],
    problems: list[tuple[str, str, str]],
) -> None:
    """Every problem is found in one pass and reads exactly as listed."""
    assert problems_of(kind, tmp_path, files, source, variables) == problems


def test_many_bad_inputs_are_listed() -> None:
    """The table of bad inputs stays at sixty cases or more, each under a name of its own."""
    names = {(kind, name) for kind, name, *_ in CASES}
    assert len(names) == len(CASES) >= 60
