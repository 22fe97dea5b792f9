"""Pages for a colleague: one tree of headings, tables, formulas and pictures, written as HTML, Markdown and CSV.

The builders (block, project and their parts) make the tree from results; the writers know nothing of circuits. Minutes
or any other page can be made of the same tree.
"""
