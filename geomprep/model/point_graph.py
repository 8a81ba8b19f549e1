"""Points and edges after joining and repair: one graph, every input point accounted for."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.model.arrays import BoolArray, FloatArray, IntArray, Uint8Array, frozen, same_length

__all__ = ["PointGraph"]


@dataclass(frozen=True, eq=False)
class PointGraph:
    """Centreline points as a graph: parallel edges and self-loops allowed, points in SI.

    Attributes
    ----------
    points : (n, 3) float array
        Positions in metres.
    radius : (n,) float array
        Radius in metres.
    radius_basis : (n,) uint8 array
        :class:`geomprep.model.basis.Basis` of each radius.
    vessel_class : (n,) uint8 array
        Code in :data:`geomprep.model.basis.VESSEL_CLASSES`.
    input_id : (n,) uint8 array
        Number of the input a point comes from.
    protected : (n,) bool array
        True where a repair must leave the point alone (a name or a measured flow sits there).
    source_point : (n,) int array
        Raw point that stands for this one (its coordinates are the anchor of ids);
        −1 for an inserted point.
    edges : (e, 2) int array
        Point numbers of the two ends.
    edge_basis : (e,) uint8 array
        Basis of each edge: measured where a file drew it, interpolated where a repair did.
    merged_into : (n_raw,) int array
        For each raw point the graph point it ended in; −1 − repair number where it was
        dropped; :data:`UNUSED` where no line uses it.
    raw_points : (n_raw, 3) array
        Coordinates exactly as in the files.
    own_radius_edge, own_radius_end : (k,) int array
        Edge and end (0 or 1) at which a line stated another radius than the merged point has.
    own_radius : (k,) float array
        That radius in metres; stations at this end of this edge use it.
    """

    points: FloatArray
    radius: FloatArray
    radius_basis: Uint8Array
    vessel_class: Uint8Array
    input_id: Uint8Array
    protected: BoolArray
    source_point: IntArray
    edges: IntArray
    edge_basis: Uint8Array
    merged_into: IntArray
    raw_points: npt.NDArray[Any]
    own_radius_edge: IntArray
    own_radius_end: IntArray
    own_radius: FloatArray

    UNUSED = np.iinfo(np.int64).min
    """Value in `merged_into` of a raw point that no line uses."""

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        raw = np.asarray(self.raw_points)
        for name, dtype, tail in _FIELDS:
            object.__setattr__(self, name, frozen(name, getattr(self, name), dtype, tail))
        object.__setattr__(self, "raw_points", frozen("raw_points", raw, raw.dtype, (3,)))
        same_length(points=self.points, radius=self.radius, radius_basis=self.radius_basis, source=self.source_point)
        same_length(points=self.points, vessel_class=self.vessel_class, input_id=self.input_id, kept=self.protected)
        same_length(edges=self.edges, edge_basis=self.edge_basis)
        same_length(raw_points=self.raw_points, merged_into=self.merged_into)
        same_length(edge=self.own_radius_edge, end=self.own_radius_end, own_radius=self.own_radius)
        if self.edges.size and not (self.edges.min() >= 0 and self.edges.max() < len(self.points)):
            raise InputError(f"an edge names a point outside 0…{len(self.points) - 1}")

    @property
    def n_points(self) -> int:
        """Number of points."""
        return len(self.points)

    @property
    def n_edges(self) -> int:
        """Number of edges."""
        return len(self.edges)


_FIELDS: tuple[tuple[str, npt.DTypeLike, tuple[int, ...]], ...] = (
    ("points", np.float64, (3,)),
    ("radius", np.float64, ()),
    ("radius_basis", np.uint8, ()),
    ("vessel_class", np.uint8, ()),
    ("input_id", np.uint8, ()),
    ("protected", np.bool_, ()),
    ("source_point", np.int64, ()),
    ("edges", np.int64, (2,)),
    ("edge_basis", np.uint8, ()),
    ("merged_into", np.int64, ()),
    ("own_radius_edge", np.int64, ()),
    ("own_radius_end", np.int64, ()),
    ("own_radius", np.float64, ()),
)
