"""Labels on several machines: each part reduced where it lies, the sums added up here.

what a worker does with a part: parts
sums added up, chosen items fetched: adding
parts shuffled by item where an item lies in several: shuffling
the machines: cluster
score and queue on all that: running
"""
