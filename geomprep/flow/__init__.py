"""Flow through a finished network."""

from geomprep.flow.steady import steady_state

__all__ = ["steady_state"]
