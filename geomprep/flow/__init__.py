"""Checked before hand-over: the steady state of a network."""

from geomprep.flow.steady import steady_state

__all__ = ["steady_state"]
