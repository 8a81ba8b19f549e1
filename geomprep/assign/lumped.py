"""Lumped resistance, inertance and compliance of every segment at the imaged state."""

from __future__ import annotations

import numpy as np

from geomprep.assign.losses import segment_resistance
from geomprep.errors import InputError
from geomprep.laws import lumped, tube
from geomprep.model import Basis, FloatArray, Lumped, Network, Origin

__all__ = ["imaged_wave_speed", "lump"]

_ORIGINS = (
    Origin(
        "segments.lumped.resistance",
        Basis.DERIVED,
        "segments.integrals.inverse_fourth_power, segments.friction_shape, blood.viscosity, blood.velocity_profile",
    ),
    Origin("segments.lumped.inertance", Basis.DERIVED, "segments.integrals.inverse_area, blood.density"),
    Origin(
        "segments.lumped.compliance",
        Basis.DERIVED,
        "stations.area, stations.reference_area, stations.stiffness, tube_laws.m, tube_laws.n",
    ),
)


def lump(network: Network) -> tuple[Lumped, tuple[Origin, ...]]:
    """Find the lumped values of every segment.

    R = 2 (z + 2) μ/π · friction shape · ∫ ds/r⁴ and L = ρ ∫ ds/A are exact for a radius linear between stations.
    C = ∫ A/(ρc²) ds with c of each station's own law at the imaged area: exact where the
    distensibility 1/(ρc²) is linear between stations (constant c, constant E h), else of second
    order in the station spacing (:func:`geomprep.laws.lumped.compliance`).

    Parameters
    ----------
    network : Network
        With `measures`, `blood` and `walls` filled.

    Returns
    -------
    lumped : Lumped
    origins : tuple of Origin

    Raises
    ------
    InputError
        A table is missing.

    Examples
    --------
    See ``tests/assign/test_lumped.py`` for whole networks.
    """
    if network.measures is None or network.blood is None or network.walls is None:
        missing = [name for name in ("measures", "blood", "walls") if getattr(network, name) is None]
        raise InputError(f"lumped values need the tables measures, blood and walls; missing: {', '.join(missing)}")
    blood, stations = network.blood, network.stations
    distensibility = lumped.distensibility(imaged_wave_speed(network), blood.density)
    values = Lumped(
        segment_resistance(network),
        lumped.inertance(network.measures.inverse_area, blood.density),
        lumped.compliance(stations.distance, stations.radius, distensibility, stations.offsets),
    )
    return values, (*_ORIGINS, *_shape_origins(network.segments.friction_shape))


def _shape_origins(friction_shape: FloatArray) -> tuple[Origin, ...]:
    """Where the shapes above 1 come from; 1 is the circle that the stations' areas stand for."""
    rows = tuple(np.flatnonzero(friction_shape > 1).tolist())
    return (Origin("segments.friction_shape", Basis.MEASURED, "lumen surface of the input", rows),) if rows else ()


def imaged_wave_speed(network: Network) -> FloatArray:
    """Return the wave speed of every station at its imaged area, m/s.

    Parameters
    ----------
    network : Network
        With `blood` and `walls` filled.

    Returns
    -------
    (k,) float array

    Raises
    ------
    InputError
        A table is missing.
    """
    if network.blood is None or network.walls is None:
        raise InputError("wave speeds need the tables blood and walls; assign them first")
    walls, area = network.walls, network.stations.area
    speed, law = np.empty(len(area)), walls.law[network.stations.segment]
    for number, one in enumerate(walls.laws):
        here = law == number
        speed[here] = tube.wave_speed(
            area[here],
            walls.reference_area[here],
            walls.stiffness[here],
            network.blood.density,
            (one.m, one.n),
            one.form,
        )
    return speed
