"""files room."""
