"""What a project keeps for good, rounds sent and decisions recorded, and what they settle.

rounds: rounds, history, independence
codings: codings
decisions: record, recorded, decidable, settlements
"""
