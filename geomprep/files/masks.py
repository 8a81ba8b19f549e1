"""Masks of the lumen: ``.vti``, ``.nii`` and ``.nii.gz``, read by VTK's own readers in a contained way."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from geomprep.errors import FileError
from geomprep.files import nifti, vti
from geomprep.files.contained import Parsed, ReadLimits
from geomprep.files.contents import AnyArray
from geomprep.files.layout import compare
from geomprep.files.shape_reading import ImageLayout, ShapeFormat, parsed_shape
from geomprep.findings import Finding, Severity
from geomprep.model import BoolArray, FloatArray

__all__ = ["MaskContents", "read_mask"]

_FORMATS = (
    ShapeFormat(".vti", "vtk xml", vti.layout),
    ShapeFormat(".nii", "image", nifti.layout),
    ShapeFormat(".nii.gz", "image", nifti.layout),
)
_DEFAULT_LIMITS = ReadLimits()
_SKEW = 1e-4  # cosine between two axes of the voxels
_APART = 0.1  # voxels by which two statements of the same place may differ
_LABELS_SHOWN = 5


@dataclass(frozen=True, eq=False)
class MaskContents:
    """A mask and where its voxels lie; coordinates are the file's own.

    Attributes
    ----------
    name : str
        Name of the file as it was given.
    sha256 : str
        SHA-256 of the bytes that were read, in hexadecimal.
    format : str
        What the file is.
    inside : (a, b, c) bool array
        True where the value is not 0.
    labels : (k,) float array
        The values other than 0.
    origin : (3,) float array
        Centre of voxel 0, 0, 0.
    spacing : (3,) float array
        From centre to centre along each axis.
    directions : (3, 3) float array
        Column k is the unit vector along axis k of `inside`.
    length_unit : str
        Unit of coordinates where the file states one, else empty.
    frame : str
        Anatomical frame where the format has one (``RAS``: x grows to the right, y to the front, z to
        the head), else empty.
    findings : tuple of Finding
    """

    name: str
    sha256: str
    format: str
    inside: BoolArray
    labels: FloatArray
    origin: FloatArray
    spacing: FloatArray
    directions: FloatArray
    length_unit: str = ""
    frame: str = ""
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Make the arrays read-only."""
        for name in ("inside", "labels", "origin", "spacing", "directions"):
            view = np.asarray(getattr(self, name)).view()
            view.flags.writeable = False
            object.__setattr__(self, name, view)


def read_mask(path: str | Path, array: str = "", *, limits: ReadLimits = _DEFAULT_LIMITS) -> MaskContents:
    """Read a mask of the lumen.

    Parameters
    ----------
    path : str or Path
        ``.vti``, ``.nii`` or ``.nii.gz``.
    array : str
        Name of the array in a ``.vti`` file that holds several. Values on cells belong to the
        voxels' centres, half a spacing from the corners.
    limits : ReadLimits
        What reading may cost.

    Returns
    -------
    MaskContents

    Raises
    ------
    FileError
        One line with the file, its fault and the way out; a file that states no place for its voxels, whose
        axes are skew, or whose values are no whole numbers is refused, too.

    Examples
    --------
    >>> read_mask("no such file.nii.gz")
    Traceback (most recent call last):
    geomprep.errors.FileError: no such file.nii.gz: there is no such file; check name and folder
    """
    name, digest, layout, parsed = parsed_shape(path, _FORMATS, limits)
    if not isinstance(layout, ImageLayout):
        raise FileError(name, "is no image")
    compare(name, layout, parsed)
    values, on_cells = _values(name, layout, parsed, array)
    answer = parsed.answer
    findings: list[Finding] = []
    if layout.frame:
        slope, intercept = answer["rescale"]
        values = values * slope + intercept if slope not in (0.0, 1.0) or intercept else values
        origin, spacing, directions = _anatomical(name, answer, values.shape, findings)
    else:
        spacing, directions = np.array(answer["spacing"]), np.array(answer["directions"])
        first = np.array(answer["extent"][::2]) + (0.5 if on_cells else 0.0)
        origin = np.array(answer["origin"]) + directions @ (spacing * first)
    _check_place(name, origin, spacing, directions)
    inside, labels = _inside(name, values)
    findings += _notes(labels)
    return MaskContents(
        str(path),
        digest,
        layout.words,
        inside,
        labels,
        origin,
        spacing,
        directions,
        layout.length_unit,
        layout.frame,
        tuple(findings),
    )


