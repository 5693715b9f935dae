"""What `relook score --json` writes."""

from __future__ import annotations

from collections.abc import Callable, Iterable

from relook.core.merging import why_not_mergeable
from relook.project.figures.label_mergers import CAUTION, MergedScore
from relook.project.figures.score_tables import (
    Row,
    coder_pair_rows,
    coder_rows,
    defined,
    group_rows,
    label_pair_rows,
    label_rows,
    prospect_rows,
    variable_rows,
)
from relook.project.figures.scoring import Score, VariableScore
from relook.project.figures.use_tables import (
    cross_table_rows,
    direction_rows,
    group_coder_rows,
    group_label_pair_rows,
    higher_rows,
    label_use_rows,
)
from relook.tables.twins import Twins, near_twins

#: Distinct labels beyond which nobody has written them by hand.
_MOST_READ = 2_000


def score_object(score: Score) -> Row:
    """Return everything that `relook score --json` writes, but for its format number.

    Undefined figures are null, each with a reason beside it. Shares are of the variable's D_o
    unless said otherwise. Only pairable labels count, but for `n_items` and `n_labels` of a
    variable.

    Notes
    -----
    `seed`: of the resampling and the last tie-break. `project`: the folder, null for a bare table.
    `rank_by`: what ranks the items. `bound_by`: which limit decided how many are selected: "top",
    "share", "hours", "default share", "default top" or "all disputed items".
    `n_disputed_items`, `n_selected_items`: items disputed in any variable, and the head of them.
    `share_selected`: what the selected carry, of D_o or, with several variables, of the
    chance-scaled disagreement. `left_out[]`: `coder, n_labels` of coders left out by relook.toml.
    `changed_files[]`: label files that are not those of the first round, so that alpha may no
    longer be of independently made labels.

    `variables[]`: `variable`, `difference`, `alpha`, `undefined_because`,
    `observed_disagreement` (D_o), `expected_disagreement` (D_e),
    `interval` {`low`, `high`, `confidence_level`, `resamples`, `undefined_resamples`, `seed`,
    `resampled_by` ("item" or the column of clusters)} or null, `no_interval_because`,
    `n_items`, `n_pairable_items`, `n_disputed_items`, `n_labels`, `n_pairable_labels`, `n_coders`,
    `n_missing_labels`, `needed_items` {`n_items`, `bar`, `error_level`, `rarest_label`,
    `rarest_share`} or null, `no_needed_items_because`, `doubt` {`converged`, `steps`, `shrink`,
    `start`} or null, `doubt_undefined_because`, `verdict` (the sentence on where the weight lies,
    or null), `no_alpha_without_because`, `no_coder_pairs_because`, `mergers_not_because`,
    `n_selected_rows` (rows of the variable among the selected), `n_led_items` (selected items in
    which it weighs most), `share_selected` (its D_o in its selected rows),
    `projected_agreement` {`low`, `high`} (agreement in the corrected data once they are settled).

    `coders[]`: `variable, coder, contribution, share, n_items, n_labels, share_of_labels`,
    `involved` (share of D_o in pairs of which the coder is one side), `own_alpha`,
    `alpha_without`, `n_pairable_items_without`.
    `coder_pairs[]`: `variable, first, second, contribution, share, n_items`.
    `label_pairs[]`: the same and `chance_share`, the pair's share of D_e.
    `labels[]`: `variable, label, n_labels, share_of_labels, alpha_against_rest, involved`.
    `label_use[]`: `variable, coder, label, n_labels, share_of_coder`.
    `cross_table[]`, for two coders: `variable, first_coder, second_coder, first, second, n_items`.
    `directions[]`, for two coders: `variable, label, first_coder, second_coder, n_first, n_second,
    difference`.
    `higher[]`, for two coders and labels with an order: `variable, first_coder, second_coder,
    n_items, first_higher, second_higher, mean_difference`.
    `groups[]`: `variable, column, group` and the figures of `coders[]` down to `own_alpha`.
    `group_coders[]`: `variable, column, group, coder, contribution, share, n_labels`.
    `group_label_pairs[]`: `variable, column, group, first, second, contribution, share, n_items`.
    `prospect[]`: `variable, n_settled, low, high, n_ties`; agreement in the corrected data after so
    many items of the selection; 0 is now.
    `merged[]`, as `--merge` asks: `variable, groups[]{name, labels[]}, alpha, undefined_because,
    observed_disagreement, expected_disagreement, n_disputed_items, not_merged_because`.
    `best_mergers[]`: `variable, first, second, alpha, observed_disagreement,
    expected_disagreement, gain`, best first. `mergers_caution`: what to bear in mind with both.
    `warnings[]`: `variable` (null for the whole), `warning`.
    """
    ranking, selection = score.ordering.ranking, score.ordering.selection
    settings = score.loaded.project.settings

    def rows(of: Callable[[VariableScore], Iterable[Row]]) -> list[Row]:
        return [row for scored in score.variables for row in of(scored)]

    return {
        "project": str(score.loaded.project.root) if settings.project else None,
        "seed": score.seed,
        "rank_by": ranking.rank_by,
        "bound_by": selection.bound_by,
        "n_disputed_items": ranking.n_items,
        "n_selected_items": selection.n_items,
        "share_selected": selection.share,
        "left_out": [
            {"coder": coder, "n_labels": n_labels}
            for coder, n_labels in score.loaded.labels.left_out.items()
        ],
        "changed_files": list(score.changed_files),
        "variables": [
            {**row, **_selected_row(score, position)}
            for position, row in enumerate(variable_rows(score))
        ],
        "coders": rows(coder_rows),
        "coder_pairs": rows(coder_pair_rows),
        "label_pairs": rows(label_pair_rows),
        "labels": rows(label_rows),
        "label_use": rows(label_use_rows),
        "cross_table": rows(cross_table_rows),
        "directions": rows(direction_rows),
        "higher": rows(higher_rows),
        "groups": rows(group_rows),
        "group_coders": rows(lambda scored: group_coder_rows(score, scored)),
        "group_label_pairs": rows(lambda scored: group_label_pair_rows(score, scored)),
        "prospect": rows(prospect_rows),
        "merged": [_merged_row(merged) for merged in score.merged],
        "best_mergers": rows(best_merger_rows),
        "mergers_caution": CAUTION,
        "warnings": warning_rows(score),
    }


