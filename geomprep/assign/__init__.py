"""What a network carries besides its shape: blood, walls, surroundings, ends, lumped values."""

from geomprep.assign.blood import BloodSettings, assign_blood
from geomprep.assign.lumped import imaged_wave_speed, lump
from geomprep.assign.walls import WallSettings, assign_walls

__all__ = ["BloodSettings", "WallSettings", "assign_blood", "assign_walls", "imaged_wave_speed", "lump"]
