"""Lengths, volumes, profile integrals, radius profiles, narrowings, curvature and junctions of a network."""

from geomprep.measure.cross_sections import cross_sections
from geomprep.measure.curves import curvature, tortuosity
from geomprep.measure.junction_zones import Convention, ZoneSettings, junction_zones, zone_findings
from geomprep.measure.junctions import junctions
from geomprep.measure.mask_areas import VoxelGrid, mask_areas
from geomprep.measure.narrowings import narrowings
from geomprep.measure.profiles import radius_profiles
from geomprep.measure.quality import describe, unresolved_finding
from geomprep.measure.resolution import resolution, unresolved_share
from geomprep.measure.segments import measure_segments
from geomprep.measure.trim import trimmed
from geomprep.measure.uncertainty import intervals

__all__ = [
    "Convention",
    "VoxelGrid",
    "ZoneSettings",
    "cross_sections",
    "curvature",
    "describe",
    "intervals",
    "junction_zones",
    "junctions",
    "mask_areas",
    "measure_segments",
    "narrowings",
    "radius_profiles",
    "resolution",
    "tortuosity",
    "trimmed",
    "unresolved_finding",
    "unresolved_share",
    "zone_findings",
]
