"""Lengths, volumes, profile integrals, radius profiles, narrowings, curvature and junctions of a network."""

from geomprep.measure.cross_sections import cross_sections
from geomprep.measure.curves import curvature, tortuosity
from geomprep.measure.junction_zones import junction_zones
from geomprep.measure.junctions import junctions
from geomprep.measure.mask_areas import VoxelGrid, mask_areas
from geomprep.measure.narrowings import narrowings
from geomprep.measure.profiles import radius_profiles
from geomprep.measure.resolution import resolution, unresolved_share
from geomprep.measure.segments import measure_segments
from geomprep.measure.uncertainty import intervals

__all__ = [
    "VoxelGrid",
    "cross_sections",
    "curvature",
    "intervals",
    "junction_zones",
    "junctions",
    "mask_areas",
    "measure_segments",
    "narrowings",
    "radius_profiles",
    "resolution",
    "tortuosity",
    "unresolved_share",
]
