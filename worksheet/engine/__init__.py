"""A stage's matrices solved: numbers with numpy, symbols with sympy, metrics from either.

The numeric modules import nothing symbolic, and the symbolic ones import sympy inside functions, so
that a command which shows no algebra never pays for it.
"""
