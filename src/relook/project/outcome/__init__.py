"""What the decisions came to: agreement before and after, audit findings, what is left.

figures: rescoring, corrected, moves, audit_findings, remaining
words and tables: rescore_sentences, rescore_tables, rescore_report
"""
