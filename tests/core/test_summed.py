"""Agreement from sums over parts: the same figures as from all labels at once."""

from __future__ import annotations

import numpy as np
import pytest

from reference.cases import CASES, tables
from relook.core.coder_parts import coder_entries, coder_parts
from relook.core.contributions import item_contributions
from relook.core.label_tables import label_use
from relook.core.labels import CodedLabels
from relook.core.resampling import alpha_interval
from relook.core.summed import add_up
from relook.core.without_coder import alpha_without_coder


@pytest.mark.parametrize("name", CASES)
def test_sums_say_what_labels_say(name):
    """Alpha, contributions, intervals and coders' parts, without a label at hand."""
    compared = 0
    for _, agreement, _ in tables(name, 25):
        labels = agreement.labels
        none = np.zeros(0, dtype=np.int64)
        stub = CodedLabels(
            none,
            none,
            none,
            n_items=labels.n_items,
            n_values=labels.n_values,
            n_coders=labels.n_coders,
        )
        given = coder_entries(agreement)
        found = add_up(
            agreement.profiles,
            agreement.profile_of_item,
            given,
            stub,
            agreement.function,
            agreement.values,
        )
        assert found.alpha == agreement.alpha
        assert (found.n_labels, found.n_coders) == (agreement.n_labels, agreement.n_coders)
        assert item_contributions(found).tolist() == item_contributions(agreement).tolist()
        assert (
            coder_parts(found).contribution.tolist() == coder_parts(agreement).contribution.tolist()
        )
        assert label_use(found).n_labels.tolist() == label_use(agreement).n_labels.tolist()
        np.testing.assert_array_equal(
            alpha_without_coder(found).alpha, alpha_without_coder(agreement).alpha
        )
        intervals = [
            alpha_interval(each, np.random.default_rng(1), resamples=30).interval
            for each in (found, agreement)
        ]
        assert intervals[0] == intervals[1]
        compared += 1
    assert compared > 15
