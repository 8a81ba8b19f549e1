"""The network: tables of arrays that the stages fill one after the other.

Nodes, segments and stations exist from the start; every later table is None until its
stage has run. A stage takes a network and returns a new one (``dataclasses.replace``).
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from geomprep.errors import InputError
from geomprep.model.arrays import FloatArray, IntArray, TextArray, Uint8Array, frozen, same_length, texts
from geomprep.model.basis import Basis
from geomprep.model.parameters import Blood, Inlet, Outlet, Surroundings, TubeLaw
from geomprep.model.quality import Narrowing, SegmentBending, SegmentIntervals, SegmentProfiles, SegmentResolution

__all__ = [
    "NODE_ROLES",
    "Cuts",
    "Junctions",
    "Lumped",
    "Measures",
    "Network",
    "Nodes",
    "Origin",
    "Segments",
    "Stations",
    "Walls",
]

NODE_ROLES = ("interior", "junction", "open end", "inlet", "outlet")
"""Name in files of each node role code. ``open end`` remains only until inlets and outlets are set."""


@dataclass(frozen=True)
class Origin:
    """Where the numbers of one field come from.

    Attributes
    ----------
    field : str
        ``table.field`` as named in the fields table, such as ``segments.length``.
    basis : Basis
    detail : str
        What the basis leads to: the literature key for ``published`` and ``population``,
        the case key for ``user``, the input fields for ``derived`` and ``interpolated``, the
        input array for ``measured``.
    rows : tuple of int
        Rows that differ from the default of the field; empty means all rows.
    """

    field: str
    basis: Basis
    detail: str
    rows: tuple[int, ...] = ()


@dataclass(frozen=True, eq=False)
class Nodes:
    """Ends of segments, in canonical order (raw coordinates).

    Attributes
    ----------
    id : (n,) str array
    position : (n, 3) float array
        Metres, in the frame of the input.
    height : (n,) float array
        Metres above the reference plane, against gravity; 0 where no gravity is modelled.
    role : (n,) uint8 array
        Code in :data:`NODE_ROLES`.
    source_point : (n,) int array
        Raw point that anchors the id.
    """

    id: TextArray
    position: FloatArray
    height: FloatArray
    role: Uint8Array
    source_point: IntArray

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        put = object.__setattr__
        put(self, "id", texts("id", self.id))
        put(self, "position", frozen("position", self.position, np.float64, (3,)))
        put(self, "height", frozen("height", self.height, np.float64))
        put(self, "role", frozen("role", self.role, np.uint8))
        put(self, "source_point", frozen("source_point", self.source_point, np.int64))
        same_length(id=self.id, position=self.position, height=self.height, role=self.role, source=self.source_point)

    def __len__(self) -> int:
        """Return the number of nodes."""
        return len(self.id)


@dataclass(frozen=True, eq=False)
class Segments:
    """Vessel pieces between two nodes, in canonical order.

    Attributes
    ----------
    id, name : (s,) str array
        The name is empty where none is known; several segments may share one (a vessel).
    from_node, to_node : (s,) int array
        Positive flow runs from → to.
    vessel_class, input_id : (s,) uint8 array
    strahler_order, horsfield_order, generation : (s,) int array
        −1 where undefined (on loops, or not reachable from an inlet).
    friction_shape : (s,) float array
        Resistance over that of circles of the same areas, 1 or above; ones where it is not given.
    """

    id: TextArray
    name: TextArray
    from_node: IntArray
    to_node: IntArray
    vessel_class: Uint8Array
    input_id: Uint8Array
    strahler_order: IntArray
    horsfield_order: IntArray
    generation: IntArray
    friction_shape: FloatArray = field(default_factory=lambda: np.empty(0))

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        put = object.__setattr__
        for name in ("id", "name"):
            put(self, name, texts(name, getattr(self, name)))
        shape = self.friction_shape if len(self.friction_shape) else np.ones(len(self.id))
        put(self, "friction_shape", frozen("friction_shape", shape, np.float64))
        for name in ("from_node", "to_node", "strahler_order", "horsfield_order", "generation"):
            put(self, name, frozen(name, getattr(self, name), np.int64))
        for name in ("vessel_class", "input_id"):
            put(self, name, frozen(name, getattr(self, name), np.uint8))
        same_length(**{name: getattr(self, name) for name in self.__dataclass_fields__})

    def __len__(self) -> int:
        """Return the number of segments."""
        return len(self.id)


@dataclass(frozen=True, eq=False)
class Stations:
    """Samples along all segments, from their first node to their last.

    Radius is linear between stations; area is π·radius² and governs.

    Attributes
    ----------
    offsets : (s + 1,) int array
        Segment i holds stations ``offsets[i]:offsets[i + 1]``, at least two.
    distance : (k,) float array
        Metres along the segment from its first node, rising from 0 to its length.
    position : (k, 3) float array
    radius : (k,) float array
        Equal-area radius in metres, > 0.
    basis : (k,) uint8 array
        :class:`geomprep.model.basis.Basis` of each radius.
    """

    offsets: IntArray
    distance: FloatArray
    position: FloatArray
    radius: FloatArray
    basis: Uint8Array

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        put = object.__setattr__
        put(self, "offsets", frozen("offsets", self.offsets, np.int64))
        put(self, "distance", frozen("distance", self.distance, np.float64))
        put(self, "position", frozen("position", self.position, np.float64, (3,)))
        put(self, "radius", frozen("radius", self.radius, np.float64))
        put(self, "basis", frozen("basis", self.basis, np.uint8))
        same_length(distance=self.distance, position=self.position, radius=self.radius, basis=self.basis)

    def __len__(self) -> int:
        """Return the number of stations."""
        return len(self.distance)

    @property
    def area(self) -> FloatArray:
        """(k,) lumen area in square metres."""
        return np.pi * self.radius**2

    @property
    def segment(self) -> IntArray:
        """(k,) segment number of each station."""
        return np.repeat(np.arange(len(self.offsets) - 1), np.diff(self.offsets))


class _FloatTable:
    """Shared behaviour of tables whose fields are all float arrays of one length."""

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        names = self.__dataclass_fields__  # type: ignore[attr-defined]
        for name in names:
            object.__setattr__(self, name, frozen(name, getattr(self, name), np.float64))
        same_length(**{name: getattr(self, name) for name in names})


@dataclass(frozen=True, eq=False)
class Measures(_FloatTable):
    """Geometry of each segment, (s,) arrays in SI, from the stations alone.

    Attributes
    ----------
    length, volume, lateral_area : (s,) float array
    inverse_area : (s,) float array
        ∫ ds/A in 1/m (inertance per density).
    inverse_fourth_power : (s,) float array
        ∫ ds/r⁴ in 1/m³ (resistance times π/(8 μ) for a parabolic profile).
    radius_at_from, radius_at_to : (s,) float array
    radius_for_resistance : (s,) float array
        Radius of the cylinder of equal length and ∫ ds/r⁴.
    radius_for_volume : (s,) float array
        Radius of the cylinder of equal length and volume.
    minimum_radius, median_radius : (s,) float array
        The median is weighted by length.
    taper : (s,) float array
        Slope of the length-weighted straight-line fit of r(s), metre per metre; > 0 widens from → to.
    tortuosity : (s,) float array
        Length over straight distance of the ends; 0 where the ends coincide (undefined).
    """

    length: FloatArray
    volume: FloatArray
    lateral_area: FloatArray
    inverse_area: FloatArray
    inverse_fourth_power: FloatArray
    radius_at_from: FloatArray
    radius_at_to: FloatArray
    radius_for_resistance: FloatArray
    radius_for_volume: FloatArray
    minimum_radius: FloatArray
    median_radius: FloatArray
    taper: FloatArray
    tortuosity: FloatArray


@dataclass(frozen=True, eq=False)
class Cuts:
    """What was taken off each segment because it lies inside its parents.

    Attributes
    ----------
    convention : str
        Where a vessel starts: ``node``, ``lumen exit`` or ``change point``.
    at_from, at_to : (s,) float array
        Length taken off at the two ends, m: between the node and the first or last station.
    share_inside : (s,) float array
        Length within the lumen of the parents over the whole length.
    link : (s,) uint8 array
        1 where half of the segment or more lies inside, or it joins forks of one junction: what is left is a
        resistance, no vessel.
    """

    convention: str
    at_from: FloatArray
    at_to: FloatArray
    share_inside: FloatArray
    link: Uint8Array

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        put = object.__setattr__
        for name in ("at_from", "at_to", "share_inside"):
            put(self, name, frozen(name, getattr(self, name), np.float64))
        put(self, "link", frozen("link", self.link, np.uint8))
        same_length(at_from=self.at_from, at_to=self.at_to, share_inside=self.share_inside, link=self.link)


@dataclass(frozen=True, eq=False)
class Junctions:
    """How segment ends meet at nodes of degree 2 or more.

    Attributes
    ----------
    node : (j,) int array
    offsets : (j + 1,) int array
        Ends of junction i are rows ``offsets[i]:offsets[i + 1]`` of the other fields.
    segment : (t,) int array
    end : (t,) uint8 array
        0 where the segment starts here (from), 1 where it ends here (to).
    direction : (t, 3) float array
        Unit vector that points from the node into the segment.
    area : (t,) float array
        Lumen area of the segment at this end, m².
    """

    node: IntArray
    offsets: IntArray
    segment: IntArray
    end: Uint8Array
    direction: FloatArray
    area: FloatArray


@dataclass(frozen=True, eq=False)
class Walls:
    """Tube law and reference state of every station.

    Attributes
    ----------
    laws : tuple of TubeLaw
        The laws in use.
    law : (s,) int array
        Number of each segment's law in `laws`.
    reference_state : (s,) str array
        ``imaged`` or ``buckling``: how the reference area was found.
    reference_area : (k,) float array
        A0 in m².
    stiffness : (k,) float array
        K in Pa.
    reference_transmural : (k,) float array
        Transmural pressure at which A = A0, Pa.
    imaging_transmural : (k,) float array
        Transmural pressure while imaged, Pa: the law gives the imaged area there.
    surroundings : (k,) int array
        Number of the surroundings of each station.
    """

    laws: tuple[TubeLaw, ...]
    law: IntArray
    reference_state: TextArray
    reference_area: FloatArray
    stiffness: FloatArray
    reference_transmural: FloatArray
    imaging_transmural: FloatArray
    surroundings: IntArray


@dataclass(frozen=True, eq=False)
class Lumped(_FloatTable):
    """Lumped values of each segment at the imaged state, SI.

    Attributes
    ----------
    resistance, inertance, compliance : (s,) float array
        Pa·s/m³, Pa·s²/m³, m³/Pa.
    """

    resistance: FloatArray
    inertance: FloatArray
    compliance: FloatArray


@dataclass(frozen=True, eq=False)
class Network:
    """A vessel network; tables that a later stage adds are None until then."""

    nodes: Nodes
    segments: Segments
    stations: Stations
    measures: Measures | None = None
    cuts: Cuts | None = None
    profiles: SegmentProfiles | None = None
    bending: SegmentBending | None = None
    resolution: SegmentResolution | None = None
    intervals: SegmentIntervals | None = None
    narrowings: tuple[Narrowing, ...] | None = None
    junctions: Junctions | None = None
    blood: Blood | None = None
    surroundings: tuple[Surroundings, ...] | None = None
    walls: Walls | None = None
    lumped: Lumped | None = None
    inlets: tuple[Inlet, ...] | None = None
    outlets: tuple[Outlet, ...] | None = None
    origins: tuple[Origin, ...] = ()

    def __post_init__(self) -> None:
        """Check that the tables belong together."""
        same_length(segments=self.segments.id, stations=self.stations.offsets[1:])
        ends = np.concatenate((self.segments.from_node, self.segments.to_node))
        if ends.size and not (ends.min() >= 0 and ends.max() < len(self.nodes)):
            raise InputError(f"a segment names a node outside 0…{len(self.nodes) - 1}")

    def __repr__(self) -> str:
        """Return sizes and the tables that are filled."""
        filled = [name for name in self.__dataclass_fields__ if getattr(self, name) not in (None, ())]
        more = "".join(f", {name}" for name in filled[3:])
        return f"Network({len(self.nodes)} nodes, {len(self.segments)} segments, {len(self.stations)} stations{more})"
