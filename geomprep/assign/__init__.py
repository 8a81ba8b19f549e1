"""assign room."""
