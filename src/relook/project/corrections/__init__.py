"""Labels that their coders corrected: both versions of a table, side by side.

side by side: correcting
kept: label_versions
"""
