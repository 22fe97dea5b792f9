"""Two reviewed projects laid side by side by meaning: inputs, results, causes.

It compares values and not text, so that a reformatted file is no change and a changed link is one.
"""
