"""Whether the steady check of a network file solves its own equations, from the file alone."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, Final

import numpy as np

from geomprep.errors import ModelError
from geomprep.export.checks.faults import Fault
from geomprep.laws.blood import momentum_factor
from geomprep.laws.lumped import inertance, resistance
from geomprep.solve import Boundary, solve_between

__all__ = ["lumped_faults", "steady_faults"]

_EXACT: Final = 1e-9


def lumped_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find blood factors, resistances and inertances that do not follow from what the file says beside them."""
    blood = flat["blood"]
    profile = blood["velocity_profile"]
    for name, value in (("momentum_factor", momentum_factor(profile)), ("friction_factor", 2.0 * (profile + 2.0))):
        if abs(blood[name] / value - 1.0) > _EXACT:
            yield Fault("steady check", f"blood.{name}", f"{blood[name]:.9g}; the velocity profile gives {value:.9g}")
    integrals, lumped, shape = flat["segments.integrals"], flat["segments.lumped"], flat["segments"]["friction_shape"]
    expected = {
        "resistance": shape * resistance(integrals["inverse_fourth_power"], blood["viscosity"], profile),
        "inertance": inertance(integrals["inverse_area"], blood["density"]),
    }
    for name, values in expected.items():
        off = np.flatnonzero(~(np.abs(lumped[name] / values - 1.0) <= _EXACT))
        if off.size:
            row = off[0]
            message = f"{lumped[name][row]:.9g}; integrals, friction shapes and blood give {values[row]:.9g}"
            yield Fault("steady check", f"segments.lumped.{name}[{row}]", message)


def steady_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Solve the steady state from resistances, heights and ends, and hold it against what the file says."""
    check, segments = flat["steady_check"], flat["segments"]
    gravity = float(np.linalg.norm(flat["conventions"]["gravity"]))
    column = flat["blood"]["density"] * gravity * flat["nodes"]["height"]
    conductance = 1.0 / flat["segments.lumped"]["resistance"]
    edges = np.asarray(segments["from_node"]), np.asarray(segments["to_node"]), conductance
    try:
        found = solve_between(len(column), *edges, _boundary(flat, column))
    except ModelError as error:
        yield Fault("steady check", "steady_check", f"its equations have no solution: {error}")
        return
    inlets = len(flat["inlets"])
    pairs = {
        "pressure": (found.head - column, check["pressure"]),
        "flow": (found.flow, check["flow"]),
        "inlet_flow": (found.inflow[:inlets], check["inlet_flow"]),
        "outlet_flow": (-found.inflow[inlets:], check["outlet_flow"]),
    }
    flows = max(float(np.abs(found.flow).max(initial=0.0)), float(np.abs(found.inflow).max(initial=0.0)))
    heads = float(np.ptp(found.head)) or 1.0
    for name, (ours, said) in pairs.items():
        scale = max(heads, float(np.abs(ours).max(initial=0.0))) if name == "pressure" else flows or 1.0
        apart = np.abs(ours - said) / scale
        worst = int(np.argmax(apart)) if apart.size else 0
        if apart.size and not apart[worst] <= check["tolerance"]:
            message = f"{said[worst]:.9g}; solving its equations gives {ours[worst]:.9g}"
            yield Fault("steady check", f"steady_check.{name}[{worst}]", message)


def _boundary(flat: Mapping[str, Any], column: Any) -> Boundary:
    """Inlets, then outlets, as ends in terms of head."""
    inlets, outlets = flat["inlets"], flat["outlets"]
    node = np.array([record["node"] for record in (*inlets, *outlets)], dtype=np.int64)
    flow = [np.nan if record["mean_flow"] is None else record["mean_flow"] for record in inlets]
    pressure = [0.0 if record["pressure"] is None else record["pressure"] for record in inlets]
    far = [record["far_pressure"] for record in outlets]
    behind = [
        (record["characteristic_resistance"] or 0.0) + (record["peripheral_resistance"] or 0.0) for record in outlets
    ]
    return Boundary(
        node=node,
        inflow=np.array([*flow, *(np.nan for _ in outlets)], dtype=np.float64),
        head=np.array([*pressure, *far], dtype=np.float64) + column[node],
        resistance=np.array([*(0.0 for _ in inlets), *behind], dtype=np.float64),
    )
