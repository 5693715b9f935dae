"""Finding a column by its header, forgiving in what costs nothing to forgive."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence

from relook.errors import Place, RelookError, listed, nearest


def fold(header: str) -> str:
    """Return a header with case, spaces, ``_``, ``-`` and Unicode forms set aside."""
    plain = unicodedata.normalize("NFKC", header).casefold()
    return re.sub(r"[\s_\-]+", " ", plain).strip()


def letter(column: int) -> str:
    """Return the letter of a 0-based column as spreadsheets show it."""
    column += 1
    letters = ""
    while column:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def find_column(header: Sequence[str], name: str, where: Place, role: str = "") -> int:
    """Return the position of a column.

    A header that matches to the letter comes first; else the only one that matches in all but case,
    spaces, underscores and hyphens.

    Parameters
    ----------
    header : sequence of str
    name : str
    where : Place
        File and sheet, for the message.
    role : str
        What the column is for, such as "the items", for the message.

    Raises
    ------
    RelookError
        No such column, or two of that name.
    """
    exact = [at for at, found in enumerate(header) if found == name]
    if not exact:
        exact = [at for at, found in enumerate(header) if fold(found) == fold(name) != ""]
    if len(exact) == 1:
        return exact[0]
    if len(exact) > 1:
        found = " and ".join(f'"{header[at]}" ({letter(at)})' for at in exact)
        raise RelookError(
            f'the header "{name}" fits {len(exact)} columns, {found}',
            where=where,
            mend="rename all but one of them",
        )
    named = [found for found in header if found.strip()]
    close = nearest(name, named)
    purpose = f" for {role}" if role else ""
    raise RelookError(
        f'there is no column "{name}"{purpose}; the columns are {listed(named)}',
        where=where,
        mend=f'did you mean "{close}"?' if close else "name one of these columns",
    )
