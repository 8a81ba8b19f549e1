"""The power pair: load f(a) = a^m − a^n of the area ratio a = A/A0, with m > 0 and −2 < n ≤ 0.

Arteries take m = 1/2, n = 0; collapsible veins m = 10, n = −3/2. The load rises strictly
with the area ratio, from −1 (n = 0) or −∞ (n < 0) at a → 0 to +∞.

Sources: Formaggia, Lamponi & Quarteroni 2003, doi 10.1023/B:ENGI.0000007980.01347.29 (artery);
Brook, Falle & Pedley 1999, J Fluid Mech 396:223-256 (collapsible tube).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError, ModelError
from geomprep.laws.arrays import FloatArray, positive

__all__ = ["EQUATION", "PARAMETERS", "area_ratio", "check_exponents", "load", "load_slope", "lowest_load"]

EQUATION = "p_tm = p0 + K ((A/A0)^m - (A/A0)^n)"
PARAMETERS = ("m", "n")

_MOST_STEPS = 100
_STEP_LIMIT = 4 * np.finfo(np.float64).eps


def check_exponents(m: float, n: float) -> None:
    """Raise unless m > 0 and −2 < n ≤ 0, where the law is monotonic and well posed.

    Raises
    ------
    InputError
        An exponent lies outside its range.

    Examples
    --------
    >>> check_exponents(10, -1.5)
    >>> check_exponents(0, 0)
    Traceback (most recent call last):
    geomprep.errors.InputError: tube law exponents m = 0, n = 0: m > 0 and -2 < n <= 0 are needed
    """
    if not (0 < m < np.inf and -2 < n <= 0):
        raise InputError(f"tube law exponents m = {m:g}, n = {n:g}: m > 0 and -2 < n <= 0 are needed")


def load(ratio: npt.ArrayLike, m: float, n: float) -> FloatArray:
    """Return the load a^m − a^n, accurate near a = 1 where the two powers cancel.

    Parameters
    ----------
    ratio : array_like
        Area ratio a = A/A0, > 0.
    m, n : float
        Exponents.

    Returns
    -------
    ndarray
        (p_tm − p0)/K, a pure number.

    Raises
    ------
    InputError
        A ratio is not above zero, or an exponent is out of range.

    Examples
    --------
    >>> load([1.0, 4.0], 0.5, 0.0)
    array([0., 1.])
    >>> load([], 0.5, 0.0)
    array([], dtype=float64)
    """
    check_exponents(m, n)
    logarithm = np.log(positive("area ratio", ratio))
    return np.asarray(np.expm1(m * logarithm) - np.expm1(n * logarithm))


def load_slope(ratio: npt.ArrayLike, m: float, n: float) -> FloatArray:
    """Return a·df/da = m a^m − n a^n, which is ρc²/K.

    Parameters
    ----------
    ratio : array_like
        Area ratio a = A/A0, > 0.
    m, n : float
        Exponents.

    Returns
    -------
    ndarray
        A pure number, > 0 everywhere.

    Examples
    --------
    >>> float(load_slope(1.0, 10, -1.5))
    11.5
    >>> load_slope([], 10, -1.5)
    array([], dtype=float64)
    """
    check_exponents(m, n)
    ratio = positive("area ratio", ratio)
    return np.asarray(m * ratio**m - n * ratio**n)


def lowest_load(m: float, n: float) -> float:
    """Return the load that the law approaches as the area goes to zero.

    Examples
    --------
    >>> lowest_load(0.5, 0.0), lowest_load(10, -1.5)
    (-1.0, -inf)
    """
    check_exponents(m, n)
    return -1.0 if n == 0 else -np.inf


def area_ratio(load: npt.ArrayLike, m: float, n: float) -> FloatArray:
    """Return the area ratio at which the law carries a load (the inverse of :func:`load`).

    For n = 0 the inverse is (1 + f)^(1/m). For n < 0 the law is solved by Newton's method in
    t = |ln a|. With p, q = m, −n for f ≥ 0 and −n, m for f < 0 the equation is
    p t = ln(|f| + exp(−q t)), a concave rising function of t, so that the iteration from t = 0
    climbs to the root without overshoot for every load: no bracket is needed, and the result is
    exact to a few units in the last place.

    Parameters
    ----------
    load : array_like
        (p_tm − p0)/K; above −1 where n = 0, any finite number where n < 0.
    m, n : float
        Exponents.

    Returns
    -------
    ndarray
        Area ratio a > 0.

    Raises
    ------
    ModelError
        A load at which the law has no area.

    Examples
    --------
    >>> area_ratio([0.0, 1.0], 0.5, 0.0)
    array([1., 4.])
    >>> float(area_ratio(0.0, 10, -1.5))
    1.0
    >>> area_ratio(-1.0, 0.5, 0.0)
    Traceback (most recent call last):
    geomprep.errors.ModelError: load -1: the law with m = 0.5, n = 0 has an area only for finite loads above -1
    """
    loads = np.asarray(load, dtype=np.float64)
    lowest = lowest_load(m, n)
    bad = ~(np.isfinite(loads) & (loads > lowest))
    if bad.any():
        value = loads[bad].ravel()[0]
        raise ModelError(
            f"load {value:g}: the law with m = {m:g}, n = {n:g} has an area only for finite loads above {lowest:g}"
        )
    if n == 0:
        return np.asarray(np.exp(np.log1p(loads) / m))
    sign = np.where(loads < 0, -1.0, 1.0)
    rising = np.where(loads < 0, -n, m)
    falling = np.where(loads < 0, m, -n)
    return np.asarray(np.exp(sign * _logarithm(np.abs(loads), rising, falling)))


def _logarithm(size: FloatArray, rising: FloatArray, falling: FloatArray) -> FloatArray:
    """Solve p t = ln(f + exp(−q t)) for t ≥ 0 by Newton from the left."""
    t = np.zeros_like(size)
    for _ in range(_MOST_STEPS):
        # f + exp(−q t) − 1 keeps all digits where both the load and t are tiny
        argument = size + np.expm1(-falling * t)
        residual = rising * t - np.log1p(argument)
        step = -residual / (rising + falling * np.exp(-falling * t) / (1.0 + argument))
        t = np.maximum(t + step, 0.0)
        if (np.abs(step) <= _STEP_LIMIT * t).all():
            return t
    return t  # rounding makes the last step dither by a few units in the last place
