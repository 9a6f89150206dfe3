"""
Pictures of the statement as files.

Modules
-------
sheet       one profile on one sheet
panels      speed, direction, departure and advection over one height axis
hodograph   the wind vectors beside them
profile_of  what the panels share
style       colours, lines, and what keeps two runs alike to the byte
"""

SUFFIXES = (".svg", ".pdf", ".png")
