"""What a network carries besides its shape: blood, walls, surroundings, ends, lumped values."""

from geomprep.assign.blood import BloodSettings, assign_blood
from geomprep.assign.ends import Ends, find_node, resolve_ends
from geomprep.assign.gravity import Gravity, gravity, heights, with_heights
from geomprep.assign.lumped import imaged_wave_speed, lump
from geomprep.assign.surroundings import StationSurroundings, SurroundingsSettings, station_surroundings
from geomprep.assign.walls import WallSettings, assign_walls

__all__ = [
    "BloodSettings",
    "Ends",
    "Gravity",
    "StationSurroundings",
    "SurroundingsSettings",
    "WallSettings",
    "assign_blood",
    "assign_walls",
    "find_node",
    "gravity",
    "heights",
    "imaged_wave_speed",
    "lump",
    "resolve_ends",
    "station_surroundings",
    "with_heights",
]
