"""Sentences that every network file carries: cautions, conventions, equations."""

from __future__ import annotations

from typing import Final

__all__ = ["CAUTIONS", "CONVENTIONS", "EQUATIONS", "IMAGED", "TOLERANCE"]

CAUTIONS: Final = (
    "Research use; not for diagnosis or treatment.",
    "Decisions about people belong to licensed clinicians under local rules.",
    "A vessel that is not in this network is not proved absent: it may lie outside the field of view, in a flow gap, "
    "or below the resolution, or have been cut by a repair.",
    "Vessels below the resolution are missing, so collateral capacity may be under-estimated.",
    "A computed pressure is not a measurement.",
)
"""What must not be concluded, in every export."""

CONVENTIONS: Final[dict[str, str]] = {
    "positive_flow": "from_node to to_node; at inlets into the network, at outlets out of it",
    "pressure": "static gauge pressure; total pressure = static + 1/2 density U^2",
    "junctions": "static pressure is continuous where segments meet, in steady_check too",
    "area_and_radius": "area governs; radius = sqrt(area/pi); radius linear between stations",
    "heads": "hydrostatic heads use node heights only; station heights serve the tube law only",
    "references": "columns of one table have equal length; from_node, to_node, node, segment, surroundings and input "
    "are row numbers from 0; tube_law is the id of a tube law; detail of a published number is a key in sources",
    "time_origin": "none; all values are means over time",
    "angles": "rad",
}
"""How signs and words are meant; frame, posture, gravity and reference height come from the case."""

EQUATIONS: Final = (
    "linear: segments: p_from + density g height_from - p_to - density g height_to = resistance flow, g = |gravity|; "
    "nodes: flows add up to inlet_flow - outlet_flow; inlets: mean_flow or pressure as given; outlets: fixed pressure: "
    "p = far_pressure, else p - far_pressure = (characteristic_resistance + peripheral_resistance) outlet_flow"
)
"""Equations of the steady check, as it says itself."""

IMAGED: Final = "imaged"
"""State of the walls at which lumped values hold."""

TOLERANCE: Final = 1e-6
"""Relative difference within which a reader should meet the steady check."""
