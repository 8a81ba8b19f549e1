"""Where blood enters: mean flows and pressures as the case states them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from geomprep.assign.end_settings import InletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.origins import origins_by_rows
from geomprep.errors import CaseError
from geomprep.findings import Finding, Severity
from geomprep.model import Basis, Inlet, Origin
from geomprep.units import format_quantity

__all__ = ["assign_inlets"]


def assign_inlets(
    ends: Ends, settings: Sequence[InletSettings]
) -> tuple[tuple[Inlet, ...], tuple[Origin, ...], tuple[Finding, ...]]:
    """Make the inlets of a network.

    Parameters
    ----------
    ends : Ends
        Nodes of the entries.
    settings : sequence of InletSettings
        Entries in the order of the case.

    Returns
    -------
    inlets : tuple of Inlet
        One per node, in the order of ``ends.inlet_nodes``.
    origins : tuple of Origin
    findings : tuple of Finding
        A note where one entry gives several nodes the same flow.

    Raises
    ------
    CaseError
        An entry states both or neither of flow and pressure.
    """
    inlets = []
    for node, entry in zip(ends.inlet_nodes.tolist(), ends.inlet_entries.tolist(), strict=True):
        one = settings[entry]
        if (one.mean_flow is None) == (one.pressure is None):
            raise CaseError(f"inlets[{entry}]: give either mean_flow or pressure, one of them")
        inlets.append(Inlet(node, one.mean_flow, one.pressure))
    return tuple(inlets), _origins(ends, inlets), _repeated(ends, settings)


def _origins(ends: Ends, inlets: list[Inlet]) -> tuple[Origin, ...]:
    """The entry of the case behind every number."""
    found: tuple[Origin, ...] = ()
    for name in ("mean_flow", "pressure"):
        filled = np.array([getattr(inlet, name) is not None for inlet in inlets], dtype=np.bool_)
        rows = [
            (Basis.USER, f"inlets[{entry}].{name}", filled & (ends.inlet_entries == entry))
            for entry in np.unique(ends.inlet_entries).tolist()
        ]
        found += origins_by_rows(f"inlets.{name}", rows)
    return found


def _repeated(ends: Ends, settings: Sequence[InletSettings]) -> tuple[Finding, ...]:
    """A note where one entry sends its flow into several nodes."""
    findings = []
    for entry, count in zip(*np.unique(ends.inlet_entries, return_counts=True), strict=True):
        flow = settings[entry].mean_flow
        if count > 1 and flow is not None:
            message = (
                f"inlets[{entry}] names {count} open ends: each takes {format_quantity(flow, 'mL/min')}, "
                f"{format_quantity(count * flow, 'mL/min')} in all."
            )
            findings.append(Finding("one entry for several inlets", Severity.NOTE, message))
    return tuple(findings)
