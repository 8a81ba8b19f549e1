"""Anatomical frames: where x, y and z of a file grow to, and where gravity points."""

from __future__ import annotations

from typing import Final

import numpy as np

from geomprep.errors import InputError
from geomprep.files.statement import FRAME_AXES
from geomprep.model import FloatArray

__all__ = ["direction", "gravity_direction", "is_right_handed"]

_BODY: Final[dict[str, tuple[float, float, float]]] = {
    "L": (1.0, 0.0, 0.0),
    "R": (-1.0, 0.0, 0.0),
    "P": (0.0, 1.0, 0.0),
    "A": (0.0, -1.0, 0.0),
    "S": (0.0, 0.0, 1.0),
    "I": (0.0, 0.0, -1.0),
}
"""Body directions in the frame of left, back and head, which is right-handed."""

_DOWN: Final[dict[str, str]] = {"supine": "P", "prone": "A", "upright": "I", "left side": "L", "right side": "R"}
"""Where gravity points to in each posture; lying on the left side, it is the patient's left."""


def _matrix(frame: str) -> FloatArray:
    """Rows: body directions of x, y and z."""
    letters = frame.upper()
    if len(letters) != 3 or any(sum(letter in axis for letter in letters) != 1 for axis in FRAME_AXES):
        raise InputError(f"frame = '{frame}': must be three letters, one each of L or R, P or A, S or I")
    return np.array([_BODY[letter] for letter in letters])


def is_right_handed(frame: str) -> bool:
    """Tell whether a frame is right-handed; a left-handed one shows a mirror image.

    Parameters
    ----------
    frame : str
        Three letters, such as ``LPS``: x grows to the patient's left, y to the back
        (posterior), z to the head (superior).

    Raises
    ------
    InputError
        The letters name no frame.

    Examples
    --------
    >>> is_right_handed("LPS"), is_right_handed("RAS"), is_right_handed("LAS")
    (True, True, False)
    """
    return bool(np.linalg.det(_matrix(frame)) > 0.0)


def direction(frame: str, letter: str) -> FloatArray:
    """Return the unit vector, in coordinates of the file, that points to a side of the body.

    Parameters
    ----------
    frame : str
        Three letters of the file.
    letter : str
        One of L, R, P, A, S, I.

    Returns
    -------
    (3,) float array

    Examples
    --------
    >>> direction("LPS", "S")
    array([0., 0., 1.])
    >>> direction("RSA", "I")
    array([ 0., -1.,  0.])
    """
    towards: FloatArray = _matrix(frame) @ np.array(_BODY[letter]) + 0.0  # no negative zeros
    return towards


def gravity_direction(frame: str, posture: str) -> FloatArray:
    """Return the unit vector of gravity in coordinates of the file.

    Parameters
    ----------
    frame : str
        Three letters of the file.
    posture : str
        ``supine``, ``prone``, ``upright``, ``left side`` or ``right side`` (down).

    Returns
    -------
    (3,) float array

    Raises
    ------
    InputError
        The posture is unknown.

    Examples
    --------
    >>> gravity_direction("LPS", "supine")
    array([0., 1., 0.])
    """
    if posture not in _DOWN:
        raise InputError(f"posture '{posture}': must be one of {', '.join(_DOWN)}")
    return direction(frame, _DOWN[posture])
