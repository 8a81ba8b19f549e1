"""anatomy room."""
