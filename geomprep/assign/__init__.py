"""What a network carries besides its shape: blood, walls, surroundings, ends, lumped values."""

from geomprep.assign.blood import BloodSettings, assign_blood
from geomprep.assign.end_settings import CalibrationSettings, InletSettings, OutletSettings
from geomprep.assign.ends import Ends, coordinates, find_node, resolve_ends
from geomprep.assign.gravity import Gravity, gravity, heights, with_heights
from geomprep.assign.imaging import ImagingPressures, ImagingResult, imaging_transmural
from geomprep.assign.inlets import assign_inlets
from geomprep.assign.lumped import imaged_wave_speed, lump
from geomprep.assign.outlet_models import OUTLET_MODELS
from geomprep.assign.outlets import OutletResult, assign_outlets
from geomprep.assign.splits import SPLIT_RULES
from geomprep.assign.surroundings import (
    StationSurroundings,
    SurroundingsSettings,
    station_surroundings,
    surroundings_at_imaging,
)
from geomprep.assign.walls import WallSettings, assign_walls

__all__ = [
    "OUTLET_MODELS",
    "SPLIT_RULES",
    "BloodSettings",
    "CalibrationSettings",
    "Ends",
    "Gravity",
    "ImagingPressures",
    "ImagingResult",
    "InletSettings",
    "OutletResult",
    "OutletSettings",
    "StationSurroundings",
    "SurroundingsSettings",
    "WallSettings",
    "assign_blood",
    "assign_inlets",
    "assign_outlets",
    "assign_walls",
    "coordinates",
    "find_node",
    "gravity",
    "heights",
    "imaged_wave_speed",
    "imaging_transmural",
    "lump",
    "resolve_ends",
    "station_surroundings",
    "surroundings_at_imaging",
    "with_heights",
]
