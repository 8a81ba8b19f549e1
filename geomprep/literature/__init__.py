"""literature room."""
