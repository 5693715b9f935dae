"""relook for those who work in Python: DataFrames in, DataFrames out, the same functions below.

labels in: intake
what they come to: measured
a queue of worksheets, and its way back: queued, returned
how results show themselves: showing
"""
