"""The same study under other decisions: counts, differences, and what they hang on.

Numbers only: which variants there are and what became of every cell is found out elsewhere.
"""
