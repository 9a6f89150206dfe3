"""
The statement in words, tables and JSON: units and roundings are chosen here and nowhere else.

Modules
-------
record     the JSON
findings   what the quality check found, as remarks
units      what people read instead of SI
safe       text from a file, made safe to print
page       sections, tables and wrapping at 80 columns
opening    how a statement begins: heading, how it was read, the findings in short
text       the printed statement of one profile
table      many profiles, a line each
understood how a file was understood, in print
sources    method, equation and publication of each number
cautions   where it can hurt
"""
