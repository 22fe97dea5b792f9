"""Results turned into rows, text, JSON, CSV, Markdown and HTML.

One table of rows feeds every format, so that two formats cannot disagree. matplotlib's only home,
imported inside functions.
"""