def selected_row(score: Score, position: int) -> Row:
    """Return what the selected items hold of one variable, and what settling them would bring."""
    selection, prospect = score.ordering.selection, score.variables[position].prospect
    return {
        "n_selected_rows": int(selection.rows_per_variable[position]),
        "n_led_items": int(selection.led_by_variable[position]),
        "share_selected": defined(selection.share_per_variable[position]),
        "projected_agreement": {
            "low": defined(prospect.low[-1]),
            "high": defined(prospect.high[-1]),
        },
    }


def best_merger_rows(scored: VariableScore) -> list[Row]:
    """Return the pairs of labels whose merger would lift alpha most, best first."""
    texts = scored.held.texts
    return [
        {
            "variable": scored.name,
            "first": texts[merger.first],
            "second": texts[merger.second],
            "alpha": merger.alpha,
            "observed_disagreement": merger.observed_disagreement,
            "expected_disagreement": merger.expected_disagreement,
            "gain": merger.gain,
        }
        for merger in scored.mergers
    ]


def warning_rows(score: Score) -> list[Row]:
    """Return what should be known before relying on a figure."""
    rows: list[Row] = [
        {"variable": scored.name, "warning": warning}
        for scored in score.variables
        for warning in variable_warnings(scored)
    ]
    if score.changed_files:
        rows.append({"variable": None, "warning": changed_warning(score.changed_files)})
    return rows + [{"variable": None, "warning": str(problem)} for problem in score.loaded.problems]


def variable_warnings(scored: VariableScore) -> list[str]:
    """Return the cautions on one variable's figures."""
    warnings = []
    if scored.agreement.undefined_because is not None:
        warnings.append(f"alpha is undefined: {scored.agreement.undefined_because}")
    if scored.interval.warning is not None:
        warnings.append(scored.interval.warning)
    twins = _twins(scored)
    if twins:
        more = "" if len(twins) == 1 else f", and {len(twins) - 1:,} more such pairs"
        warnings.append(
            f'labels that read alike count as different: "{twins[0].other}" beside '
            f'"{twins[0].kept}" ({twins[0].how}){more}; `relook check` lists them with their rows'
        )
    model = scored.doubt.model
    if model is not None and not model.converged:
        warnings.append(
            f"the estimate of doubt, which breaks ties, had not settled after {model.steps:,} steps"
        )
    return warnings


def _twins(scored: VariableScore) -> list[Twins]:
    """Labels that differ by what a reader overlooks; none among numbers, or so many labels."""
    texts = scored.held.texts
    if scored.held.values.numerators is not None or len(texts) > _MOST_READ:
        return []
    return near_twins(dict(zip(texts, scored.label_parts.n_labels.tolist(), strict=True)))


def changed_warning(files: Iterable[str]) -> str:
    """Say that labels changed after a round was sent."""
    return (
        f"{', '.join(files)}: not as in the first round, so the labels may no longer be "
        "independent, and what is called alpha here may speak of the corrected data"
    )


def _selected_row(score: Score, position: int) -> Row:
    because = why_not_mergeable(score.variables[position].agreement)
    return {"mergers_not_because": because, **selected_row(score, position)}


def _merged_row(merged: MergedScore) -> Row:
    after = merged.agreement
    return {
        "variable": merged.variable,
        "groups": [{"name": group.name, "labels": list(group.labels)} for group in merged.groups],
        "alpha": None if after is None else after.alpha,
        "undefined_because": None if after is None else after.undefined_because,
        "observed_disagreement": None if after is None else after.observed_disagreement,
        "expected_disagreement": None if after is None else after.expected_disagreement,
        "n_disputed_items": None if after is None else after.n_disputed_items,
        "not_merged_because": merged.not_merged_because,
    }
