"""
From a file as the instrument wrote it to a stack of profiles.

Modules
-------
errors     what can be wrong with an input
files      paths, globs, compression: from a name to bytes
table      what a text file says before anyone knows what its columns mean
text       from bytes to a table
units      accepted spellings of units, and what they are in SI
spellings  accepted names of columns and metadata
columns    from a table to profiles: what each column is, and why
reading    what was read, and how it was understood
"""
