"""flow room."""
