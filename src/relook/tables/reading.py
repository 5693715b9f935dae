"""A file to a table of text, whatever its format.

Everything is text: ``007``, ``NA``, ``1E5`` and dates stay what they were. Rows are those that a
spreadsheet shows, blank rows and cells with line breaks counted.
"""

from __future__ import annotations

import glob
import hashlib
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pandas as pd

from relook.core.exact import IntArray
from relook.errors import Place, Problem, RelookError, nearest
from relook.tables.arrow_columns import arrow_column, coded_column
from relook.tables.delimited import Cells, read_delimited
from relook.tables.encodings import decode
from relook.tables.findings import counted
from relook.tables.formats import CellFault, read_json_lines, read_parquet, read_sheet
from relook.tables.headers import find_column

Texts = npt.NDArray[np.object_]
#: Told what is being done, in words for the user, before what may take long.
Doing = Callable[[str], None]
#: What workbooks begin with: a zip archive, or the container of old and of encrypted ones.
_BOOKS = (b"PK", b"\xd0\xcf\x11\xe0")
_JSON_LINES = {".jsonl", ".ndjson"}
#: What a file begins with when it is surely no table, and what it is then called.
_NO_TABLES = {
    b"%PDF": "a PDF",
    b"\x1f\x8b": "compressed with gzip",
    b"\x89PNG": "an image",
    b"\xff\xd8\xff": "an image",
    b"SQLite format 3\x00": "a database",
    b"7z\xbc\xaf": "a 7z archive",
}


@dataclass(frozen=True, slots=True, eq=False)
class Table:
    """A table as it was read.

    Attributes
    ----------
    file : str
        As it is named in messages.
    sheet : str or None
    header : tuple of str
    frame : DataFrame
        A str column per header, labelled 0, 1, …
    rows : int array of shape (n_rows,)
        The row of the spreadsheet for each row of `frame`.
    digest : str
        SHA-256 of the file's bytes, in hex.
    said : str
        One line on how the file was read.
    faults : tuple of CellFault
        Cells without a text of their own; only those in columns that are used matter.
    delimiter : str or None
        Of delimited text.
    known : dict of int to (codes, texts)
        The columns that were coded already: guessing and reading ask for the same ones.
    """

    file: str
    sheet: str | None
    header: tuple[str, ...]
    frame: pd.DataFrame
    rows: IntArray
    digest: str
    said: str
    faults: tuple[CellFault, ...] = ()
    delimiter: str | None = None
    known: dict[int, tuple[IntArray, Texts]] = field(default_factory=dict)

    @property
    def n_rows(self) -> int:
        """Rows that are not blank, the header left out."""
        return int(self.rows.size)

    @property
    def place(self) -> Place:
        """File and sheet."""
        return Place(self.file, self.sheet)

    def at(self, row: int | None, column: int | None = None) -> Place:
        """Return the place of a spreadsheet row and a 0-based column."""
        name = None if column is None else self.header[column]
        return Place(self.file, self.sheet, row, name)

    def find(self, name: str, role: str = "") -> int:
        """Return the 0-based position of a column; see `find_column`."""
        return find_column(self.header, name, self.place, role)

    def named(self, file: str) -> Table:
        """Return the same table under another name of its file, as seen from another folder."""
        said = f"{file}{self.said.removeprefix(self.file)}"
        return replace(self, file=file, said=said)

    def coded(self, column: int) -> tuple[IntArray, Texts]:
        """Return a column as codes into its distinct texts, in order of first appearance.

        Returns
        -------
        codes : int array of shape (n_rows,)
        texts : object array of shape (n_texts,)
        """
        held = self.known.get(column)
        if held is None:
            arrow = arrow_column(self.frame[column])
            if arrow is not None:
                held = coded_column(arrow)
            else:
                codes, texts = pd.factorize(self.frame[column])
                held = codes.astype(np.int32, copy=False), np.asarray(texts, dtype=object)
            self.known[column] = held
        return held

    def texts(self, column: int) -> Texts:
        """Return the texts of a column, shape (n_rows,)."""
        if column in self.known:
            codes, texts = self.known[column]
            return np.asarray(texts[codes])
        return self.frame[column].to_numpy(dtype=object)

    def without_cells(self) -> Table:
        """Return the table with every column as codes alone, which take a fraction of the room."""
        for column in range(len(self.header)):
            self.coded(column)
        return replace(self, frame=self.frame.iloc[:, :0])


