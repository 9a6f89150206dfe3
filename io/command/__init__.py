"""
The command line: one module a command, heavy imports only inside what needs them.

Modules
-------
desk     backveer desk: the local web page
main     the group of commands, and how a run ends
options  options that several commands share, and what they become
outlook  backveer outlook: the coming night from a sunset profile
read     backveer read: how each file was understood
rotor    backveer rotor: wind energy, what turbines meet in each profile and over time
runways  what --runway means: a true heading, or a designator with the magnetic variation
shear    backveer shear: low-level wind shear at an aerodrome
turn     backveer turn: the main job, from files to the statement
watch    watch a folder: give each file once it has come to rest, and again whenever it changes
"""

from backveer.io.command.main import main

__all__ = ["main"]
