"""export room."""
