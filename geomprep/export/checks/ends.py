"""Whether inlets and outlets say what their kind needs, no more and no less."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, Final

from geomprep.export.checks.faults import Fault

__all__ = ["end_faults"]

_NUMBERS: Final = ("characteristic_resistance", "peripheral_resistance", "compliance")
_OF_MODEL: Final[dict[str, tuple[str, ...]]] = {
    "fixed pressure": (),
    "resistance": ("peripheral_resistance",),
    "three-element windkessel": _NUMBERS,
}
"""Model of an outlet -> the numbers that it has; the others are null."""


def end_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find inlets with both or neither of flow and pressure, outlets whose numbers do not fit their model."""
    for number, inlet in enumerate(flat["inlets"]):
        given = [name for name in ("mean_flow", "pressure") if inlet[name] is not None]
        if len(given) != 1:
            said = "both mean_flow and pressure" if given else "neither mean_flow nor pressure"
            yield Fault("ends", f"inlets[{number}]", f"{said}; exactly one of them is needed")
    for number, outlet in enumerate(flat["outlets"]):
        needed = _OF_MODEL[outlet["model"]]
        for name in _NUMBERS:
            if (outlet[name] is None) == (name in needed):
                rule = "needs it" if name in needed else "has none: write null"
                yield Fault("ends", f"outlets[{number}].{name}", f"{outlet[name]}; a {outlet['model']} {rule}")
    inlets = {record["node"] for record in flat["inlets"]}
    for number, outlet in enumerate(flat["outlets"]):
        if outlet["node"] in inlets:
            yield Fault("ends", f"outlets[{number}].node", f"node {outlet['node']} is an inlet already; choose one")
