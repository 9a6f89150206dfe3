"""
The command line: one module a command, heavy imports only inside what needs them.

Modules
-------
main      the group, and how it ends: exit status and one-line errors
options   options that several commands share
read      how each file was understood
turn      the main job
"""

from backveer.io.command.main import main

__all__ = ["main"]
