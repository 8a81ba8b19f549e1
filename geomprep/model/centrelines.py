"""What the files say: points, sizes and lines, in SI, before anything is joined."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.model.arrays import FloatArray, IntArray, Uint8Array, frozen, same_length

__all__ = ["Centrelines", "concatenate"]


@dataclass(frozen=True, eq=False)
class Centrelines:
    """Lines through points with a radius, of one or several inputs, in SI.

    Lines may share points (a file whose branches use the same point number) or each
    hold a copy of its own; nothing is merged here.

    Attributes
    ----------
    points : (n, 3) float array
        Positions in metres in the frame of the input.
    radius : (n,) float array
        Radius in metres at each point, as stated by the file and the case; may be
        zero, negative or NaN where the file says so.
    raw_points : (n, 3) float32 or float64 array
        Coordinates exactly as in the file; stable ids are hashes of these.
    connectivity : (k,) int array
        Point numbers along all lines, one line after the other.
    offsets : (m + 1,) int array
        Line i is ``connectivity[offsets[i]:offsets[i + 1]]``.
    vessel_class : (m,) uint8 array
        Code of each line in :data:`geomprep.model.basis.VESSEL_CLASSES`.
    input_id : (m,) uint8 array
        Number of the input that each line comes from.
    radius_basis : (n,) uint8 array
        :class:`geomprep.model.basis.Basis` of each radius.
    line_radius : (m,) float array, optional
        Radius stated per line (a size on cells) in metres; then `radius` was made from it.
    extra : dict of str to array
        Further point arrays of the file, as they are, (n, ...).
    """

    points: FloatArray
    radius: FloatArray
    raw_points: npt.NDArray[Any]
    connectivity: IntArray
    offsets: IntArray
    vessel_class: Uint8Array
    input_id: Uint8Array
    radius_basis: Uint8Array
    line_radius: FloatArray | None = None
    extra: dict[str, npt.NDArray[Any]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        raw = np.asarray(self.raw_points)
        put = object.__setattr__
        put(self, "points", frozen("points", self.points, np.float64, (3,)))
        put(self, "radius", frozen("radius", self.radius, np.float64))
        put(self, "raw_points", frozen("raw_points", raw, raw.dtype, (3,)))
        put(self, "connectivity", frozen("connectivity", self.connectivity, np.int64))
        put(self, "offsets", frozen("offsets", self.offsets, np.int64))
        put(self, "vessel_class", frozen("vessel_class", self.vessel_class, np.uint8))
        put(self, "input_id", frozen("input_id", self.input_id, np.uint8))
        put(self, "radius_basis", frozen("radius_basis", self.radius_basis, np.uint8))
        if self.line_radius is not None:
            put(self, "line_radius", frozen("line_radius", self.line_radius, np.float64))
        same_length(points=self.points, radius=self.radius, raw_points=self.raw_points, basis=self.radius_basis)
        same_length(lines=self.offsets[1:], vessel_class=self.vessel_class, input_id=self.input_id)
        _check_lines(self.connectivity, self.offsets, len(self.points))

    @classmethod
    def of_lines(
        cls, lines: Sequence[npt.ArrayLike], radius: float | Sequence[npt.ArrayLike], vessel_class: int = 1
    ) -> Centrelines:
        """Return the centrelines of lines given as arrays, each with points of its own.

        Parameters
        ----------
        lines : sequence of (n, 3) array_like
            Metres.
        radius : float or sequence of float or (n,) array_like
            One for all lines, or one (or one per point) for each, metres.
        vessel_class : int
            Code in :data:`geomprep.model.basis.VESSEL_CLASSES` of all lines.

        Examples
        --------
        >>> z = np.linspace(0, 0.02, 5)[:, None] * [0, 0, 1.0]
        >>> Centrelines.of_lines([z, z + [0.01, 0, 0]], [1e-3, 2e-3]).radius.tolist()[4:6]
        [0.001, 0.002]
        """
        places = [np.asarray(line, np.float64).reshape(-1, 3) for line in lines]
        given = [radius] * len(places) if isinstance(radius, (int, float)) else radius
        sizes = [
            np.broadcast_to(np.asarray(one, np.float64), len(place)) for one, place in zip(given, places, strict=True)
        ]
        points = np.concatenate(places)
        return cls(
            points=points,
            radius=np.concatenate(sizes),
            raw_points=points,
            connectivity=np.arange(len(points)),
            offsets=np.concatenate(([0], np.cumsum([len(place) for place in places]))),
            vessel_class=np.full(len(places), vessel_class, np.uint8),
            input_id=np.zeros(len(places), np.uint8),
            radius_basis=np.zeros(len(points), np.uint8),
        )

    @property
    def n_points(self) -> int:
        """Number of points."""
        return len(self.points)

    @property
    def n_lines(self) -> int:
        """Number of lines."""
        return len(self.offsets) - 1


def _check_lines(connectivity: IntArray, offsets: IntArray, n_points: int) -> None:
    """Refuse offsets that do not cut the connectivity, or numbers of points that do not exist."""
    if len(offsets) == 0 or offsets[0] != 0 or offsets[-1] != len(connectivity) or np.any(np.diff(offsets) < 0):
        raise InputError(
            f"offsets must rise from 0 to {len(connectivity)}, the number of point numbers in the lines; "
            f"they run from {offsets[:1]} to {offsets[-1:]}"
        )
    if len(connectivity) and not (connectivity.min() >= 0 and connectivity.max() < n_points):
        bad = connectivity[(connectivity < 0) | (connectivity >= n_points)][0]
        raise InputError(f"a line names point {bad}, but there are {n_points} points, numbered from 0")


def concatenate(parts: list[Centrelines]) -> Centrelines:
    """Put the centrelines of several inputs into one container, inputs numbered in order.

    Raw coordinates of mixed precision are held as float64, which keeps every value.
    Extra arrays are kept only where a single input is given.
    """
    if len(parts) == 1:
        return parts[0]
    starts = np.cumsum([0] + [part.n_points for part in parts])
    line_starts = np.cumsum([0] + [len(part.connectivity) for part in parts])
    own_radius = [np.full(part.n_lines, np.nan) if part.line_radius is None else part.line_radius for part in parts]
    return Centrelines(
        points=np.concatenate([part.points for part in parts]),
        radius=np.concatenate([part.radius for part in parts]),
        raw_points=np.concatenate([part.raw_points for part in parts]),
        connectivity=np.concatenate([part.connectivity + start for part, start in zip(parts, starts, strict=False)]),
        offsets=np.concatenate(
            [[0], *[part.offsets[1:] + start for part, start in zip(parts, line_starts, strict=False)]]
        ),
        vessel_class=np.concatenate([part.vessel_class for part in parts]),
        input_id=np.concatenate([np.full(part.n_lines, number) for number, part in enumerate(parts)]),
        radius_basis=np.concatenate([part.radius_basis for part in parts]),
        line_radius=None if all(part.line_radius is None for part in parts) else np.concatenate(own_radius),
    )
