"""TOML in and out: the reader with line numbers, edits of the text in place, files replaced in one step.

The only home of tomllib and tomlkit. Files belong to the user: every problem is reported at once, and
a write changes the value edited and no other byte. The format has one version so far; a newer one is refused.
"""
