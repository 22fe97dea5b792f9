"""biasbook: a book of calculation sheets for analog stages, one sheet a circuit block.

Only the version lives here, so that importing the package costs nothing; the folders below are the
architecture, and DEVELOPERS.md says in which direction they may import each other.
"""

__version__ = "0.1.0"
