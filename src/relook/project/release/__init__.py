"""Final labels, and what is said of how they were made.

all of it: releasing, release_files
in parts: final_labels, corrected_tables, methods_statement
"""
