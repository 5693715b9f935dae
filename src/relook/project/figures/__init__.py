"""What the labels come to: agreement, contributions, orders, explanations.

score: scoring, score_tables, use_tables, score_object, item_table, consensus_texts, requiring,
    interval_words
what to do about it: label_mergers, verdict
items one by one: ordering, explaining
"""
