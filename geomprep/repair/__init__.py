"""repair room."""
