"""Spreadsheet files as rows of typed cells, and text made safe for a cell.

Both tables and worksheets come as workbooks, from people and from strangers; what is dangerous or
lossy about that is dealt with here once.

what was read: model
reading: opening, sniffing, package, limits, xlsx, xlsx_sheet, xlsx_values, ods, csv_cells
writing: writing
"""
