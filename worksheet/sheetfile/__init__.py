"""TOML in and out: the reader with line numbers, the in-place writer, migration of the schema.

The only home of tomllib and tomlkit. Files belong to the user: every problem is reported at once, and
a write changes the value edited and no other byte.
"""
