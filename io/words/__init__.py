"""
The statement in words, tables and JSON: units and roundings are chosen here and nowhere else.

Modules
-------
record     the JSON
findings   what the quality check found, as remarks
units      what people read instead of SI
text       the printed statement of one profile, and of how a file was read
table      many profiles, a line each
sources    method, equation and publication of each number
cautions   where it can hurt
"""
