"""Checks of a network file: what its fields may hold, and whether its tables mean something together."""

from geomprep.export.checks.faults import WORDS, Fault

__all__ = ["WORDS", "Fault"]
