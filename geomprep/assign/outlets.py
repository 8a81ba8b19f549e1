"""Where blood leaves: what stands at every outlet, stated or calibrated."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from geomprep.assign.calibration import Calibrated, calibrate
from geomprep.assign.compliance import outlet_compliance
from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.labels import end_segment, node_label
from geomprep.assign.origins import origins_by_rows
from geomprep.errors import CaseError, ModelError
from geomprep.laws.lumped import characteristic_impedance
from geomprep.model import Basis, BoolArray, FloatArray, Network, Origin, Outlet
from geomprep.units import format_quantity

__all__ = ["OUTLET_MODELS", "OutletResult", "assign_outlets"]

Needs = Callable[[OutletSettings], bool]

OUTLET_MODELS: Final[dict[str, Needs]] = {
    "fixed pressure": lambda entry: False,
    "resistance": lambda entry: entry.resistance is None and entry.peripheral_resistance is None,
    "three-element windkessel": lambda entry: entry.resistance is None and entry.peripheral_resistance is None,
}
"""Model of an outlet -> whether its resistance is left to calibration."""


@dataclass(frozen=True)
class OutletResult:
    """The outlets of a network and where their numbers come from."""

    outlets: tuple[Outlet, ...]
    origins: tuple[Origin, ...]


def assign_outlets(
    network: Network,
    ends: Ends,
    settings: Sequence[OutletSettings],
    calibration: CalibrationSettings | None,
    wave_speed: FloatArray,
) -> OutletResult:
    """Make the outlets of a network.

    Parameters
    ----------
    network : Network
        With measures, blood, inlets, lumped values and node heights.
    ends : Ends
        Nodes of the entries.
    settings : sequence of OutletSettings
        Entries in the order of the case.
    calibration : CalibrationSettings, optional
    wave_speed : (k,) float array
        Wave speed at every station at the imaged state, m/s; gives ρc/A.

    Returns
    -------
    OutletResult
        Outlets in the order of ``ends.outlet_nodes``.

    Raises
    ------
    CaseError
        A model is unknown, or a value that it needs is missing.
    ModelError
        A resistance comes out negative, or the characteristic resistance exceeds the total.
    """
    target = calibration or CalibrationSettings()
    complete = {entry: _completed(settings[entry], entry, target) for entry in np.unique(ends.outlet_entries).tolist()}
    entries = [complete[entry] for entry in ends.outlet_entries.tolist()]
    far = np.array([_far_pressure(entry) for entry in entries], dtype=np.float64)
    wanted = np.flatnonzero([OUTLET_MODELS[entry.model or ""](entry) for entry in entries]).astype(np.int64)
    found = None
    if wanted.size:
        _check_calibration(network, ends, entries, calibration, int(wanted[0]))
        found = calibrate(network, ends, entries, target, far, wanted)
    total = _total_resistance(entries, found)
    characteristic = _characteristic(network, ends, entries, wave_speed)
    _check_characteristic(network, ends, entries, characteristic, total)
    compliance = outlet_compliance(network, ends, entries, target, (total, characteristic))
    outlets = tuple(
        _outlet(row, node, entries[row], (far, total, characteristic, compliance), found)
        for row, node in enumerate(ends.outlet_nodes.tolist())
    )
    return OutletResult(outlets, _origins(outlets, ends, settings, found, target))


def _completed(entry: OutletSettings, number: int, target: CalibrationSettings) -> OutletSettings:
    """An entry with the calibration's model and far pressure where it states none."""
    model = entry.model or target.model
    if model is None:
        raise CaseError(f"outlets[{number}].model: missing; choose one of {', '.join(OUTLET_MODELS)}")
    if model not in OUTLET_MODELS:
        raise CaseError(f"outlets[{number}].model = '{model}': unknown; choose one of {', '.join(OUTLET_MODELS)}")
    if model == "fixed pressure" and entry.pressure is None:
        raise CaseError(f"outlets[{number}].pressure: missing; the model 'fixed pressure' needs it")
    far = entry.far_pressure if entry.far_pressure is not None else target.far_pressure
    return replace(entry, model=model, far_pressure=far)


def _far_pressure(entry: OutletSettings) -> float:
    """Pressure behind an outlet: its own at a fixed pressure, else the far one, else the atmosphere."""
    if entry.model == "fixed pressure":
        return float(entry.pressure or 0.0)
    return float(entry.far_pressure or 0.0)


def _check_calibration(
    network: Network,
    ends: Ends,
    entries: list[OutletSettings],
    calibration: CalibrationSettings | None,
    row: int,
) -> None:
    """Refuse an outlet without a resistance where nothing says how to find it."""
    if calibration is None and all(entry.mean_flow is None for entry in entries):
        raise CaseError(
            f"outlet {node_label(network, int(ends.outlet_nodes[row]))}: model '{entries[row].model}' has no "
            "resistance and the case has no [calibration]; give resistance, or total_flow, mean_pressure and "
            "split there"
        )


def _total_resistance(entries: list[OutletSettings], found: Calibrated | None) -> FloatArray:
    """Total resistance of every outlet; the part that is not stated is NaN."""
    total = np.array(
        [
            np.nan if entry.model == "fixed pressure" else entry.resistance if entry.resistance is not None else np.nan
            for entry in entries
        ],
        dtype=np.float64,
    )
    if found is not None:
        total[found.rows] = found.resistance
    return total


