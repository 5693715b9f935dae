"""Worksheets: planned, written, and read back in whatever state they return.

what a worksheet is made of: model, keys, layout
planning: plan, competing
writing: write, start_sheet, start_words, queue_sheet, queue_rules, queue_looks, code_book_sheet,
    lists_sheet, page, looks, palette, packing
reading back: read, beside, matching
the lead's workbooks: overview, overview_model, overview_sheets, overview_table,
    overview_charts, report, final_book
"""
