"""Lengths, volumes, profile integrals and junctions of a network."""

from geomprep.measure.junctions import junctions
from geomprep.measure.segments import measure_segments

__all__ = ["junctions", "measure_segments"]
