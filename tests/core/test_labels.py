"""Labels as flat arrays of codes."""

import numpy as np
import pytest

from relook.core.labels import CodedLabels
from relook.errors import RelookError


def codes(*values):
    return np.array(values, dtype=np.int64)


def test_labels_are_sorted_by_item_and_keep_their_order_within():
    """Labels come sorted by item, those of one item in the order given."""
    labels = CodedLabels.from_codes(codes(1, 0, 1, 0), codes(3, 2, 1, 0), codes(0, 1, 2, 3))
    assert labels.item_index.tolist() == [0, 0, 1, 1]
    assert labels.value_index.tolist() == [2, 0, 3, 1]
    assert labels.coder_index.tolist() == [1, 3, 0, 2]
    assert (labels.n_items, labels.n_values, labels.n_coders, labels.n_labels) == (2, 4, 4, 4)


def test_items_values_and_coders_without_labels_count():
    """Sizes given by the caller are kept, and items without labels have none."""
    labels = CodedLabels.from_codes(codes(0, 2), codes(0, 1), n_items=5, n_values=9)
    assert labels.labels_per_item.tolist() == [1, 0, 1, 0, 0]
    assert labels.n_values == 9
    assert labels.coder_index is None


def test_no_labels_at_all():
    """An empty table is a table."""
    labels = CodedLabels.from_codes(codes(), codes(), codes())
    assert (labels.n_labels, labels.n_items, labels.n_values) == (0, 0, 0)


@pytest.mark.parametrize(
    ("given", "said"),
    [
        ((codes(0, 1), codes(0)), "shape"),
        ((codes(0), codes(-1)), "negative"),
        ((codes(-1), codes(0)), "negative"),
    ],
)
def test_codes_that_make_no_sense_are_refused(given, said):
    """Unequal lengths and negative codes are errors that name the array."""
    with pytest.raises(RelookError, match=said):
        CodedLabels.from_codes(*given)


def test_codes_above_the_given_size_are_refused():
    """A code that the caller's own size leaves no room for is an error."""
    with pytest.raises(RelookError, match="below 3"):
        CodedLabels.from_codes(codes(0), codes(3), n_values=3)


def test_leaving_a_coder_out():
    """The labels of everyone else stay, and sizes with them; counts know no coders."""
    labels = CodedLabels.from_codes(codes(0, 0, 1), codes(0, 1, 1), codes(0, 1, 0))
    left = labels.without_coder(0)
    assert (left.item_index.tolist(), left.value_index.tolist()) == ([0], [1])
    assert (left.n_items, left.n_values, left.n_coders) == (2, 2, 2)
    with pytest.raises(RelookError, match="no coders"):
        CodedLabels.from_codes(codes(0), codes(0)).without_coder(0)


def test_recoding_values():
    """Every value is replaced, and the number of values is the new one."""
    labels = CodedLabels.from_codes(codes(0, 0, 1), codes(0, 1, 2))
    found = labels.recoded(codes(0, 0, 1), 2)
    assert found.value_index.tolist() == [0, 0, 1]
    assert found.n_values == 2
