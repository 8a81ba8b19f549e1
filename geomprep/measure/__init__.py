"""measure room."""
