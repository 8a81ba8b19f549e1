"""Whether the tube laws give the imaged areas, and the lumped compliances follow from them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, Final

import numpy as np

from geomprep.export.checks.faults import Fault
from geomprep.laws.lumped import compliance
from geomprep.laws.tube import pressure, slope

__all__ = ["wall_faults"]

_IMAGED: Final = 1e-8
_EXACT: Final = 1e-9


def wall_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find stations whose tube law does not give the imaged area at the imaged pressure, and wrong compliances."""
    stations, offsets = flat["stations"], np.asarray(flat["stations"]["offsets"])
    owner = np.repeat(np.arange(len(offsets) - 1), np.diff(offsets))
    of_segment = np.array(flat["segments"]["tube_law"], dtype=object)
    steep = np.ones(len(owner))
    for law in flat["tube_laws"]:
        rows = np.flatnonzero((of_segment == law["id"])[owner])
        area, reference, stiffness, zero, imaged = (stations[name][rows] for name in _COLUMNS)
        shape = (law["m"], law["n"])
        found = pressure(area, reference, stiffness, zero, shape, law["form"])
        steep[rows] = slope(area, reference, stiffness, shape, law["form"]) * area
        bad = np.flatnonzero(~(np.abs(found - imaged) / steep[rows] <= _IMAGED))  # relative error of the area
        if bad.size:
            message = f"{imaged[bad[0]]:.6g} Pa; the law '{law['id']}' has the imaged area at {found[bad[0]]:.6g} Pa"
            yield Fault("wall law", f"stations.imaging_transmural[{rows[bad[0]]}]", message)
            return
    said = flat["segments.lumped"]["compliance"]
    expected = compliance(stations["distance"], stations["radius"], 1.0 / steep, offsets)
    off = np.flatnonzero(~(np.abs(said / expected - 1.0) <= _EXACT))
    if off.size:
        message = f"{said[off[0]]:.9g} m3/Pa; the tube laws of its stations give {expected[off[0]]:.9g}"
        yield Fault("wall law", f"segments.lumped.compliance[{off[0]}]", message)


_COLUMNS: Final = ("area", "reference_area", "stiffness", "reference_transmural", "imaging_transmural")
