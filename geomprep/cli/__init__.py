"""cli room."""
