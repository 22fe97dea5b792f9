"""The folder as a whole: finding its files, its sheets, and the links between sheets.

Here the values of one sheet are resolved against the others at the same condition, and a loop of
values is named; what the values lead to belongs in the layers above.
"""
