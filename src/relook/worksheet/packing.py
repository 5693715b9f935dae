"""A workbook as bytes: the same ones for the same contents.

A saved workbook carries the time of saving, in its properties and in every entry of the zip file.
Both are replaced by the time that the round was recorded at and by a fixed date.
"""

from __future__ import annotations

import datetime as dt
import gc
import io
import re
import zipfile
from collections.abc import Iterator
from contextlib import contextmanager

from openpyxl import Workbook
from openpyxl.writer.excel import ExcelWriter

from relook.errors import RelookError

#: Stands as the author of every workbook: no name of a person or a computer.
CREATOR = "relook"
_CORE = "docProps/core.xml"
_TIME = re.compile(rb"(<dcterms:(created|modified)[^>]*>)[^<]*(</dcterms:\2>)")
_EARLIEST = (1980, 1, 1, 0, 0, 0)  # the first date that a zip entry can carry
_UNIX = 3
_READABLE = 0o644 << 16


def new_workbook(title: str = "") -> Workbook:
    """Return an empty workbook without any sheet, its author neutral."""
    book = Workbook()
    for sheet in book.worksheets:
        book.remove(sheet)
    book.properties.creator = CREATOR
    book.properties.lastModifiedBy = CREATOR
    if title:
        book.properties.title = title
    return book


def utc_seconds(stamp: str) -> str:
    """Return an ISO time as workbooks record it: UTC, whole seconds, "Z".

    A time without a zone is taken for UTC.

    Raises
    ------
    RelookError
        Where `stamp` is no ISO time.
    """
    try:
        time = dt.datetime.fromisoformat(stamp)
    except ValueError:
        raise RelookError(f'"{stamp}" is not an ISO time') from None
    if time.tzinfo is None:
        time = time.replace(tzinfo=dt.UTC)
    return time.astimezone(dt.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


@contextmanager
def collection_paused() -> Iterator[None]:
    """Hold Python's cyclic garbage collector while a workbook is built and saved.

    Hundreds of thousands of cells are made and all of them live to the end, so each pass of the
    collector walks them in vain; that takes up to a third of the time.
    """
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def packed(book: Workbook, stamp: str) -> bytes:
    """Save a workbook to bytes that depend on its contents and the stamp alone.

    Parameters
    ----------
    book : openpyxl Workbook
    stamp : str
        ISO time to be given as the time of creation and of the last change.
    """
    # Stored first, compressed once: the entries are read back to be put in a fixed order.
    saved = io.BytesIO()
    ExcelWriter(book, zipfile.ZipFile(saved, "w", zipfile.ZIP_STORED, allowZip64=True)).save()
    time = utc_seconds(stamp).encode("ascii")
    out = io.BytesIO()
    with zipfile.ZipFile(saved) as source, zipfile.ZipFile(out, "w") as target:
        for name in sorted(source.namelist(), key=_place):
            data = source.read(name)
            if name == _CORE:
                data = _TIME.sub(rb"\g<1>" + time + rb"\g<3>", data)
            entry = zipfile.ZipInfo(name, _EARLIEST)
            entry.create_system = _UNIX
            entry.external_attr = _READABLE
            entry.compress_type = zipfile.ZIP_DEFLATED
            target.writestr(entry, data, compresslevel=6)
    return out.getvalue()


def _place(name: str) -> tuple[int, str]:
    """Contents first: programs that sniff a file look at its first entry."""
    first = ("[Content_Types].xml", "_rels/.rels")
    return (first.index(name), "") if name in first else (len(first), name)
