"""Plain frozen data that every layer shares: quantities, formulas, keys, metrics, sheets, problems.

It is the one place where a key, a metric or a unit is described, so it imports nothing of the house
and nothing outside the standard library: whatever reads a description can do so at no cost.
"""
