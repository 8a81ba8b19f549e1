"""How flow divides by size: Q_i/Q = r_i^k/Σ r_j^k.

Sources: Murray 1926, doi 10.1073/pnas.12.3.207 (k = 3, minimum work); Nakamura & Awa 2014,
doi 10.1002/phy2.236 (measured exponents by calibre).
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.laws.arrays import FloatArray, positive

__all__ = ["parent_radius", "radius_power_shares"]


def radius_power_shares(radius: npt.ArrayLike, exponent: float) -> FloatArray:
    """Return each vessel's share of the flow, r^k/Σ r^k.

    Parameters
    ----------
    radius : (n,) array_like
        Radii in any one unit.
    exponent : float
        k > 0.

    Returns
    -------
    (n,) ndarray
        Shares; their sum is 1.

    Raises
    ------
    InputError
        A radius or the exponent is not finite and above zero, or there are no radii.

    Examples
    --------
    >>> radius_power_shares([2.0, 1.0, 1.0], 1.0)
    array([0.5 , 0.25, 0.25])
    >>> radius_power_shares([], 3.0)
    Traceback (most recent call last):
    geomprep.errors.InputError: no radius given: a flow needs at least one vessel to divide over
    """
    weights = _weights(radius, exponent)
    return np.asarray(weights / weights.sum())


def parent_radius(radius: npt.ArrayLike, exponent: float) -> float:
    """Return the radius of the parent that daughters fit, (Σ r^k)^(1/k).

    Examples
    --------
    >>> parent_radius([3.0, 4.0], 2.0)
    5.0
    """
    radii = np.asarray(radius, dtype=np.float64)
    return float(radii.max(initial=0.0) * _weights(radii, exponent).sum() ** (1 / exponent))


def _weights(radius: npt.ArrayLike, exponent: float) -> FloatArray:
    """Powers of the radii over the largest, which no exponent can overflow."""
    radii = positive("radius", radius)
    if not radii.size:
        raise InputError("no radius given: a flow needs at least one vessel to divide over")
    if not 0 < exponent < math.inf:
        raise InputError(f"radius exponent {exponent:g}: it must be finite and above zero")
    return np.asarray((radii / radii.max()) ** exponent)
