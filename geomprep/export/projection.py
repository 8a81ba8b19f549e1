"""From where a network is seen: the plane, its scale, and the sides of the body at its edges."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.model import FloatArray, Network

__all__ = ["View", "chosen_view"]

_WORDS = {"L": "left", "R": "right", "P": "back", "A": "front", "S": "head", "I": "feet"}
_THIN = 0.4
_OPPOSITE = {"L": "R", "R": "L", "P": "A", "A": "P", "S": "I", "I": "S"}


@dataclass(frozen=True, eq=False)
class View:
    """A projection on a plane, in picture units with y downwards.

    Attributes
    ----------
    across, down : (3,) float array
        Unit vectors in the frame of the input that run to the right and downwards on the picture.
    centre : (3,) float array
        Point shown in the middle.
    scale : float
        Picture units per metre.
    size : float
        Width and height of the picture.
    sides : tuple of str
        Words at the left, right, upper and lower edge; empty where the frame is unknown.
    """

    across: FloatArray
    down: FloatArray
    centre: FloatArray
    scale: float
    size: float
    sides: tuple[str, str, str, str]

    def place(self, position: FloatArray) -> FloatArray:
        """Return the place of positions on the picture, (n, 2)."""
        offset = position - self.centre
        flat = np.stack((offset @ self.across, offset @ self.down), axis=1)
        result: FloatArray = flat * self.scale + 0.5 * self.size
        return result

    def rule(self) -> tuple[float, str]:
        """Return length on the picture and label of a rule of a round number of millimetres.

        Examples
        --------
        >>> unit = np.eye(3)
        >>> View(unit[0], unit[1], np.zeros(3), 1000.0, 300.0, ("", "", "", "")).rule()
        (50.0, '50 mm')
        """
        most = 0.3 * self.size / self.scale * 1e3
        power = 10.0 ** np.floor(np.log10(most))
        length = float(max(step for step in (1.0, 2.0, 5.0) if step * power <= most) * power)
        return length * 1e-3 * self.scale, f"{length:g} mm"


def chosen_view(network: Network, frame: str, size: float) -> View:
    """Choose a view: from the front where the frame is known, else across the thinnest direction.

    Parameters
    ----------
    network : Network
    frame : str
        Three letters, or ``unknown``.
    size : float
        Width and height of the picture.

    Returns
    -------
    View

    Notes
    -----
    From the front the patient's left is on the right of the picture, the head is up.
    """
    position = network.stations.position
    low, high = (np.array([end(axis) for axis in position.T]) for end in (np.min, np.max))
    letters = frame if len(frame) == 3 else ""
    if letters:
        across, down, sides = _body_axes(letters, high - low)
    else:
        thin = int(np.argmin(high - low))
        kept = [axis for axis in range(3) if axis != thin]
        across, down = np.eye(3)[kept[0]], -np.eye(3)[kept[1]]
        sides = ("", "", "", "")
    span = max(np.ptp(position @ across), np.ptp(position @ down), 1e-9)
    return View(across, down, 0.5 * (low + high), float(0.92 * size / span), size, sides)


def _body_axes(letters: str, extent: FloatArray) -> tuple[FloatArray, FloatArray, tuple[str, str, str, str]]:
    """View from the front; from the side where the vessels lie nearly in the middle plane of the body."""
    left = _toward(letters, "L")
    side_on = extent @ np.abs(left) < _THIN * (extent @ np.abs(_toward(letters, "P")))
    right_edge = "P" if side_on else "L"
    across, down = _toward(letters, right_edge), -_toward(letters, "S")
    return across, down, (_WORDS[_OPPOSITE[right_edge]], _WORDS[right_edge], "head", "feet")


def _toward(letters: str, side: str) -> FloatArray:
    """Unit vector towards a side of the body."""
    for axis, letter in enumerate(letters):
        if letter in (side, _OPPOSITE[side]):
            unit: FloatArray = np.eye(3)[axis] * (1.0 if letter == side else -1.0)
            return unit
    return np.zeros(3)
