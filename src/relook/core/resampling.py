"""Intervals for alpha, by resampling items with all their labels.

Labels of one item depend on each other, so items (or the clusters they come in) are what is drawn
with replacement, as Zapf et al. (2016) do for nominal data. D_o, D_e and ordinal differences are
computed anew in each resample, since all of them depend on the items drawn. Bounds are percentiles.
The interval takes items for a random sample, coders for fixed, and missing labels for missing at
random. With few items it covers less often than it says (Hughes 2022).

References
----------
Zapf, A., Castell, S., Morawietz, L. & Karch, A. (2016). Measuring inter-rater reliability for
nominal data: which coefficients and confidence intervals are appropriate? BMC Medical Research
Methodology 16:93. Hughes, J. (2022). Toward improved inference for Krippendorff's Alpha agreement
coefficient. arXiv:2210.13265.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.alpha_of_weights import TOO_MANY_VALUES, AlphaOfWeights
from relook.core.exact import FloatArray, IntArray
from relook.core.sparse import SparseCounts
from relook.errors import RelookError

RESAMPLES = 2_000
CONFIDENCE_LEVEL = 0.95
#: Above this share of undefined resamples no interval is given.
MOST_UNDEFINED = 0.05
#: Below this number of pairable items (or clusters) an interval comes with a warning. Our choice.
FEW_ITEMS = 30
#: Numbers held at once in a block of resamples.
BLOCK = 4_000_000

NO_DISAGREEMENT = "no disagreement seen"
ONE_TO_DRAW = "there is only one item or cluster to draw from"


@dataclass(frozen=True, slots=True)
class Interval:
    """A percentile interval for alpha.

    Attributes
    ----------
    low, high : float
    confidence_level : float
    resamples : int
        How many were drawn.
    undefined_resamples : int
        In how many alpha was undefined; they are left out of the percentiles.
    seed : int or None
        What the generator was seeded with, where the caller said so.
    """

    low: float
    high: float
    confidence_level: float
    resamples: int
    undefined_resamples: int
    seed: int | None = None


@dataclass(frozen=True, slots=True)
class IntervalResult:
    """An interval, or the reason why there is none.

    Attributes
    ----------
    interval : Interval or None
    none_because : str or None
        The reason, where there is no interval.
    warning : str or None
        A caution to print beside the interval.
    """

    interval: Interval | None
    none_because: str | None = None
    warning: str | None = None


@dataclass(frozen=True, slots=True)
class DifferenceResult:
    """The difference of two alphas, with an interval or the reason why there is none.

    Attributes
    ----------
    paired : bool
        Whether the same items were drawn for both.
    first_alpha, second_alpha : float or None
        Over the shared items where paired, over all items of each otherwise.
    difference : float or None
        Second less first.
    n_shared_items : int or None
        Items pairable in both; None where unpaired.
    interval : Interval or None
        Of the difference.
    none_because, warning : str or None
    """

    paired: bool
    first_alpha: float | None
    second_alpha: float | None
    difference: float | None
    n_shared_items: int | None
    interval: Interval | None
    none_because: str | None = None
    warning: str | None = None


def alpha_interval(
    agreement: Agreement,
    rng: np.random.Generator,
    *,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
    cluster_of_item: IntArray | None = None,
    seed: int | None = None,
) -> IntervalResult:
    """Draw pairable items with replacement and take percentiles of alpha.

    Parameters
    ----------
    agreement : Agreement
    rng : numpy.random.Generator
    resamples : int
    confidence_level : float
        Between 0 and 1.
    cluster_of_item : int array of shape (n_items,), optional
        Where items come in clusters (threads, documents, authors), the clusters are drawn, each
        with all its items.
    seed : int, optional
        Kept in the result, so that the interval can be had again.

    Returns
    -------
    IntervalResult
    """
    _check(resamples, confidence_level)
    if agreement.alpha is None:
        return IntervalResult(None, agreement.undefined_because)
    if not agreement.observed_disagreement:
        return IntervalResult(None, NO_DISAGREEMENT)
    profile = agreement.profile_of_item
    items = _pairable_items(agreement)
    draw, n_units = _drawing(profile[items], agreement.profiles.n_profiles, cluster_of_item, items)
    if n_units < 2:
        return IntervalResult(None, ONE_TO_DRAW)
    engine = AlphaOfWeights(agreement)
    if engine.takes_too_long:
        return IntervalResult(None, TOO_MANY_VALUES)
    alphas = np.concatenate(
        [engine.alphas(weights) for weights in draw.blocks(rng, resamples, engine.width)]
    )
    interval, because = _percentiles(alphas, confidence_level, seed)
    warning = None if interval is None else _few(n_units, cluster_of_item is not None)
    return IntervalResult(interval, because, warning)


def paired_interval(
    first: Agreement,
    second: Agreement,
    rng: np.random.Generator,
    *,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
    cluster_of_item: IntArray | None = None,
    seed: int | None = None,
) -> DifferenceResult:
    """Compare two alphas of the same items, drawing the same items for both.

    Parameters
    ----------
    first, second : Agreement
        Item i of the one is item i of the other; items pairable in both are used, and the alphas
        of the result are those of these items. Ordinal differences follow from the shared items
        alone.
    rng, resamples, confidence_level, cluster_of_item, seed
        As for `alpha_interval`.

    Returns
    -------
    DifferenceResult
        `difference` is second less first.

    Raises
    ------
    RelookError
        The two have different numbers of items.
    """
    _check(resamples, confidence_level)
    if first.labels.n_items != second.labels.n_items:
        raise RelookError(
            f"a paired interval needs the same items on both sides; got {first.labels.n_items:,} "
            f"and {second.labels.n_items:,}"
        )
    shared = np.intersect1d(_pairable_items(first), _pairable_items(second))
    n_second = max(1, second.profiles.n_profiles)
    pairs = first.profile_of_item[shared] * n_second + second.profile_of_item[shared]
    joint, joint_of_item, often = np.unique(pairs, return_inverse=True, return_counts=True)
    of_first, of_second = np.divmod(joint, n_second)
    to_first = SparseCounts.one_each(of_first, first.profiles.n_profiles)
    to_second = SparseCounts.one_each(of_second, second.profiles.n_profiles)
    engines = AlphaOfWeights(first), AlphaOfWeights(second)

    def both(weights: FloatArray) -> tuple[FloatArray, FloatArray]:
        return (
            engines[0].alphas(to_first.times(weights)),
            engines[1].alphas(to_second.times(weights)),
        )

    if shared.size == 0:
        return DifferenceResult(True, None, None, None, 0, None, "no item is pairable in both")
    seen = [float(alphas[0]) for alphas in both(often[:, None].astype(np.float64))]
    known = [None if np.isnan(alpha) else alpha for alpha in seen]
    difference = None if None in known else seen[1] - seen[0]

    def result(
        interval: Interval | None, because: str | None, warning: str | None = None
    ) -> DifferenceResult:
        return DifferenceResult(
            True, known[0], known[1], difference, int(shared.size), interval, because, warning
        )

    if difference is None:
        return result(None, "alpha is undefined on the shared items")
    if any(engine.takes_too_long for engine in engines):
        return result(None, TOO_MANY_VALUES)
    draw, n_units = _drawing(joint_of_item, joint.size, cluster_of_item, shared)
    if n_units < 2:
        return result(None, ONE_TO_DRAW)
    width = engines[0].width + engines[1].width + joint.size
    differences = []
    for weights in draw.blocks(rng, resamples, width):
        before, after = both(weights)
        differences.append(after - before)
    interval, because = _percentiles(np.concatenate(differences), confidence_level, seed)
    warning = None if interval is None else _few(n_units, cluster_of_item is not None)
    return result(interval, because, warning)


def unpaired_interval(
    first: Agreement,
    second: Agreement,
    rng: np.random.Generator,
    *,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
    seed: int | None = None,
) -> DifferenceResult:
    """Compare two alphas of different items, drawing the items of each on their own.

    Parameters
    ----------
    first, second : Agreement
    rng, resamples, confidence_level, seed
        As for `alpha_interval`.

    Returns
    -------
    DifferenceResult
        `difference` is second less first.
    """
    _check(resamples, confidence_level)
    known = first.alpha, second.alpha
    if known[0] is None or known[1] is None:
        because = first.undefined_because or second.undefined_because
        return DifferenceResult(False, *known, None, None, None, because)
    difference = known[1] - known[0]
    drawn, units = [], []
    for agreement in (first, second):
        items = _pairable_items(agreement)
        draw, n_units = _drawing(
            agreement.profile_of_item[items], agreement.profiles.n_profiles, None, items
        )
        engine = AlphaOfWeights(agreement)
        if engine.takes_too_long:
            return DifferenceResult(False, *known, difference, None, None, TOO_MANY_VALUES)
        blocks = draw.blocks(rng, resamples, engine.width)
        drawn.append(np.concatenate([engine.alphas(weights) for weights in blocks]))
        units.append(n_units)
    if min(units) < 2:
        return DifferenceResult(False, *known, difference, None, None, ONE_TO_DRAW)
    interval, because = _percentiles(drawn[1] - drawn[0], confidence_level, seed)
    warning = None if interval is None else _few(min(units), False)
    return DifferenceResult(False, *known, difference, None, interval, because, warning)


@dataclass(frozen=True, slots=True, eq=False)
class _ItemDraw:
    """Draws of items, as how often each profile is drawn."""

    profile: IntArray  # of each item, sorted
    n_profiles: int

    def blocks(self, rng: np.random.Generator, resamples: int, width: int) -> Iterator[FloatArray]:
        """Yield weights of shape (n_profiles, n_block)."""
        n = self.profile.size
        often = np.bincount(self.profile, minlength=self.n_profiles)
        # A multinomial draw costs about as much as drawing fifteen items one by one.
        by_profile = n > 15 * self.n_profiles
        row = self.n_profiles if by_profile else n
        for size in _block_sizes(resamples, max(width, row)):
            if by_profile:
                yield rng.multinomial(n, often / n, size=size).T.astype(np.float64)
                continue
            drawn = self.profile[rng.integers(0, n, size=(size, n))]
            drawn += np.arange(size)[:, None] * self.n_profiles
            counts = np.bincount(drawn.ravel(), minlength=size * self.n_profiles)
            yield np.ascontiguousarray(counts.reshape(size, -1).T, dtype=np.float64)


@dataclass(frozen=True, slots=True, eq=False)
class _ClusterDraw:
    """Draws of clusters, as how often each profile is drawn with them."""

    profiles_of_clusters: SparseCounts  # (n_profiles, n_clusters)

    def blocks(self, rng: np.random.Generator, resamples: int, width: int) -> Iterator[FloatArray]:
        """Yield weights of shape (n_profiles, n_block)."""
        n = self.profiles_of_clusters.n_columns
        width = max(width, self.profiles_of_clusters.n_terms)
        for size in _block_sizes(resamples, width):
            drawn = rng.integers(0, n, size=(size, n)) + np.arange(size)[:, None] * n
            counts = np.bincount(drawn.ravel(), minlength=size * n).reshape(size, n)
            yield self.profiles_of_clusters.times(np.ascontiguousarray(counts.T, dtype=np.float64))


def _drawing(
    profile: IntArray, n_profiles: int, cluster_of_item: IntArray | None, items: IntArray
) -> tuple[_ItemDraw | _ClusterDraw, int]:
    """Return what to draw from, and how many units there are to draw."""
    if cluster_of_item is None:
        return _ItemDraw(np.sort(profile), n_profiles), profile.size
    clusters, cluster = np.unique(cluster_of_item[items], return_inverse=True)
    n_clusters = max(1, clusters.size)
    cells, often = np.unique(profile * n_clusters + cluster, return_counts=True)
    rows, columns = np.divmod(cells, n_clusters)
    counts = SparseCounts(rows, columns, often.astype(np.float64), n_profiles, clusters.size)
    return _ClusterDraw(counts), clusters.size


def _block_sizes(resamples: int, width: int) -> Iterator[int]:
    """Split the resamples so that a block of so many numbers each stays within bounds."""
    most = max(1, BLOCK // max(1, width))
    for begin in range(0, resamples, most):
        yield min(most, resamples - begin)


def _pairable_items(agreement: Agreement) -> IntArray:
    size = np.append(agreement.profiles.size, 0)  # -1 stands for an item without labels
    return np.flatnonzero(size[agreement.profile_of_item] >= 2)


def _percentiles(
    drawn: FloatArray, confidence_level: float, seed: int | None
) -> tuple[Interval | None, str | None]:
    """Take the middle of what was drawn, unless too much of it is undefined."""
    defined = drawn[~np.isnan(drawn)]
    undefined = int(drawn.size - defined.size)
    if undefined > MOST_UNDEFINED * drawn.size:
        share = undefined / drawn.size
        return None, f"alpha was undefined in {share:.0%} of the resamples, above 5%"
    tail = (1 - confidence_level) / 2
    low, high = np.quantile(defined, [tail, 1 - tail]).tolist()
    return Interval(low, high, confidence_level, drawn.size, undefined, seed), None


def _few(n_units: int, clustered: bool) -> str | None:
    if n_units >= FEW_ITEMS:
        return None
    what = "clusters" if clustered else "pairable items"
    return (
        f"with {n_units} {what}, fewer than {FEW_ITEMS}, intervals cover alpha less often than "
        "they say"
    )


def _check(resamples: int, confidence_level: float) -> None:
    if resamples < 1:
        raise RelookError(f"`resamples` must be 1 or more; got {resamples}")
    if not 0 < confidence_level < 1:
        raise RelookError(f"`confidence_level` must be between 0 and 1; got {confidence_level}")
