"""Texts that differ by something a reader does not see: twins that pass for disagreement."""

from __future__ import annotations

import re
import unicodedata
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

#: Letters of other scripts that look like Latin ones, and marks that look like plain ones.
_LOOK_ALIKES = str.maketrans(
    dict(
        zip(
            "АВЕКМНОРСТХУаеорсухіјѕԁһΑΒΕΖΗΙΚΜΝΟΡΤΥΧοıɡ",
            "ABEKMHOPCTXYaeopcyxijsdhABEZHIKMNOPTYXoig",
            strict=True,
        )
    )
    | dict.fromkeys("‘’‛′ʼ`´", "'")
    | dict.fromkeys("“”„″«»", '"')
    | dict.fromkeys("‐‑‒–—−", "-")
)
_INVISIBLE = re.compile("[\u200b-\u200f\u2060\ufeff\u00ad]")
_SPACES = re.compile(r"\s+")
_PLAIN_SPACES = " \t\n\r\v\f\x1c\x1d\x1e"
_JOINS = re.compile(r"[\s_\-]+")

#: What a twin may differ by, from the least to the most; each step undoes one kind of difference.
_STEPS = (
    ("spaces", lambda text: _SPACES.sub(" ", _INVISIBLE.sub("", text)).strip()),
    ("the Unicode form", lambda text: unicodedata.normalize("NFKC", text)),
    ("upper and lower case", lambda text: text.casefold()),
    ("letters or marks that look alike", lambda text: text.translate(_LOOK_ALIKES)),
    ("hyphens, underscores or a full stop", lambda text: _JOINS.sub(" ", text).strip(" .")),
)


@dataclass(frozen=True, slots=True)
class Twins:
    """Two texts that are one to the eye.

    Attributes
    ----------
    kept : str
        The one used more often.
    other : str
    how : str
        What they differ by, such as "spaces and upper and lower case".
    """

    kept: str
    other: str
    how: str


def skeleton(text: str) -> str:
    """Return what is left of a text without anything that a reader may overlook."""
    # Look-alikes are mapped before and after case is dropped: capitals have look-alikes of their
    # own.
    plain = text.translate(_LOOK_ALIKES)
    for _, step in _STEPS:
        plain = step(plain)
    return plain


def near_twins(counts: Mapping[str, int]) -> list[Twins]:
    """Find texts that differ only by case, spaces, Unicode form, look-alikes or hyphens.

    Parameters
    ----------
    counts : mapping of str to int
        How often each text is used.

    Returns
    -------
    list of Twins
        Each text beside the most used of its family, ordered by it.
    """
    families: dict[str, list[str]] = {}
    for text in _worth_comparing(list(counts)):
        families.setdefault(skeleton(text), []).append(text)
    found = []
    for family in families.values():
        if len(family) > 1:
            kept, *others = sorted(family, key=lambda text: (-counts[text], text))
            found += [Twins(kept, other, how_they_differ(kept, other)) for other in others]
    return sorted(found, key=lambda twins: (twins.kept, twins.other))


def _worth_comparing(texts: list[str]) -> list[str]:
    """Return the texts that share a coarse key with another, so that a million ids cost little.

    The key comes from the same steps as the skeleton, over all texts in one string, without any
    space or join; texts of one skeleton always share it.
    """
    if any("\x1f" in text for text in texts):
        return texts
    whole = _INVISIBLE.sub("", "\x1f".join(texts).translate(_LOOK_ALIKES))
    whole = unicodedata.normalize("NFKC", whole).casefold().translate(_LOOK_ALIKES)
    spaces = _PLAIN_SPACES if whole.isascii() else {one for one in set(whole) if one.isspace()}
    for mark in (*spaces, "-", "_", "."):
        whole = whole if mark == "\x1f" else whole.replace(mark, "")
    keys = whole.split("\x1f")
    often = Counter(keys)
    if len(often) == len(keys):
        return []
    return [text for text, key in zip(texts, keys, strict=True) if often[key] > 1]


def how_they_differ(first: str, second: str) -> str:
    """Say what two twins differ by, the fewest kinds of difference that explain it."""
    for name, step in _STEPS:
        if step(first) == step(second):
            return name
    needed = []
    for left_out in range(len(_STEPS)):
        steps = [step for at, (_, step) in enumerate(_STEPS) if at != left_out]
        if _through(steps, first) != _through(steps, second):
            needed.append(_STEPS[left_out][0])
    return " and ".join(needed) if needed else "characters that look alike"


def _through(steps: Sequence[object], text: str) -> str:
    for step in steps:
        assert callable(step)
        text = step(text)
    return text


def likely_slips(counts: Mapping[str, int], *, often: int = 10) -> list[tuple[str, str]]:
    """Find rare texts one letter away from a common one, such as a slip of the keyboard.

    Parameters
    ----------
    counts : mapping of str to int
        How often each text is used.
    often : int
        A text is common from this many uses on, and rare when a tenth as frequent as the other.

    Returns
    -------
    list of (rare, common)
        Only texts of five letters or more that are no numbers, and no near twins.
    """
    common = [text for text, number in counts.items() if number >= often and _wordy(text)]
    by_piece: dict[str, str] = {}
    for text in sorted(common, key=lambda text: (counts[text], text)):
        for piece in _pieces(skeleton(text)):
            by_piece[piece] = text
    found = []
    for text, number in sorted(counts.items()):
        if not _wordy(text):
            continue
        near = [by_piece[piece] for piece in _pieces(skeleton(text)) if piece in by_piece]
        other = next((one for one in near if skeleton(one) != skeleton(text)), None)
        if other is not None and number * 10 <= counts[other] and _one_apart(text, other):
            found.append((text, other))
    return found


def _wordy(text: str) -> bool:
    return sum(letter.isalpha() for letter in text) >= 5 and not any(c.isdigit() for c in text)


def _pieces(text: str) -> list[str]:
    """The text, and the text without each of its letters: two texts one letter apart share one."""
    return [text, *(text[:at] + text[at + 1 :] for at in range(len(text)))]


def _one_apart(first: str, second: str) -> bool:
    a, b = sorted((skeleton(first), skeleton(second)), key=len)
    at = next((i for i, (x, y) in enumerate(zip(a, b, strict=False)) if x != y), len(a))
    if len(a) == len(b):
        swapped = a[at : at + 2] == b[at : at + 2][::-1] and a[at + 2 :] == b[at + 2 :]
        return a[at + 1 :] == b[at + 1 :] or swapped
    return len(b) - len(a) == 1 and a[at:] == b[at + 1 :]
