"""A project folder: its settings, rounds and record, and what is done with them."""
