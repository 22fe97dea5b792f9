"""Device parameters from tables of drain current: reading, screening, fit, judgement, and curves the other way.

The one layer that needs an optimiser; scipy is imported inside the functions that minimise, so that a command which
fits nothing never pays for it. The public way in is `extraction.extract_parameters`.
"""
