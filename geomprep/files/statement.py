"""What a person states about one input file; the gates hold it against the numbers."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["FRAME_AXES", "SIZE_MEANINGS", "InputStatement"]

SIZE_MEANINGS = {"inscribed radius": "radius", "equal-area radius": "radius", "diameter": "diameter", "area": "area"}
"""What a size array may hold -> how a radius is made from it."""

FRAME_AXES = ("LR", "PA", "SI")
"""The three axes of the body; a frame names one end of each."""


@dataclass(frozen=True)
class InputStatement:
    """Everything stated about one input file; None where nothing is stated.

    Attributes
    ----------
    file : str
        Path as written, relative to the folder of the case file.
    vessels : str, optional
        ``arteries``, ``veins`` or ``both``.
    class_array : str, optional
        Array that tells arteries from veins.
    class_values : tuple of float
        Values of that array that mean artery and vein.
    length_unit : str, optional
        One of :data:`geomprep.units.LENGTH_UNITS`.
    size_array : str, optional
    size_means : str, optional
        One of :data:`SIZE_MEANINGS`.
    frame : str, optional
        Three letters: where x, y and z grow to.
    voxel : tuple of float, optional
        Voxel edges in metres.
    lumen_surface, mask : str, optional
        Paths of a triangulated surface and of a mask of the lumen, relative to the folder of the case file.
    modality, field_of_view, breath, head_rotation : str, optional
    """

    file: str
    vessels: str | None = None
    class_array: str | None = None
    class_values: tuple[float, float] | None = None
    length_unit: str | None = None
    size_array: str | None = None
    size_means: str | None = None
    frame: str | None = None
    voxel: tuple[float, float, float] | None = None
    lumen_surface: str | None = None
    mask: str | None = None
    modality: str | None = None
    field_of_view: str | None = None
    breath: str | None = None
    head_rotation: str | None = None
