"""
The statement in words, tables and JSON: units and roundings are chosen here and nowhere else.

Modules
-------
cautions        where the answers can hurt: said in print, in JSON and in the README, in the
                same words
climate_text    the printed tables over time: a row a class, data recovery beside every figure
findings        what the quality check found, as remarks of each profile
opening         how a statement begins: what, where and when, how it was read, and the findings
                in short
outlook         the night's outlook in print and in JSON
page            a page of plain text, 80 columns wide: sections, tables, pairs, and what a
                profile is called
record          the JSON of a reading and of a statement: SI, the names of the house, null where
                there is none
rotor_record    the JSON of what turbines meet: SI, an object a turbine in each profile, tables
                over time
rotor_text      the printed answer of what a turbine meets: in one profile, and in many
safe            text from a file, made safe to print: no control characters, no terminal escapes
shear_change    one line about a profile that has just come, and what it changes
shear_group     the candidate wind-shear group of the TAF code and its plain sentence
shear_path      the part of the printed answer that is about the flight path
shear_record    the JSON of low-level shear: SI, one object a profile
shear_sentence  the plain sentence about low-level shear: a candidate for a forecaster's
                judgement
shear_sources   method, equation and publications of each number about low-level shear, for
                --sources
shear_table     many profiles: a line each, then the trend, the persistence and the criteria
                over time
shear_text      the printed answer about the low-level shear of one profile, 80 columns wide
sources         method, equation and publication of each number of the statement, for --sources
table           many profiles: a line each, and what they have in common
text            the printed statement of one profile
understood      how a file was understood, in print
units           the units that people read: chosen by name, converted at the last moment,
                rounded by the error
"""
