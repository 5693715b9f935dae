"""A project folder, and everything that is done with it; each package imports only earlier ones.

setup: the folder as it stands, its settings, people and tables
archive: rounds sent and decisions recorded, which are kept for good
figures: what the labels come to
sending: a round going out
recoding: a fresh coding going out
returning: a round coming back
outcome: what the decisions came to
corrections: labels that their coders corrected
release: final labels
"""
