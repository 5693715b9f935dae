"""Bytes to text: which encoding, found from the bytes alone and always said."""

from __future__ import annotations

import codecs
from dataclasses import dataclass

from relook.errors import Place, RelookError

_MARKS = (
    # The mark of UTF-32 begins with that of UTF-16, so it is looked for first.
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_SAID = {"utf-8-sig": "utf-8 with a byte order mark", "cp1252": "windows-1252"}


@dataclass(frozen=True, slots=True)
class Decoded:
    """A text file as UTF-8.

    Attributes
    ----------
    data : bytes
        UTF-8 without a byte order mark.
    said : str
        The encoding it came in, for the user; a guess says that it is one.
    """

    data: bytes
    said: str


def decode(data: bytes, file: str, encoding: str | None = None) -> Decoded:
    """Bring a text file to UTF-8.

    Parameters
    ----------
    data : bytes
    file : str
        As it is to be named in messages.
    encoding : str, optional
        What the user says it is; found from the bytes where left out. Without a mark, bytes that
        are UTF-8 are UTF-8. Others are taken for Windows-1252 only where every byte has a meaning
        in it and nothing in the file reads as UTF-8; that is a guess, and `Decoded.said` says so.

    Raises
    ------
    RelookError
        The bytes are no text in that encoding, or in any that can be found.
    """
    if encoding is not None:
        return _decode_as(data, file, encoding)
    for mark, name in _MARKS:
        if data.startswith(mark):
            if name == "utf-8-sig":
                _check_utf8(data, file)
                return Decoded(data[len(mark) :], _SAID[name])
            return _decode_as(data, file, name)
    if b"\x00" in data:
        return _decode_unmarked_wide(data, file)
    if data.isascii():  # far quicker to see than to decode
        return Decoded(data, "utf-8")
    try:
        data.decode("utf-8")
    except UnicodeDecodeError as fault:
        return _decode_narrow(data, file, fault)
    return Decoded(data, "utf-8")


def _decode_as(data: bytes, file: str, encoding: str) -> Decoded:
    try:
        codec = codecs.lookup(encoding)
        # Unlike the codec itself, this refuses codecs that are none of text.
        text = data.decode(encoding)
    except LookupError:
        raise RelookError(
            f'"{encoding}" is not an encoding',
            where=Place(file),
            mend='use for instance "utf-8", "utf-16", "windows-1252" or "latin-1"',
        ) from None
    except (UnicodeError, ValueError) as fault:
        row = None
        if (
            isinstance(fault, UnicodeDecodeError)
            and "16" not in codec.name
            and "32" not in codec.name
        ):
            row = _row_of(data, fault.start)
        raise RelookError(
            f"the bytes are not {encoding} text",
            where=Place(file, row=row),
            mend="leave the encoding out to have it found, or save the file as UTF-8",
        ) from None
    return Decoded(text.removeprefix("\ufeff").encode(), _SAID.get(codec.name, codec.name))


def _check_utf8(data: bytes, file: str) -> None:
    try:
        data.decode("utf-8")
    except UnicodeDecodeError as fault:
        raise RelookError(
            "the file says that it is UTF-8, but holds a byte that is not",
            where=Place(file, row=_row_of(data, fault.start)),
            mend="save it again as UTF-8 from the program that wrote it",
        ) from None


def _decode_unmarked_wide(data: bytes, file: str) -> Decoded:
    """UTF-16 without a mark has a NUL beside nearly every Latin letter, delimiter and line end."""
    even, odd = data[0::2].count(0), data[1::2].count(0)
    if len(data) % 2 == 0 and max(even, odd) > len(data) // 8 and min(even, odd) == 0:
        name = "utf-16-le" if odd else "utf-16-be"
        return Decoded(_decode_as(data, file, name).data, f"{name}, guessed")
    raise RelookError(
        "the file holds NUL bytes, so it is not a text table",
        where=Place(file, row=_row_of(data, data.index(0))),
        mend="export it as CSV in UTF-8, or as .xlsx",
    )


def _decode_narrow(data: bytes, file: str, fault: UnicodeDecodeError) -> Decoded:
    row = _row_of(data, fault.start)
    lenient = data.decode("utf-8", "surrogateescape")
    if any(ord(c) > 0x7F and not 0xDC80 <= ord(c) <= 0xDCFF for c in set(lenient)):
        raise RelookError(
            f"byte {data[fault.start]:#04x} is not UTF-8, though other parts of the file are",
            where=Place(file, row=row),
            mend='save the file again as UTF-8, or name its encoding, such as "windows-1252"',
        )
    try:
        text = data.decode("cp1252")
    except UnicodeDecodeError as other:
        raise RelookError(
            f"byte {data[other.start]:#04x} is neither UTF-8 nor Windows-1252",
            where=Place(file, row=_row_of(data, other.start)),
            mend="save the file as UTF-8, or name its encoding",
        ) from None
    if any(0x80 <= byte <= 0x9F for byte in set(data)):
        return Decoded(text.encode(), "windows-1252, guessed")
    return Decoded(text.encode(), "windows-1252 or latin-1 (they read alike here), guessed")


def _row_of(data: bytes, position: int) -> int:
    """The row of a byte: line ends outside quotes before it, plus one."""
    before = data[:position]
    outside = b"".join(before.split(b'"')[0::2]) if b'"' in before else before
    return outside.count(b"\n") + (0 if b"\n" in data else outside.count(b"\r")) + 1
