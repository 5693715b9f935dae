"""A project folder: its settings, rounds and record, and what is done with them.

the folder and its settings: folder, settings, settings_schema, settings_text, guessed, people
figures: loading, scoring, score_tables, use_tables, score_object, item_table,
    consensus_texts, explaining, label_mergers, verdict, requiring, independence
a round going out: ordering, history, queueing, round_items, queue_run, sheets, decidable,
    issuing, rounds, overviews, mending
a round coming back: returns, checking, weighing, collecting, collected, collect_table,
    rulings, rulings_run, record, recorded, rebuilding, settlements, standing
what it came to: rescoring, corrected, moves, audit_findings, remaining,
    rescore_sentences, rescore_tables, rescore_report
labels that coders corrected: correcting, label_versions
release: releasing, final_labels, corrected_tables, methods_statement, release_files
"""
