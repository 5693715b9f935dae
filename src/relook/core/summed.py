"""Agreement of labels that are not at hand: summed up in parts, and added.

What depends on an item's labels alone is known from its profile, and what depends on coders too
from how many labels each coder gave of each profile entry. Both are whole numbers that add up over
parts of the data, wherever those lie. Labels of chosen items may be brought in afterwards.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from fractions import Fraction

import numpy as np

from relook.core.agreement import Agreement, measure_profiles
from relook.core.difference_base import DifferenceFunction, Values
from relook.core.exact import IntArray
from relook.core.labels import CodedLabels
from relook.core.profiles import Profiles

#: Why figures that need every label by its coder and item are not given.
NOT_AT_HAND = "the labels lie on several machines, and it is left to one"


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SummedAgreement(Agreement):
    """Agreement whose `labels` are those of chosen items only.

    Attributes
    ----------
    n_labels_in_all : int
    given : int array of shape (n_coders, n_entries)
        How many labels each coder gave of each profile entry.
    """

    n_labels_in_all: int
    given: IntArray

    @property
    def n_labels(self) -> int:
        """All labels, pairable or not, at hand or not."""
        return self.n_labels_in_all

    @property
    def n_coders(self) -> int:
        """Coders with a label at least."""
        return int(np.count_nonzero(self.given.sum(axis=1)))


def add_up(
    profiles: Profiles,
    profile_of_item: IntArray,
    given: IntArray,
    labels: CodedLabels,
    function: DifferenceFunction,
    values: Values,
    *,
    tolerance: Fraction | int = 0,
) -> SummedAgreement:
    """Measure agreement from profiles and from what each coder gave of them.

    Parameters
    ----------
    profiles : Profiles
        Of all parts together.
    profile_of_item : int array of shape (n_items,)
    given : int array of shape (n_coders, n_entries)
    labels : CodedLabels
        Of the items whose labels are at hand; its numbers of items and coders are those of all.
    function : DifferenceFunction
    values : Values
    tolerance : Fraction or int

    Returns
    -------
    SummedAgreement

    Notes
    -----
    The same formulas as `relook.core.agreement.measure_agreement`, which also sees profiles alone.
    """
    found = measure_profiles(labels, profiles, profile_of_item, function, values, tolerance)
    return SummedAgreement(
        **{each.name: getattr(found, each.name) for each in fields(Agreement)},
        n_labels_in_all=int(given.sum()),
        given=given,
    )
