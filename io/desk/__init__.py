"""
The local web page: drop a file, see how it was read, correct it, and see the answer follow.

Served on this machine only. Everything from the page is data: a file's bytes, words for columns and
units, numbers; never a path.

Modules
-------
answer   From an upload and what was said about it to what the page shows
server   the routes of the desk, and who may ask
session  what one browser has open: uploads in a private temporary place, gone when the desk
         closes
"""
