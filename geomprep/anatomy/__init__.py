"""Names of vessels."""

from geomprep.anatomy.names import NamedPoint, name_segments, read_names

__all__ = ["NamedPoint", "name_segments", "read_names"]