def read_table(
    path: Path,
    root: Path | None = None,
    *,
    sheet: str | None = None,
    delimiter: str | None = None,
    encoding: str | None = None,
    wanted: Sequence[str] = (),
) -> Table:
    """Read a table from a file.

    Parameters
    ----------
    path : Path
        Relative to `root`, or absolute.
    root : Path, optional
        The folder that paths are relative to; files under it are named from there.
    sheet, delimiter, encoding : str, optional
        Found from the file where left out.
    wanted : sequence of str
        Columns that the table must have; they tell which sheet of a workbook is meant.

    Raises
    ------
    RelookError
        No such file, or nothing that can be read as a table.
    """
    name = display_name(path, root)
    data = read_bytes(path if root is None else root / path, name)
    return table_from_bytes(
        data, name, sheet=sheet, delimiter=delimiter, encoding=encoding, wanted=wanted
    )


def table_from_bytes(
    data: bytes,
    file: str,
    *,
    sheet: str | None = None,
    delimiter: str | None = None,
    encoding: str | None = None,
    wanted: Sequence[str] = (),
) -> Table:
    """Read a table from the bytes of a file; see `read_table`."""
    if not data or data.isspace():
        raise RelookError("the file is empty", where=Place(file), mend="give a table with a header")
    # A digest of a large file takes as long as reading it, and leaves the interpreter free.
    with ThreadPoolExecutor(1) as beside:
        digest = beside.submit(lambda: hashlib.sha256(data).hexdigest())
        table = _table_of(data, file, sheet, delimiter, encoding, wanted)
        return replace(table, digest=digest.result())


def _table_of(
    data: bytes,
    file: str,
    sheet: str | None,
    delimiter: str | None,
    encoding: str | None,
    wanted: Sequence[str],
) -> Table:
    """The table without its digest."""
    ending = Path(file).suffix.casefold()
    title: str | None = None
    faults: tuple[CellFault, ...] = ()
    if data.startswith(_BOOKS):
        from relook.cells.opening import open_book

        book = open_book(data, file)
        found = read_sheet(book, sheet, wanted)
        cells, title, faults = found.cells, found.title, found.faults
        how = [book.kind, cells.said, *book.notes]
    elif data.startswith(b"PAR1"):
        cells = read_parquet(data, file)
        how = [cells.said]
    else:
        cells, how = _read_text(data, file, ending, delimiter, encoding)
    if sheet is not None and title is None:
        raise RelookError(
            f'a sheet "{sheet}" is asked for, but the file is no workbook',
            where=Place(file),
            mend="leave the sheet out",
        )
    said = f"{file}: {', '.join(how)}, {counted(len(cells.frame), 'row')}"
    return Table(
        file,
        title,
        cells.header,
        cells.frame,
        cells.rows,
        "",
        said,
        faults,
        cells.delimiter,
    )


def _read_text(
    data: bytes, file: str, ending: str, delimiter: str | None, encoding: str | None
) -> tuple[Cells, list[str]]:
    for begin, what in _NO_TABLES.items():
        if data.startswith(begin):
            raise RelookError(
                f"the file is {what}, not a table",
                where=Place(file),
                mend="give a .csv, .tsv, .xlsx, .ods, .jsonl or .parquet file",
            )
    decoded = decode(data, file, encoding)
    start = decoded.data[:200].lstrip()
    if start[:1] == b"<":
        raise RelookError(
            "the file is a web page or XML, not a table",
            where=Place(file),
            mend="export the table as CSV in UTF-8, or as .xlsx",
        )
    if ending in _JSON_LINES or (ending == ".json" and start[:1] == b"{"):
        cells = read_json_lines(decoded.data, file)
        return cells, [decoded.said, cells.said]
    if ending == ".json":
        raise RelookError(
            "the file is JSON, but not one object per line",
            where=Place(file),
            mend="write a JSON object per line and call the file .jsonl, or give a CSV",
        )
    cells = read_delimited(decoded.data, file, delimiter)
    return cells, [decoded.said, cells.said]


