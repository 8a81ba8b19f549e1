"""laws room."""
