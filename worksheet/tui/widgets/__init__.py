"""Widgets that the screens are built from: lines of spans, the ledger with its cursor, the editor of a field."""
