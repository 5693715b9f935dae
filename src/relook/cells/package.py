"""The zip file around a workbook, and the XML within: checked before anything is unpacked."""

from __future__ import annotations

import io
import lzma
import struct
import zipfile
import zlib
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from xml.parsers import expat

from relook.cells.limits import ALWAYS_UNPACKED, MOST_BYTES, MOST_PACKING, MOST_PARTS
from relook.errors import Place, RelookError

#: Everything that a damaged zip file or damaged XML makes the standard library raise.
_DAMAGE = (
    zipfile.BadZipFile,
    zlib.error,
    lzma.LZMAError,
    struct.error,
    expat.ExpatError,
    EOFError,
    OSError,
    ValueError,
    LookupError,
    ArithmeticError,
)

SAVE_AGAIN = "open it in the spreadsheet program, save it as .xlsx, and use that file"


@contextmanager
def damage_told(file: str) -> Iterator[None]:
    """Turn whatever a damaged file raises into one `RelookError` that names the file."""
    try:
        yield
    except _DAMAGE as fault:
        raise RelookError(
            f"the file is damaged and cannot be read ({type(fault).__name__}: {fault})",
            where=Place(file),
            mend=f"ask for the file again, or {SAVE_AGAIN}",
        ) from fault
    except (RuntimeError, NotImplementedError) as fault:
        # zipfile says so of encrypted entries and of packing methods that it does not know.
        raise RelookError(
            f"the file is packed or encrypted in a way that cannot be read ({fault})",
            where=Place(file),
            mend=f"without a password, {SAVE_AGAIN}",
        ) from fault


class Package:
    """The parts of a zipped workbook.

    Parameters
    ----------
    data : bytes
    file : str
        As it is to be named in messages.

    Raises
    ------
    RelookError
        No zip file, or one that unfolds into far too much.
    """

    def __init__(self, data: bytes, file: str) -> None:
        self.file = file
        with damage_told(file):
            self._zip = zipfile.ZipFile(io.BytesIO(data))
            parts = self._zip.infolist()
        self._check(parts, len(data))
        self.names = frozenset(part.filename for part in parts)

    def _check(self, parts: list[zipfile.ZipInfo], packed: int) -> None:
        total = sum(part.file_size for part in parts)
        worst = max(
            (
                part.file_size / max(part.compress_size, 1)
                for part in parts
                if part.file_size > ALWAYS_UNPACKED
            ),
            default=0.0,
        )
        overall = total / max(packed, 1) if total > ALWAYS_UNPACKED else 0.0
        if len(parts) > MOST_PARTS:
            found = f"it holds {len(parts):,} parts, more than {MOST_PARTS:,}"
        elif total > MOST_BYTES:
            found = f"it unfolds into {total / 2**20:,.0f} MB, more than {MOST_BYTES // 2**20} MB"
        elif max(worst, overall) > MOST_PACKING:
            found = f"it unfolds into {max(worst, overall):,.0f} times its size"
        else:
            return
        raise RelookError(
            f"the file is not opened: {found}, as no honest spreadsheet does",
            where=Place(self.file),
            mend="ask who sent it for the table alone, saved anew as .xlsx or .csv",
        )

    def read(self, name: str) -> bytes:
        """Return one part, unpacked; damage raises `RelookError`."""
        with damage_told(self.file):
            return self._zip.read(name)

    def parse(
        self,
        name: str,
        start: Callable[[str, Mapping[str, str]], None],
        end: Callable[[str], None] | None = None,
        text: Callable[[str], None] | None = None,
    ) -> None:
        """Stream one part through handlers.

        Names come as "namespace local"; attributes without a namespace as they stand.

        Raises
        ------
        RelookError
            The part is missing or damaged, or declares a document type: by that way entities
            unfold or point to other files, and no spreadsheet program writes one.
        """
        parser = expat.ParserCreate(namespace_separator=" ")
        parser.buffer_text = True
        parser.StartElementHandler = start
        if end is not None:
            parser.EndElementHandler = end
        if text is not None:
            parser.CharacterDataHandler = text
        parser.StartDoctypeDeclHandler = self._refuse_document_type
        with damage_told(self.file), self._zip.open(name) as stream:
            parser.ParseFile(stream)

    def _refuse_document_type(self, *_: object) -> None:
        raise RelookError(
            "the file declares XML entities, which no spreadsheet program writes; it is not opened",
            where=Place(self.file),
            mend="ask who sent it for the table alone, saved anew as .xlsx or .csv",
        )
