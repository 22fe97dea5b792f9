"""Targets against results over every condition: verdicts, validity, fragility, yield, budgets.

A verdict is made here once and shown by every front end; nothing here formats or prints.
"""
