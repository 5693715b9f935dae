"""Names, orders and fingerprints that give nothing away.

Everything an adjudicator can see that was derived from the project is keyed with the project's
secret by HMAC-SHA256 (Krawczyk, Bellare & Canetti 1997, RFC 2104), so that neither a row code nor
the order of rows can be traced back to a rank, a kind of row or a file position by trying inputs.
"""

from __future__ import annotations

import hashlib
import hmac
import re
import unicodedata
from collections.abc import Iterable, Mapping, Sequence

from relook.cells.writing import clean_text, fully_unescaped, storable

#: Crockford's base32: no I, L, O or U, so that a code can be read aloud.
ALPHABET = "0123456789ABCDEFGHJKMNPQRSTVWXYZ"
KEY_LENGTH = 12
GROUP_LENGTH = 4


#: Three groups of four: the form of a row code.
ROW_CODE = re.compile(rf"[{ALPHABET}]{{4}}-[{ALPHABET}]{{4}}-[{ALPHABET}]{{4}}")


def keyed_bytes(secret: bytes, purpose: str, *parts: str) -> bytes:
    """Return 32 keyed bytes for a purpose and its parts.

    Parts are length-prefixed, so that ("ab", "c") and ("a", "bc") differ.
    """
    mac = hmac.new(secret, digestmod=hashlib.sha256)
    for part in (purpose, *parts):
        encoded = part.encode("utf-8", "surrogatepass")
        mac.update(len(encoded).to_bytes(8, "big"))
        mac.update(encoded)
    return mac.digest()


def keyed_number(secret: bytes, purpose: str, *parts: str) -> float:
    """Return a keyed number, uniform on [0, 1)."""
    return (int.from_bytes(keyed_bytes(secret, purpose, *parts)[:8], "big") >> 11) / float(1 << 53)


def _code(digest: bytes, length: int) -> str:
    number = int.from_bytes(digest[:16], "big")
    return "".join(ALPHABET[(number >> (123 - 5 * place)) & 31] for place in range(length))


def _readable(code: str) -> str:
    return "-".join(code[at : at + GROUP_LENGTH] for at in range(0, len(code), GROUP_LENGTH))


def row_key(secret: bytes, worksheet: str, item: str, variable: str) -> str:
    """Return the code of a row, such as "K7QF-2M9X-4TRB".

    Keyed by the worksheet too: the same item has another code in every worksheet, so two
    adjudicators cannot find by comparing codes which rows they share.
    """
    return _readable(_code(keyed_bytes(secret, "row", worksheet, item, variable), KEY_LENGTH))


def row_keys(secret: bytes, worksheet: str, rows: Iterable[tuple[str, str]]) -> tuple[str, ...]:
    """Return the codes of a worksheet's rows, (item, variable) each, no two the same.

    Twelve characters make 2**60 codes, so a collision is as good as impossible; should one occur,
    the later row by code order of its item is keyed again.
    """
    codes: list[str] = []
    taken: set[str] = set()
    for item, variable in rows:
        code = row_key(secret, worksheet, item, variable)
        again = 0
        while code in taken:
            again += 1
            code = row_key(secret, worksheet, f"{item}\0{again}", variable)
        taken.add(code)
        codes.append(code)
    return tuple(codes)


def plain_key(text: str) -> str:
    """Return a row code as typed or copied by a person in its own form.

    Case, spaces and dashes do not matter, and O, I and L are read as the digits they resemble.
    """
    bare = "".join(text.split()).replace("-", "").replace("\N{EN DASH}", "").upper()
    return _readable(bare.translate(str.maketrans("OIL", "011")))


def worksheet_id(secret: bytes, round_number: int, adjudicator: str, part: int = 1) -> str:
    """Return the id of a worksheet, such as "2M9X-K7QF"."""
    return _readable(
        _code(keyed_bytes(secret, "worksheet", str(round_number), adjudicator, str(part)), 8)
    )


def adjudicator_id(secret: bytes, name: str) -> str:
    """Return the id under which an adjudicator is recorded, such as "a-7QF2M9"."""
    folded = unicodedata.normalize("NFC", " ".join(name.split()))
    return "a-" + _code(keyed_bytes(secret, "adjudicator", folded), 6)


def keyed_order(secret: bytes, purpose: str, ids: Sequence[str]) -> tuple[int, ...]:
    """Return a keyed permutation of ids, independent of the order they come in.

    Parameters
    ----------
    secret : bytes
    purpose : str
        Different purposes give unrelated orders.
    ids : sequence of str

    Returns
    -------
    tuple of int
        `ids[result[0]]` comes first.
    """
    digests = [keyed_bytes(secret, purpose, each) for each in ids]
    return tuple(sorted(range(len(ids)), key=lambda at: (digests[at], ids[at], at)))


def canonical_text(text: str) -> str:
    """Return a cell's text without what spreadsheet programs alter on their own.

    Line ends, tabs, runs of spaces, canonically equivalent characters and `_x000D_` escapes may
    all change by merely opening and saving a file; letters do not.
    """
    cleaned, _ = clean_text(fully_unescaped(text))
    return unicodedata.normalize("NFC", " ".join(cleaned.split()))


def evidence_digest(text: str) -> str:
    """Return 12 hex digits that tell whether the text of an evidence cell was edited."""
    plain = canonical_text(text).encode("utf-8", "surrogatepass")
    return hashlib.sha256(plain).hexdigest()[:12]


def evidence_digests(evidence: Mapping[str, str]) -> dict[str, str]:
    """Return the digest of each evidence cell by its header.

    Parameters
    ----------
    evidence : mapping of str to str
        Header to text (see `relook.worksheet.layout.evidence_cells`).
    """
    return {header: evidence_digest(storable(text)) for header, text in evidence.items()}
