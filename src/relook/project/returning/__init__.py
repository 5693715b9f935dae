"""A round coming back: worksheets checked, decisions weighed and recorded.

worksheets in: returns, checking, weighing, rebuilding
all of it under the lock: collecting, collected, collect_table, sorting
the lead's own decisions: rulings, rulings_run
where the rounds stand: standing
"""
