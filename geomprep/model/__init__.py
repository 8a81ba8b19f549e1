"""The containers that the stages pass on, and the record of what was changed."""

from geomprep.model.arrays import BoolArray, FloatArray, IntArray, TextArray, Uint8Array, texts
from geomprep.model.basis import BASIS_NAMES, VESSEL_CLASSES, Basis
from geomprep.model.centrelines import Centrelines, concatenate
from geomprep.model.chains import Chains, chains, degrees
from geomprep.model.fields import FIXED_BY_FORMAT, Field, FieldTable, field, field_tables
from geomprep.model.history import Decision, Repair
from geomprep.model.ids import anchor_ids, raw_order
from geomprep.model.network import (
    NODE_ROLES,
    Cuts,
    Junctions,
    Lumped,
    Measures,
    Network,
    Nodes,
    Origin,
    Segments,
    Stations,
    Walls,
)
from geomprep.model.parameters import Blood, Inlet, Outlet, Surroundings, TubeLaw, end_arrays
from geomprep.model.point_graph import PointGraph
from geomprep.model.quality import (
    PROFILE_KINDS,
    RESOLUTION_LEVELS,
    Narrowing,
    SegmentBending,
    SegmentIntervals,
    SegmentProfiles,
    SegmentResolution,
)
from geomprep.model.states import SteadyState

__all__ = [
    "BASIS_NAMES",
    "FIXED_BY_FORMAT",
    "NODE_ROLES",
    "PROFILE_KINDS",
    "RESOLUTION_LEVELS",
    "VESSEL_CLASSES",
    "Basis",
    "Blood",
    "BoolArray",
    "Centrelines",
    "Chains",
    "Cuts",
    "Decision",
    "Field",
    "FieldTable",
    "FloatArray",
    "Inlet",
    "IntArray",
    "Junctions",
    "Lumped",
    "Measures",
    "Narrowing",
    "Network",
    "Nodes",
    "Origin",
    "Outlet",
    "PointGraph",
    "Repair",
    "SegmentBending",
    "SegmentIntervals",
    "SegmentProfiles",
    "SegmentResolution",
    "Segments",
    "Stations",
    "SteadyState",
    "Surroundings",
    "TextArray",
    "TubeLaw",
    "Uint8Array",
    "Walls",
    "anchor_ids",
    "chains",
    "concatenate",
    "degrees",
    "end_arrays",
    "field",
    "field_tables",
    "raw_order",
    "texts",
]
