"""Tables in and out with pandas: label, item and code-book tables in, result tables out.

declarations: schema
bytes to text cells: reading, delimited, arrow_columns, numbered_texts, encodings, formats, headers
labels and items: labels, layouts, joining, coding, columns, values, numbers, items, code_book
guessing a layout: guessing, sketches, guessed_roles, guessed_columns, wide_columns,
    guessed_grids, guessed_items
checking: checking, checked_labels, checked_items, twins, findings
out: results
"""
