"""Published sizes of vessels, and the interval of radii that they make plausible."""

from __future__ import annotations

from typing import Final

from geomprep.errors import InputError
from geomprep.literature.row import Row
from geomprep.literature.table import rows

__all__ = ["ABOVE_LARGEST", "BELOW_SMALLEST", "plausible_radius", "size_rows"]

BELOW_SMALLEST: Final = 1 / 3
"""Factor on the smallest published radius: branches smaller than the named vessels are drawn too."""

ABOVE_LARGEST: Final = 1.25
"""Factor on the largest published radius: the rows of the trunks are means without a spread."""

_CLASSES: Final = {"artery": ("artery",), "vein": ("vein",), "any": ("artery", "vein")}


def size_rows(vessel_class: str) -> tuple[Row, ...]:
    """Return the rows of published sizes of a vessel class.

    Parameters
    ----------
    vessel_class : str
        ``artery``, ``vein`` or ``any``.

    Returns
    -------
    tuple of Row
        `low` and `high` of each are a radius in m: the printed interval, else mean ± 2
        standard deviations, else the mean alone.

    Raises
    ------
    InputError
        The class is none of the three.

    Examples
    --------
    >>> size_rows("vein")[0].of
    'internal jugular vein, upper neck (C2/C3)'
    >>> size_rows("nerve")
    Traceback (most recent call last):
    geomprep.errors.InputError: vessel class 'nerve' has no sizes; choose one of artery, vein, any
    """
    if vessel_class not in _CLASSES:
        raise InputError(f"vessel class '{vessel_class}' has no sizes; choose one of {', '.join(_CLASSES)}")
    return tuple(one for one in rows() if one.kind == "size" and one.vessel_class in _CLASSES[vessel_class])


def plausible_radius(vessel_class: str) -> tuple[float, float]:
    """Return the interval of radii that published sizes make plausible for a class.

    From a third of the smallest published radius to 1.25 times the largest. It is made to tell
    units and meanings of a size array apart (factors of 10 and 2), not to judge one vessel.

    Parameters
    ----------
    vessel_class : str
        ``artery``, ``vein`` or ``any``.

    Returns
    -------
    low, high : float
        Metres.

    Examples
    --------
    >>> [round(1e3 * radius, 3) for radius in plausible_radius("artery")]
    [0.15, 15.625]
    """
    found = size_rows(vessel_class)
    low = min(one.low for one in found if one.low is not None)
    high = max(one.high for one in found if one.high is not None)
    return low * BELOW_SMALLEST, high * ABOVE_LARGEST
