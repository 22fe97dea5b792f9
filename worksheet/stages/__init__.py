"""Circuits as data: what nodes, devices, levels and metrics each stage declares.

One small table a circuit and no arithmetic, so that a new stage is a new table and nothing else;
the engine turns tables into numbers. Standard library only.
"""
