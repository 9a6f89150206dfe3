"""
One self-contained page of a statement, which opens from a file without a network.

Modules
-------
page   builds and writes the page
"""
