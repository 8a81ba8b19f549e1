"""solve room."""
