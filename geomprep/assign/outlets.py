"""Where blood leaves: what stands at every outlet, stated or calibrated."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from geomprep.assign.calibration import Calibrated, calibrate
from geomprep.assign.compliance import outlet_compliance
from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.labels import end_segment, node_label
from geomprep.assign.outlet_models import OUTLET_MODELS, OutletNumbers
from geomprep.assign.outlet_origins import outlet_origins
from geomprep.errors import CaseError, ModelError
from geomprep.findings import Finding, Severity
from geomprep.laws.lumped import characteristic_impedance
from geomprep.model import FloatArray, Network, Origin, Outlet
from geomprep.units import format_quantity

__all__ = ["OutletResult", "assign_outlets", "completed_entries", "far_pressures", "stated_totals"]


@dataclass(frozen=True)
class OutletResult:
    """The outlets of a network, where their numbers come from, and how they were found."""

    outlets: tuple[Outlet, ...]
    origins: tuple[Origin, ...]
    findings: tuple[Finding, ...] = ()


def assign_outlets(
    network: Network,
    ends: Ends,
    settings: Sequence[OutletSettings],
    calibration: CalibrationSettings | None,
    wave_speed: FloatArray,
) -> OutletResult:
    """Make the outlets of a network.

    Resistances that the case does not state are calibrated (:func:`geomprep.assign.calibration.calibrate`).
    The first resistance of a windkessel is ρ c/A of the segment end where not stated, which sends
    back no wave of high frequency (Alastruey et al. 2008, Commun Comput Phys 4:317-336).

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
        Wave speed at every station at the imaged state, m/s.

    Returns
    -------
    OutletResult
        Outlets in the order of ``ends.outlet_nodes``.

    Raises
    ------
    CaseError
        A model is unknown, or a value that it needs is missing.
    ModelError
        A resistance comes out too small or negative, or the characteristic resistance is
        not less than the total.
    """
    target = calibration or CalibrationSettings()
    entries = completed_entries(ends, settings, target)
    far = far_pressures(entries)
    windkessel = np.array([OUTLET_MODELS[str(entry.model)].windkessel for entry in entries], dtype=np.bool_)
    first = np.where(windkessel, _characteristic(network, ends, entries, wave_speed), 0.0)
    total = stated_totals(entries, first)
    found = None
    if np.isnan(total).any():
        found = calibrate(network, ends, entries, target, (far, total))
        total[found.rows] = found.resistance
    _check_characteristic(network, ends, first, total, wave_speed)
    own = [np.nan if entry.peripheral_resistance is None else entry.peripheral_resistance for entry in entries]
    second = np.where(np.isnan(own), total - first, own)
    compliance = outlet_compliance(network, ends, entries, target, (windkessel, total, second))
    share = dict(zip(found.rows.tolist(), found.share.tolist(), strict=True)) if found else {}
    columns = np.stack((far, total, first, second, compliance), axis=1).tolist()
    rows = enumerate(zip(entries, ends.outlet_nodes.tolist(), columns, strict=True))
    outlets = tuple(
        OUTLET_MODELS[str(entry.model)].record(OutletNumbers(node, behind, whole, near, rest, store, share.get(row)))
        for row, (entry, node, (behind, whole, near, rest, store)) in rows
    )
    return OutletResult(outlets, outlet_origins(outlets, ends, settings, target, found), _told(found, target))


def completed_entries(
    ends: Ends, settings: Sequence[OutletSettings], target: CalibrationSettings
) -> list[OutletSettings]:
    """Return the entry of every outlet node, with what the calibration gives to all.

    Raises
    ------
    CaseError
        A model is unknown or missing, or a fixed pressure without its pressure.

    Examples
    --------
    >>> ends = Ends(None, *[np.zeros(1, int)] * 5)
    >>> completed_entries(ends, [OutletSettings("a")], CalibrationSettings(model="resistance"))[0].model
    'resistance'
    >>> completed_entries(ends, [OutletSettings("a")], CalibrationSettings())
    Traceback (most recent call last):
    geomprep.errors.CaseError: outlets[0].model: missing; choose one of fixed pressure, resistance, ...
    """
    found = {number: _completed(settings[number], number, target) for number in np.unique(ends.outlet_entries).tolist()}
    return [found[number] for number in ends.outlet_entries.tolist()]


def _completed(entry: OutletSettings, number: int, target: CalibrationSettings) -> OutletSettings:
    """An entry with the calibration's model and far pressure where it states none."""
    model = entry.model or target.model
    if model is None:
        raise CaseError(f"outlets[{number}].model: missing; choose one of {', '.join(OUTLET_MODELS)}")
    if model not in OUTLET_MODELS:
        raise CaseError(f"outlets[{number}].model = '{model}': unknown; choose one of {', '.join(OUTLET_MODELS)}")
    if OUTLET_MODELS[model].held and entry.pressure is None:
        raise CaseError(f"outlets[{number}].pressure: missing; the model '{model}' needs it")
    far = entry.far_pressure if entry.far_pressure is not None else target.far_pressure
    return replace(entry, model=model, far_pressure=far)