def _values(name: str, layout: ImageLayout, parsed: Parsed, wanted: str) -> tuple[AnyArray, bool]:
    """The values (a, b, c) of the one array, and whether they lie on cells."""
    held = [(key, array, False) for key, array in parsed.named("point array")]
    held += [(key, array, True) for key, array in parsed.named("cell array")]
    single = [each for each in held if each[1].ndim == 1 and (layout.frame or not wanted or each[0] == wanted)]
    if len(single) != 1:
        names = ", ".join(f"'{key}'" for key, array, _ in held if array.ndim == 1) or "none"
        asked = f" named '{wanted}'" if wanted else ""
        raise FileError(name, f"has {len(single)} arrays of one value per voxel{asked}; name one of these: {names}")
    _, values, on_cells = single[0]
    extent = parsed.answer["extent"]
    got = tuple(last - first + 1 for first, last in zip(extent[::2], extent[1::2], strict=True))
    shape = tuple(side - 1 for side in layout.shape) if on_cells else layout.shape
    if got != layout.shape or len(values) != int(np.prod(shape)):
        raise FileError(
            name, f"declares {layout.shape} points, but {got} were read; the file is damaged, write it anew"
        )  # fmt: skip
    return values.reshape(shape[::-1]).T, on_cells


def _anatomical(
    name: str, answer: dict[str, Any], shape: tuple[int, ...], findings: list[Finding]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Origin, spacing and directions in the body, by the first of two statements that is there."""
    stated = [np.array(answer[key]) for key in ("sform", "qform") if answer[key] is not None]
    if not stated:
        raise FileError(name, "states no place for its voxels (sform and qform codes are 0); write it with one")
    step = np.array(answer["spacing"])
    corners = np.stack(np.meshgrid(*([0, side - 1] for side in shape), indexing="ij"), axis=-1).reshape(-1, 3) * step
    if len(stated) == 2:
        apart = np.linalg.norm(corners @ (stated[0] - stated[1])[:3, :3].T + (stated[0] - stated[1])[:3, 3], axis=1)
        if not apart.max() <= _APART * step.min():
            message = f"sform and qform place the voxels up to {apart.max():.3g} apart; the sform is taken"
            findings.append(Finding("two places", Severity.WARNING, message, value=float(apart.max())))
    matrix = stated[0]
    size = np.linalg.norm(matrix[:3, :3], axis=0)
    return matrix[:3, 3], step * size, matrix[:3, :3] / np.where(size > 0, size, 1.0)


def _check_place(name: str, origin: FloatArray, spacing: FloatArray, directions: FloatArray) -> None:
    """Raise unless the voxels are boxes of finite size at a finite place."""
    if not (np.isfinite(origin).all() and np.isfinite(spacing).all() and (spacing > 0).all()):
        raise FileError(
            name, f"has the origin {origin.tolist()} and the spacing {spacing.tolist()}; finite, above zero, is needed"
        )
    skew = np.abs(directions.T @ directions - np.eye(3)).max()
    if not skew <= _SKEW:
        raise FileError(name, f"axes of the voxels are skew or no unit vectors (by {skew:.3g}); resample the mask")


def _inside(name: str, values: AnyArray) -> tuple[BoolArray, FloatArray]:
    """Where the values are not 0, and which others there are; whole numbers only."""
    if values.dtype.kind == "f":
        broken = values != np.round(values)  # not a number is unlike itself
        if broken.any() or np.isinf(values).any():
            shown = values[broken][0] if broken.any() else np.inf
            raise FileError(
                name, f"holds the value {shown:g}; a mask says inside or outside by whole numbers: threshold it"
            )
    inside = values != 0
    if not inside.any():
        raise FileError(name, "holds no voxel other than 0; a mask of the lumen is needed")
    return inside, np.unique(values[inside]).astype(np.float64)


def _notes(labels: FloatArray) -> list[Finding]:
    """That several labels are taken together."""
    if len(labels) < 2:
        return []
    shown = ", ".join(f"{label:g}" for label in labels[:_LABELS_SHOWN]) + (", …" if len(labels) > _LABELS_SHOWN else "")
    message = f"{len(labels)} labels ({shown}) all count as lumen"
    return [Finding("several labels", Severity.NOTE, message, value=len(labels))]
