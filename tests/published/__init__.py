"""Published networks laid out in space, for tests."""
