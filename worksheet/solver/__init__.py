"""What is needed: bounds, windows, conflicts and proposals back-computed from targets.

It asks the engine for the full metric and the algebra for the formula; it never holds a second
description of either.
"""
