"""What the decisions came to: agreement before and after, audit findings, what is left.

figures: codings_compared, rescoring, corrected, moves, audit_findings, remaining
words and tables: rescore_sentences, rescore_tables, rescore_report
"""
