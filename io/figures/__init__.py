"""
Pictures of the statement as files.

Modules
-------
sheet   one profile on one sheet
"""

SUFFIXES = (".svg", ".pdf", ".png")
