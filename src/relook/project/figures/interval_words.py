"""An interval of alpha in words: its ends, and the draws that they come from."""

from __future__ import annotations

from relook.core.resampling import Interval


def interval_ends(interval: Interval) -> str:
    """Return the level and both ends, as "95% interval 0.596 to 0.687"."""
    return f"{interval.confidence_level:.0%} interval {interval.low:.3f} to {interval.high:.3f}"


def interval_draws(interval: Interval, resampled_by: str | None) -> str:
    """Return how many draws of what, as "2,000 resamples of items, seed 1".

    Parameters
    ----------
    interval : Interval
    resampled_by : str or None
        The column whose clusters were drawn whole; None where items were.
    """
    drawn = "items" if resampled_by is None else f'"{resampled_by}" as clusters'
    said = f"{interval.resamples:,} resamples of {drawn}, seed {interval.seed}"
    if not interval.undefined_resamples:
        return said
    one = interval.undefined_resamples == 1
    noun = "resample" if one else "resamples"
    return f"{said}; {interval.undefined_resamples:,} {noun} undefined and left out"
