"""What can be seen of a column without being told: how full, how varied, numbers or words."""

from __future__ import annotations

import re
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from relook.core.exact import BoolArray, IntArray, tally
from relook.tables.headers import fold
from relook.tables.numbers import parse_number
from relook.tables.reading import Table, Texts

#: Texts that commonly stand for "no label". Words that may well be labels ("none", "?", "unknown")
#: are not among them.
MISSING_MARKS = ("", "NA", "N/A", "n/a", "#N/A", "NaN", "nan", "NULL", "null", "-", "--", ".")

#: Headers by which people name these columns, folded; a header counts if one of its words does.
ITEM_WORDS = frozenset(
    (
        "item",
        "items",
        "id",
        "key",
        "document",
        "doc",
        "case",
        "unit",
        "text",
        "clip",
        "recording",
        "post",
        "article",
        "answer",
        "response",
        "remark",
        "message",
        "sentence",
        "segment",
        "image",
        "file",
        "record",
        "number",
        "no",
        "nr",
        "question",
        "respondent",
    )
)
CODER_WORDS = frozenset(
    (
        "coder",
        "coders",
        "rater",
        "annotator",
        "worker",
        "judge",
        "reviewer",
        "expert",
        "model",
        "labeller",
        "labeler",
        "user",
        "by",
        "who",
        "person",
        "initials",
        "listener",
        "observer",
        "reader",
        "marker",
        "assessor",
    )
)
LABEL_WORDS = frozenset(
    (
        "label",
        "labels",
        "code",
        "category",
        "rating",
        "value",
        "score",
        "topic",
        "class",
        "tag",
        "stance",
        "grade",
        "judgement",
        "judgment",
        "verdict",
        "answer",
        "choice",
        "decision",
        "species",
        "call",
        "heard",
        "sentiment",
        "severity",
    )
)
REMARK_WORDS = frozenset(
    (
        "remark",
        "remarks",
        "comment",
        "comments",
        "note",
        "notes",
        "rationale",
        "why",
    )
)
GROUP_WORDS = frozenset(
    (
        "source",
        "month",
        "year",
        "route",
        "channel",
        "site",
        "group",
        "batch",
        "topic",
        "region",
        "type",
    )
)
_DATE = re.compile(r"\s*(\d{4}-\d{1,2}-\d{1,2}|\d{1,2}[./]\d{1,2}[./]\d{2,4}|\d{1,2}:\d{2})")


@dataclass(frozen=True, eq=False)
class Sketch:
    """One column of one table.

    Attributes
    ----------
    at : int
        0-based position.
    header : str
    codes : int array of shape (n_rows,)
        Into `texts`.
    texts : object array of shape (n_texts,)
    """

    at: int
    header: str
    codes: IntArray
    texts: Texts

    @cached_property
    def counts(self) -> IntArray:
        """How often each text occurs, shape (n_texts,)."""
        return tally(self.codes, len(self.texts))

    @cached_property
    def filled(self) -> BoolArray:
        """Which of `texts` are labels rather than marks of missing ones."""
        # Chained maps run without a step of the interpreter per text; ids can be millions.
        marks = map(frozenset(MISSING_MARKS).__contains__, map(str.strip, self.texts))
        return ~np.fromiter(marks, dtype=bool, count=len(self.texts))

    @cached_property
    def n_filled(self) -> int:
        """Cells that hold something."""
        return int(self.counts[self.filled].sum())

    @cached_property
    def n_distinct(self) -> int:
        """Distinct texts that hold something."""
        return int(self.filled.sum())

    @property
    def words(self) -> frozenset[str]:
        """The words of the header."""
        return frozenset(fold(self.header).replace(".", " ").split())

    @property
    def vocabulary(self) -> frozenset[str]:
        """Distinct texts, folded."""
        return frozenset(fold(text) for text in self.texts[self.filled])

    @property
    def unique(self) -> bool:
        """Whether every cell is filled and no two are alike."""
        return self.n_distinct == len(self.codes) == len(self.texts) > 0

    @property
    def prose(self) -> bool:
        """Whether the cells are texts to read rather than labels: long, and mostly different."""
        texts = self.texts[self.filled]
        if texts.size == 0:
            return False
        length = float(np.mean([len(text) for text in texts[:2_000]]))
        return length > 25 and self.n_distinct > 0.5 * self.n_filled

    @property
    def numeric(self) -> bool:
        """Whether all texts are numbers."""
        return self.n_distinct > 0 and all(
            parse_number(text) is not None for text in self.texts[self.filled]
        )

    @property
    def whole(self) -> bool:
        """Whether all texts are whole numbers."""
        numbers = [parse_number(text) for text in self.texts[self.filled]]
        return bool(numbers) and all(n is not None and n.denominator == 1 for n in numbers)

    @property
    def label_like(self) -> bool:
        """Whether texts recur, or are few, as labels do; identifiers and prose do not."""
        if self.n_filled == 0 or self.prose:
            return False
        return self.n_distinct <= max(6, 0.5 * self.n_filled) or (self.numeric and not self.unique)

    def constant_within(self, groups: IntArray) -> bool:
        """Whether rows of one group always agree here, some group having several rows.

        Parameters
        ----------
        groups : int array of shape (n_rows,)
        """
        head = slice(0, 100_000)
        if groups.size > head.stop and not _agree(groups[head], self.codes[head]):
            return False  # as it mostly is, and then no more need be read
        return _agree(groups, self.codes) and np.unique(groups).size < groups.size


def _agree(groups: IntArray, codes: IntArray) -> bool:
    """Whether rows of one group always have the same code."""
    some_row = np.zeros(int(groups.max(initial=-1)) + 1, dtype=np.int64)
    # Whichever row of a group is written last, the others must agree with it.
    some_row[groups] = codes
    return bool((some_row[groups] == codes).all())


def sketch(table: Table) -> list[Sketch]:
    """Return a sketch of each column that has a header."""
    columns = [at for at, header in enumerate(table.header) if header.strip()]

    def of_column(at: int) -> Sketch:
        return Sketch(at, table.header[at], *table.coded(at))

    # Coding a column leaves the interpreter free, and one of ids takes as long as all others.
    with ThreadPoolExecutor(2) as both:
        return list(both.map(of_column, columns))


def named_like(sketches: list[Sketch], words: frozenset[str]) -> list[Sketch]:
    """Return the columns whose header holds one of the words; a header that is one comes first."""
    fitting = [one for one in sketches if one.words & words]
    return sorted(fitting, key=lambda one: len(one.words - words))


def dated(one: Sketch) -> bool:
    """Whether the column holds dates or times, by its header or its texts."""
    if one.words & {"date", "time", "timestamp", "day", "duration", "seconds", "created"}:
        return True
    texts = one.texts[one.filled][:50]
    return texts.size > 0 and all(_DATE.match(text) is not None for text in texts)
