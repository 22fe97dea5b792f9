"""One module a command: `add` describes its arguments, `run` does it and returns the exit status.

Layers below are imported in `run`, so that help and usage errors cost nothing.
"""
