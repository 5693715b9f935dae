"""What a file is, told from its bytes: names lie."""

from __future__ import annotations

import re

from relook.cells.model import BookKind
from relook.cells.package import SAVE_AGAIN, Package
from relook.errors import Place, RelookError

_ZIP = b"PK\x03\x04"
_EMPTY_ZIP = b"PK\x05\x06"
_OLD_OFFICE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
_ENCRYPTED = "EncryptedPackage".encode("utf-16-le")
_ODS = "application/vnd.oasis.opendocument.spreadsheet"
_STRICT = b"purl.oclc.org/ooxml"
_HTML = re.compile(rb"\s*(<!doctype\s+html|<html|<table|<head|<body|<meta)", re.IGNORECASE)

#: Beginnings of files that are no spreadsheets, and what to call them.
_OTHERS = (
    (b"%PDF", "a PDF"),
    (b"{\\rtf", "an RTF text"),
    (b"\x89PNG", "a picture"),
    (b"\xff\xd8\xff", "a picture"),
    (b"GIF8", "a picture"),
    (b"\x1f\x8b", "a gzip archive"),
    (b"7z\xbc\xaf", "a 7z archive"),
    (b"Rar!", "a RAR archive"),
    (b"PAR1", "a Parquet table"),
    (b"<?xml", "an XML file"),
)


def sniff(data: bytes, file: str) -> tuple[BookKind, Package | None]:
    """Tell what a file is.

    Parameters
    ----------
    data : bytes
    file : str
        As it is to be named in messages.

    Returns
    -------
    tuple of (str, Package or None)
        "xlsx", "ods" or "csv", and the package of the first two.

    Raises
    ------
    RelookError
        It is none of these; the message says what it is, as far as that can be told.
    """
    if not data:
        raise _refusal(file, "the file is empty (0 bytes)", "ask for the file again")
    if data.startswith((_ZIP, _EMPTY_ZIP)):
        return _sniff_zip(data, file)
    if data.startswith(_OLD_OFFICE):
        if _ENCRYPTED in data:
            raise _refusal(
                file,
                "the file is protected by a password",
                "save it without a password (in the spreadsheet program: save as, no password)",
            )
        raise _refusal(file, "the file is in the old .xls format, which is not read", SAVE_AGAIN)
    if _HTML.match(data[:1024].removeprefix(b"\xef\xbb\xbf")):
        raise _refusal(file, "the file is a web page (HTML), whatever its name says", SAVE_AGAIN)
    for beginning, name in _OTHERS:
        if data.startswith(beginning):
            raise _refusal(file, f"the file is {name}, not a spreadsheet", SAVE_AGAIN)
    return "csv", None


def _sniff_zip(data: bytes, file: str) -> tuple[BookKind, Package]:
    package = Package(data, file)
    names = package.names
    if "mimetype" in names:
        kind = package.read("mimetype")[:200].decode("ascii", "replace").strip()
        if kind in (_ODS, f"{_ODS}-template"):
            if "content.xml" not in names:
                raise _refusal(file, "the .ods file has no content", SAVE_AGAIN)
            manifest = "META-INF/manifest.xml"
            if manifest in names and b"encryption-data" in package.read(manifest):
                raise _refusal(
                    file, "the file is protected by a password", "save it without a password"
                )
            return "ods", package
        raise _refusal(file, f"the file is no spreadsheet but {kind or 'unknown'}", SAVE_AGAIN)
    if "[Content_Types].xml" not in names:
        raise _refusal(
            file,
            "the file is a zip archive, not a spreadsheet",
            "unpack it and use the spreadsheets in it",
        )
    if "xl/workbook.bin" in names:
        raise _refusal(
            file, "the file is in the binary .xlsb format, which is not read", SAVE_AGAIN
        )
    if any(name.startswith(("word/", "ppt/")) for name in names):
        raise _refusal(file, "the file is an office document, but no spreadsheet", SAVE_AGAIN)
    if "xl/workbook.xml" in names and _STRICT in package.read("xl/workbook.xml"):
        raise _refusal(
            file,
            'the file was saved as "Strict Open XML", which is not read',
            'save it as "Excel workbook (.xlsx)", without "Strict", and use that file',
        )
    return "xlsx", package


def _refusal(file: str, message: str, mend: str) -> RelookError:
    return RelookError(message, where=Place(file), mend=mend)
