"""Whether heights, lengths, volumes and integrals follow from positions and stations."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from geomprep.curves import line_sums, piece_integrals, pieces
from geomprep.export.checks.faults import Fault

__all__ = ["height_faults", "junction_area_faults", "measure_faults"]

_EXACT: Final = 1e-9
_OF_INTEGRALS: Final = {
    ("segments", "volume"): 0,
    ("segments", "lateral_area"): 1,
    ("segments.integrals", "inverse_area"): 2,
    ("segments.integrals", "inverse_fourth_power"): 3,
}
"""Table and field -> column of :func:`geomprep.curves.piece_integrals`."""


def height_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find nodes whose heights do not follow from their positions and gravity."""
    position, height = flat["nodes"]["position"], flat["nodes"]["height"]
    gravity = np.asarray(flat["conventions"]["gravity"])
    size = float(np.linalg.norm(gravity))
    # the reference plane is the file's own choice: the first node sets it
    rise = (position[:1] - position) @ (gravity / size if size else gravity)
    expected = rise + (height[0] if size else 0.0)
    limit = _EXACT * max(1.0, float(np.abs(position).max(initial=0.0)))
    off = np.flatnonzero(~(np.abs(height - expected) <= limit))
    if off.size:
        row = int(off[0])
        rule = "0 where no gravity is modelled" if size == 0.0 else "against gravity, counted as at node 0, it is"
        shown = "" if size == 0.0 else f" {expected[row]:.9g} m"
        yield Fault("heights", f"nodes.height[{row}]", f"{height[row]:.9g} m; {rule}{shown}")


def measure_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find numbers of segments that do not follow from their stations, and chords longer than their arc."""
    stations, offsets = flat["stations"], np.asarray(flat["stations"]["offsets"])
    distance, radius, position = stations["distance"], stations["radius"], stations["position"]
    piece = pieces(offsets)
    step = distance[piece.first + 1] - distance[piece.first]
    chord = np.linalg.norm(position[piece.first + 1] - position[piece.first], axis=1)
    scale = np.maximum(step, np.abs(position).max(initial=0.0) * 1e-6)
    long = np.flatnonzero(chord > step + _EXACT * scale)
    if long.size:
        row = int(piece.first[long[0]]) + 1
        message = f"{step[long[0]]:.9g} m from the station before, which lies {chord[long[0]]:.9g} m away"
        yield Fault("stations", f"stations.distance[{row}]", message)
    sums = line_sums(piece_integrals(step, radius[piece.first], radius[piece.first + 1]), piece.starts)
    for (table, name), column in _OF_INTEGRALS.items():
        yield from _unlike(f"{table}.{name}", flat[table][name], sums[:, column])
    length, radii = flat["segments"]["length"], flat["segments.radii"]
    yield from _unlike("segments.radii.for_resistance", radii["for_resistance"], (length / sums[:, 3]) ** 0.25)
    yield from _unlike("segments.radii.for_volume", radii["for_volume"], np.sqrt(sums[:, 0] / (np.pi * length)))
    yield from _unlike("segments.radii.minimum", radii["minimum"], np.minimum.reduceat(radius, offsets[:-1]))


def junction_area_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find areas of segment ends at junctions that are not those of their stations."""
    junctions, offsets = flat["junctions"], np.asarray(flat["stations"]["offsets"])
    segment = np.asarray(junctions["segment"], dtype=np.int64)
    starts = np.array([end == "from" for end in junctions["end"]], dtype=np.bool_)
    station = np.where(starts, offsets[segment], offsets[segment + 1] - 1)
    yield from _unlike("junctions.area", junctions["area"], flat["stations"]["area"][station])


def _unlike(place: str, said: npt.NDArray[Any], expected: npt.NDArray[Any]) -> Iterator[Fault]:
    """Fault of the first number that differs from what follows from the stations."""
    off = np.flatnonzero(~(np.abs(said - expected) <= _EXACT * np.abs(expected)))
    if off.size:
        row = int(off[0])
        yield Fault("stations", f"{place}[{row}]", f"{said[row]:.9g}; its stations give {expected[row]:.9g}")
