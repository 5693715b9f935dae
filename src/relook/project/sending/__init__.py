"""A round going out: items chosen, dealt to adjudicators, written as worksheets.

which items: queueing, round_items
worksheets: sheets, issuing, mending
the lead's workbook: overviews
all of it under the lock: queue_run, cautions
"""
