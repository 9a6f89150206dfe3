"""Pictures of the statement as files."""
