"""A stage's matrices solved with symbols: every metric and operating-point value as an expression, level by level.

A level is a quantity that has its own definition in terms of further levels, down to what sheet, process file and
conditions state. Nothing here shares code with the numeric engine; both read the same network (Circuit.terms) and
the same rules (model.metrics). sympy is imported inside functions, so that a command without algebra never loads it.
"""
