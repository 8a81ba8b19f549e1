"""segments room."""
