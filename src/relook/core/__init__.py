"""The arithmetic.

Nothing here imports pandas, openpyxl, typer or rich, touches a file, prints, or asks the clock.

what everything rests on: labels, profiles, exact, sparse
difference functions: differences, difference_base, bound_differences, further_differences
agreement and its parts: agreement, summed, contributions, coder_parts, crossings,
    label_tables, without_coder, merging
how sure: alpha_of_weights, resampling, sample_size, proportions
consensus and doubt: consensus, doubt
order and number: ranking, ties, selection
settling: settling, settled_base, settled_sums, settled_ordinal
audit and decisions: audit, decisions
"""
