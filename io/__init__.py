"""Everything that meets the outside world: files, words, pictures, the command line."""