def far_pressures(entries: Sequence[OutletSettings]) -> FloatArray:
    """Return the pressure behind every outlet: its own where held, else the far one, else the atmosphere's 0."""
    held = [OUTLET_MODELS[str(entry.model)].held for entry in entries]
    chosen = [entry.pressure if own else entry.far_pressure for entry, own in zip(entries, held, strict=True)]
    return np.array([pressure or 0.0 for pressure in chosen], dtype=np.float64)


def stated_totals(entries: Sequence[OutletSettings], characteristic: FloatArray) -> FloatArray:
    """Return the total resistance of every outlet: 0 where held, NaN where it is to be calibrated.

    Parameters
    ----------
    entries : sequence of OutletSettings
        Completed.
    characteristic : (o,) float array
        First resistance of windkessels, 0 elsewhere; added to a stated peripheral resistance.
    """
    total = np.zeros(len(entries))
    for row, entry in enumerate(entries):
        if OUTLET_MODELS[str(entry.model)].held:
            continue
        if entry.resistance is not None:
            total[row] = entry.resistance
        elif entry.peripheral_resistance is not None:
            total[row] = entry.peripheral_resistance + characteristic[row]
        else:
            total[row] = np.nan
    return total


def _characteristic(
    network: Network, ends: Ends, entries: Sequence[OutletSettings], wave_speed: FloatArray
) -> FloatArray:
    """First resistance: stated, else ρ c/A of the segment that ends there."""
    if network.blood is None:
        raise ModelError("a characteristic resistance needs the density of blood; assign blood first")
    station = end_segment(network, ends.outlet_nodes)[1]
    matched = characteristic_impedance(network.stations.area[station], wave_speed[station], network.blood.density)
    stated = [entry.characteristic_resistance for entry in entries]
    return np.array([value if own is None else own for own, value in zip(stated, matched, strict=True)], np.float64)


def _check_characteristic(
    network: Network, ends: Ends, first: FloatArray, total: FloatArray, wave_speed: FloatArray
) -> None:
    """Refuse a characteristic resistance that leaves nothing for the periphery."""
    bad = np.flatnonzero((first > 0) & (first >= total))
    if bad.size == 0:
        return
    row = int(bad[np.argmax(first[bad] / total[bad])])
    node = int(ends.outlet_nodes[row])
    station = int(end_segment(network, ends.outlet_nodes[[row]])[1][0])
    others = f" ({bad.size - 1} more outlets fail too)" if bad.size > 1 else ""
    raise ModelError(
        f"outlet {node_label(network, node)}: its characteristic resistance {format_quantity(first[row], 'mmHg*s/mL')} "
        f"(wave speed {wave_speed[station]:.3g} m/s, radius {1e3 * network.stations.radius[station]:.3g} mm) is not less "
        f"than its total resistance {format_quantity(total[row], 'mmHg*s/mL')}{others}: check the radius and the walls "
        "of this vessel or its flow, or take the model 'resistance'"
    )


def _told(found: Calibrated | None, target: CalibrationSettings) -> tuple[Finding, ...]:
    """A note that says from what the outlets were calibrated."""
    if found is None:
        return ()
    split = target.split or "shares"
    power = "" if target.exponent is None or split == "shares" else f", exponent {target.exponent}"
    at = "" if target.mean_pressure is None else f" and {format_quantity(target.mean_pressure, 'mmHg')} at the inlet"
    message = (
        f"{len(found.rows)} outlet(s) were calibrated to {format_quantity(float(found.flow.sum()), 'mL/min')} in all{at} "
        f"(split: {split}{power}); their pressures came out between "
        f"{format_quantity(float(found.pressure.min()), 'mmHg')} and {format_quantity(float(found.pressure.max()), 'mmHg')}."
    )
    return (Finding("calibrated outlets", Severity.NOTE, message, source=found.exponent_key),)
