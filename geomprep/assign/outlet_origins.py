"""Where every number of every outlet comes from."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from geomprep.assign.calibration import Calibrated
from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.origins import origins_by_rows
from geomprep.assign.surroundings import ATMOSPHERE_SOURCE
from geomprep.model import Basis, Origin, Outlet

__all__ = ["outlet_origins"]

_KEYS: Final[dict[str, tuple[str, ...]]] = {
    "far_pressure": ("pressure", "far_pressure"),
    "characteristic_resistance": ("characteristic_resistance",),
    "peripheral_resistance": ("peripheral_resistance", "resistance"),
    "compliance": ("compliance",),
    "share": ("share", "mean_flow"),
}
"""Field of an outlet -> keys of its entry that state it."""


def outlet_origins(
    outlets: Sequence[Outlet],
    ends: Ends,
    settings: Sequence[OutletSettings],
    target: CalibrationSettings,
    found: Calibrated | None,
) -> tuple[Origin, ...]:
    """Return the origins of the outlet table.

    Parameters
    ----------
    outlets : sequence of Outlet
    ends : Ends
    settings : sequence of OutletSettings
        Entries in the order of the case.
    target : CalibrationSettings
    found : Calibrated, optional

    Returns
    -------
    tuple of Origin
    """
    origins: tuple[Origin, ...] = ()
    for field, keys in _KEYS.items():
        filled = np.array([getattr(outlet, field) is not None for outlet in outlets], dtype=np.bool_)
        rows = []
        for number in np.unique(ends.outlet_entries).tolist():
            stated = next((key for key in keys if getattr(settings[number], key) is not None), None)
            basis = (
                (Basis.USER, f"outlets[{number}].{stated}")
                if stated
                else _found(field, target, found.exponent_key if found else "")
            )
            here = filled & (ends.outlet_entries == number)
            windkessel = np.array([outlet.characteristic_resistance is not None for outlet in outlets], dtype=np.bool_)
            if field == "peripheral_resistance" and not stated:
                rows += [(*basis, here & ~windkessel)]
                basis = (basis[0], f"{basis[1]}, outlets.characteristic_resistance")
                here = here & windkessel
            rows.append((*basis, here))
        origins += origins_by_rows(f"outlets.{field}", rows)
    return origins


def _found(field: str, target: CalibrationSettings, exponent_key: str) -> tuple[Basis, str]:
    """Basis of a number that the entry does not state."""
    if field == "far_pressure":
        if target.far_pressure is None:
            return Basis.PUBLISHED, ATMOSPHERE_SOURCE
        return Basis.USER, "calibration.far_pressure"
    if field == "characteristic_resistance":
        return Basis.DERIVED, "blood.density, stations.area, stations.reference_area, stations.stiffness"
    if field == "compliance":
        return Basis.USER, f"calibration.{'compliance' if target.time_constant is None else 'time_constant'}"
    if field == "share":
        if exponent_key:
            return Basis.PUBLISHED, exponent_key
        return Basis.USER, "calibration.split" if target.exponent is None else "calibration.exponent"
    # R = (p − p_far)/Q, with the pressure and the flow that the steady check shows
    return Basis.DERIVED, "steady_check.pressure, steady_check.outlet_flow, outlets.far_pressure"
