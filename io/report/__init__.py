"""
One self-contained page of a statement, which opens from a file without a network.

Modules
-------
page  the report: a statement as one self-contained page
"""