def _characteristic(network: Network, ends: Ends, entries: list[OutletSettings], wave_speed: FloatArray) -> FloatArray:
    """First resistance of every windkessel: stated, else ρc/A of the segment that ends there; NaN elsewhere."""
    _, station = end_segment(network, ends.outlet_nodes)
    density = network.blood.density if network.blood else np.nan
    matched = characteristic_impedance(network.stations.area[station], wave_speed[station], density)
    stated = [
        np.nan if entry.characteristic_resistance is None else entry.characteristic_resistance for entry in entries
    ]
    windkessel = np.array([entry.model == "three-element windkessel" for entry in entries], dtype=np.bool_)
    first = np.where(np.isnan(stated), matched, stated)
    return np.where(windkessel, first, np.nan)


def _check_characteristic(
    network: Network, ends: Ends, entries: list[OutletSettings], characteristic: FloatArray, total: FloatArray
) -> None:
    """Refuse a characteristic resistance that leaves nothing for the periphery."""
    bad = np.flatnonzero(characteristic >= total)
    if bad.size == 0:
        return
    row = int(bad[np.argmax(characteristic[bad] / total[bad])])
    node = int(ends.outlet_nodes[row])
    stated = entries[row].characteristic_resistance is not None
    what = "as stated" if stated else "ρc/A of the vessel that ends there"
    raise ModelError(
        f"outlet {node_label(network, node)}: its characteristic resistance ({what}) of "
        f"{format_quantity(float(characteristic[row]), 'mmHg*s/mL')} is not below its total resistance of "
        f"{format_quantity(float(total[row]), 'mmHg*s/mL')}; check radius and wave speed of this vessel, "
        "or its share of the flow"
    )


def _outlet(
    row: int,
    node: int,
    entry: OutletSettings,
    values: tuple[FloatArray, FloatArray, FloatArray, FloatArray],
    found: Calibrated | None,
) -> Outlet:
    """One outlet as the network carries it."""
    far, total, characteristic, compliance = (array[row] for array in values)
    share = None
    if found is not None and row in found.rows:
        share = float(found.share[np.flatnonzero(found.rows == row)[0]])
    model = str(entry.model)
    if model == "fixed pressure":
        return Outlet(node, model, float(far))
    if model == "resistance":
        whole = total if np.isfinite(total) else entry.peripheral_resistance
        return Outlet(node, model, float(far), peripheral_resistance=float(whole or 0.0), share=share)
    peripheral = entry.peripheral_resistance if entry.peripheral_resistance is not None else total - characteristic
    return Outlet(node, model, float(far), float(characteristic), float(peripheral), float(compliance), share)


def _origins(
    outlets: tuple[Outlet, ...],
    ends: Ends,
    settings: Sequence[OutletSettings],
    found: Calibrated | None,
    target: CalibrationSettings,
) -> tuple[Origin, ...]:
    """Where every number of every outlet comes from."""
    origins: tuple[Origin, ...] = ()
    calibrated = np.zeros(len(outlets), np.bool_)
    if found is not None:
        calibrated[found.rows] = True
    for field in ("far_pressure", "characteristic_resistance", "peripheral_resistance", "compliance", "share"):
        filled = np.array([getattr(outlet, field) is not None for outlet in outlets], dtype=np.bool_)
        rows: list[tuple[Basis, str, BoolArray]] = []
        for entry in np.unique(ends.outlet_entries).tolist():
            here = filled & (ends.outlet_entries == entry)
            stated = _stated_key(settings[entry], field, entry)
            if stated:
                rows.append((Basis.USER, stated, here))
            else:
                rows += _found_rows(field, here, calibrated, (found, target))
        origins += origins_by_rows(f"outlets.{field}", rows)
    return origins


def _stated_key(entry: OutletSettings, field: str, number: int) -> str:
    """Key of the case that states this number of this entry, or nothing."""
    names = {
        "far_pressure": ("pressure", "far_pressure"),
        "peripheral_resistance": ("peripheral_resistance", "resistance"),
    }
    if field == "share" and entry.share is None and entry.mean_flow is not None:
        return f"outlets[{number}].mean_flow"
    for name in names.get(field, (field,)):
        if getattr(entry, name) is not None:
            return f"outlets[{number}].{name}"
    return ""


def _found_rows(
    field: str, here: BoolArray, calibrated: BoolArray, how: tuple[Calibrated | None, CalibrationSettings]
) -> list[tuple[Basis, str, BoolArray]]:
    """Basis of numbers that the entry does not state."""
    found, target = how
    if field == "peripheral_resistance":
        losses = "segments.lumped.resistance, outlets.share, inlets.mean_flow"
        rest = "outlets.characteristic_resistance"
        return [(Basis.DERIVED, losses, here & calibrated), (Basis.DERIVED, rest, here & ~calibrated)]
    if field == "far_pressure" and target.far_pressure is None:
        return [(Basis.PUBLISHED, "gauge-pressure-atmosphere", here)]
    if field == "share" and found is not None and found.exponent_key:
        return [(Basis.PUBLISHED, found.exponent_key, here)]
    if field == "characteristic_resistance":
        return [(Basis.DERIVED, "blood.density, stations.area, stations.stiffness", here)]
    stated = {"far_pressure": "far_pressure", "share": "split"}
    stated["compliance"] = "time_constant" if target.time_constant is not None else "compliance"
    return [(Basis.USER, f"calibration.{stated[field]}", here)]
