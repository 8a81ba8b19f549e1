"""Which way is up: from the frame of the file and the posture of the person to heights."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import Final

import numpy as np

from geomprep.errors import CaseError
from geomprep.findings import Finding, Severity
from geomprep.model import Basis, FloatArray, Network, Origin
from geomprep.units import STANDARD_GRAVITY

__all__ = ["DOWN", "Gravity", "gravity", "heights", "with_heights"]

DOWN: Final[dict[str, str]] = {
    "supine": "P",  # lying on the back: things fall to the back
    "prone": "A",
    "upright": "I",
    "left side": "L",  # lying on the left side
    "right side": "R",
}
"""Posture -> end of the body to which gravity points: L, R (sides), P, A (back, front), S, I (head, feet)."""

_OPPOSITE: Final = {"L": "R", "R": "L", "P": "A", "A": "P", "S": "I", "I": "S"}
_ORIGIN = (0.0, 0.0, 0.0)


@dataclass(frozen=True)
class Gravity:
    """Gravity in the frame of the file.

    Attributes
    ----------
    vector : tuple of float
        Acceleration in m/s²; zeros where no gravity is modelled.
    reference_point : tuple of float
        A point of height 0, in metres.
    reference : str
        The plane of height 0 in words.
    posture : str
        Empty where none is stated.
    findings : tuple of Finding
    """

    vector: tuple[float, float, float]
    reference_point: tuple[float, float, float]
    reference: str
    posture: str
    findings: tuple[Finding, ...] = ()


def gravity(
    frame: str | None, posture: str | None, reference_point: tuple[float, float, float] | None = None
) -> Gravity:
    """Return gravity for a posture, in the frame in which the coordinates are written.

    Parameters
    ----------
    frame : str, optional
        Three letters: where x, y and z grow to, such as ``LPS``. None or ``unknown``: not stated.
    posture : str, optional
        A key of :data:`DOWN`.
    reference_point : tuple of float, optional
        Point in metres at which heights are zero; the origin of the coordinates where not given, so
        that a height can be read off the file.

    Returns
    -------
    Gravity
        Without gravity, and with a finding, where frame or posture is not stated.

    Raises
    ------
    CaseError
        The frame does not name each axis of the body once, or the posture is unknown.

    Examples
    --------
    >>> gravity("LPS", "supine").vector
    (0.0, 9.80665, 0.0)
    >>> gravity(None, "supine").vector
    (0.0, 0.0, 0.0)
    """
    point = reference_point or _ORIGIN
    if posture is not None and posture not in DOWN:
        raise CaseError(f"posture '{posture}': no posture known here; choose one of {', '.join(DOWN)}")
    if frame in (None, "unknown") or posture is None:
        return Gravity((0.0, 0.0, 0.0), point, "none: no gravity is modelled", posture or "", (_none(frame, posture),))
    axes = [*(frame or "")]
    if len(axes) != 3 or sorted(min(axis, _OPPOSITE.get(axis, axis)) for axis in axes) != ["A", "I", "L"]:
        raise CaseError(f"frame '{frame}': three letters are needed, one each of L/R, P/A, S/I, such as LPS")
    down = DOWN[posture]
    x, y, z = (STANDARD_GRAVITY * ((axis == down) - (axis == _OPPOSITE[down])) for axis in axes)
    where = "the origin of the coordinates" if reference_point is None else f"the point {point} m"
    return Gravity((x, y, z), point, f"the plane through {where}, across gravity", posture)


def _none(frame: str | None, posture: str | None) -> Finding:
    """The finding that no gravity is modelled."""
    missing = " and ".join(
        name for name, value in (("the frame", frame), ("the posture", posture)) if value in (None, "unknown")
    )
    return Finding(
        "no gravity",
        Severity.NOTE,
        f"No gravity is modelled and all heights are 0, because {missing} is not stated; 10 cm of blood "
        "between two places would be 7.8 mmHg.",
    )


def heights(field: Gravity, position: FloatArray) -> FloatArray:
    """Return the height of points against gravity.

    Parameters
    ----------
    field : Gravity
    position : (n, 3) float array
        Metres, in the frame of the file.

    Returns
    -------
    (n,) float array
        Metres above the reference plane; zeros without gravity.

    Examples
    --------
    >>> heights(gravity("LPS", "upright"), np.array([[0.0, 0.0, 0.3]]))
    array([0.3])
    """
    up = -np.asarray(field.vector) / STANDARD_GRAVITY
    return np.asarray((position - np.asarray(field.reference_point)) @ up, dtype=np.float64) + 0.0


def with_heights(network: Network, field: Gravity) -> Network:
    """Return the network with the heights of its nodes set."""
    height = heights(field, network.nodes.position)
    return dataclasses.replace(
        network,
        nodes=dataclasses.replace(network.nodes, height=height),
        origins=(*network.origins, Origin("nodes.height", Basis.DERIVED, "nodes.position, conventions.gravity")),
    )