def read_bytes(path: Path, name: str) -> bytes:
    """Read a whole file, naming it `name` in errors.

    Raises
    ------
    RelookError
        There is no such file (a file of a similar name beside it is named), it is a folder, or it
        may not be read.
    """
    try:
        return path.read_bytes()
    except FileNotFoundError:
        beside = path.parent
        known = sorted(p.name for p in beside.iterdir()) if beside.is_dir() else []
        close = nearest(path.name, known)
        raise RelookError(
            "there is no such file",
            where=Place(name),
            mend=f'did you mean "{close}"?' if close else "check the path",
        ) from None
    except IsADirectoryError:
        raise RelookError(
            "this is a folder, not a file", where=Place(name), mend="name the table in it"
        ) from None
    except PermissionError:
        raise RelookError(
            "the file may not be read",
            where=Place(name),
            mend="close it in other programs, or change its permissions",
        ) from None
    except (OSError, ValueError) as fault:
        raise RelookError(f"the file cannot be read ({fault})", where=Place(name)) from None


def silently(text: str) -> None:
    """Tell nobody what is being done."""


def display_name(path: Path, root: Path | None) -> str:
    """Return a path as messages name it: from `root` where it lies under it, else as given."""
    if root is None:
        return path.as_posix()
    full = root / path
    try:
        return full.relative_to(root).as_posix()
    except ValueError:
        pass
    try:
        return full.resolve().relative_to(root.resolve()).as_posix()
    except (ValueError, OSError):
        return path.as_posix()


def find_files(patterns: Sequence[str | Path], root: Path) -> tuple[Path, ...]:
    """Return the files that paths or patterns name, each once.

    Parameters
    ----------
    patterns : sequence of str or Path
        Relative to `root`. A file of exactly that name comes first, so brackets in a name do no
        harm; then ``*``, ``?``, ``[…]`` and ``**`` are wildcards, their matches sorted. Lock files
        of spreadsheet programs and hidden files are passed over.

    Raises
    ------
    RelookError
        A pattern names no file, or the name of a file is no text.
    """
    found: dict[Path, None] = {}
    for pattern in patterns:
        given = str(pattern)
        path = root / given
        if path.is_file() or not glob.has_magic(given):
            found[Path(given)] = None
            continue
        # pathlib's own glob takes no absolute pattern and no root with wildcards in its name.
        matches = sorted(glob.glob(given, root_dir=root, recursive=True))  # noqa: PTH207
        files = [
            match
            for match in matches
            if (root / match).is_file() and not Path(match).name.startswith(("~$", ".", "._"))
        ]
        if not files:
            raise RelookError(
                "no file matches this pattern",
                where=Place(given),
                mend=f"check the pattern; it is looked for in {root.as_posix()}",
            )
        found.update(dict.fromkeys(Path(match) for match in files))
    if not found:
        raise RelookError("no files are named", mend="name a table")
    odd = [path for path in found if not is_text(path.name)]
    if odd:
        raise RelookError.from_problems(
            [
                Problem(
                    "the name of the file holds bytes that are no text in UTF-8",
                    Place(ascii(str(path))),
                    "rename the file",
                )
                for path in odd
            ]
        )
    return tuple(found)


def is_text(name: str) -> bool:
    """Whether a name can be written into a file; one of undecodable bytes cannot."""
    return not any("\ud800" <= letter <= "\udfff" for letter in name)
