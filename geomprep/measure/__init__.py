"""Lengths, volumes, profile integrals, radius profiles, curvature and junctions of a network."""

from geomprep.measure.curves import curvature, tortuosity
from geomprep.measure.junctions import junctions
from geomprep.measure.profiles import radius_profiles
from geomprep.measure.segments import measure_segments

__all__ = ["curvature", "junctions", "measure_segments", "radius_profiles", "tortuosity"]
