"""case room."""
