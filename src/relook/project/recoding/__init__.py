"""A fresh coding of a sample: drawn, dealt to coders, written as coding sheets.

which items, and who codes them: drawing
sheets: coding_sheets
all of it under the lock: recode_run
"""
