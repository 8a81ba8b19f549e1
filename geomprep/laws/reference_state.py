"""Reference state of a tube law from what an image shows.

An image gives an area at a transmural pressure that is not zero. Two ways to a law:

*imaged*    A0 is the imaged area, p0 the transmural pressure at imaging, K = ρc²/(m − n).
*buckling*  p0 = 0, where a vein begins to buckle; K and A0 follow from the two conditions
            A(p) = A_imaged and c(p) = c_imaged.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from geomprep.errors import ModelError
from geomprep.laws.arrays import FloatArray, positive
from geomprep.laws.power_pair import check_exponents

__all__ = ["buckling_reference", "power_parts", "slowest_wave_speed"]


def slowest_wave_speed(transmural: npt.ArrayLike, density: float, m: float, n: float) -> FloatArray:
    """Return the bound that a wave speed must exceed for a law with p0 = 0 to exist.

    The law p = K (a^m − a^n) reaches a pressure p > 0 only with ρc² > m p, and p < 0 only
    with ρc² > n p (see :func:`buckling_reference`).

    Parameters
    ----------
    transmural : array_like
        Transmural pressure at imaging, Pa.
    density : float
        ρ of blood in kg/m³.
    m, n : float
        Exponents of the law.

    Returns
    -------
    ndarray
        Bound in m/s; 0 at zero pressure.

    Examples
    --------
    >>> slowest_wave_speed([1000.0, 0.0, -1000.0], 1000.0, 9, -1.0)
    array([3., 0., 1.])
    """
    check_exponents(m, n)
    pressure = np.asarray(transmural, dtype=np.float64)
    return np.asarray(np.sqrt((np.maximum(m * pressure, n * pressure) + 0.0) / positive("density", density)))


def power_parts(
    transmural: npt.ArrayLike, wave_speed: npt.ArrayLike, density: float, m: float, n: float
) -> tuple[FloatArray, FloatArray]:
    """Return u = K a^m and v = K a^n of the law with p0 = 0 at an imaged state.

    The two conditions u − v = p and m u − n v = ρc² are linear in u and v. A law exists exactly
    where both are above zero.

    Parameters
    ----------
    transmural : array_like
        Transmural pressure at imaging, Pa.
    wave_speed : array_like
        c in m/s at the imaged state.
    density : float
        ρ of blood in kg/m³.
    m, n : float
        Exponents of the law.

    Returns
    -------
    rising, falling : ndarray
        u and v in Pa.

    Examples
    --------
    >>> [float(part) for part in power_parts(1000.0, 4.0, 1000.0, 9, -1.0)]
    [1700.0, 700.0]
    """
    check_exponents(m, n)
    pressure = np.asarray(transmural, dtype=np.float64)
    inertia = positive("density", density) * positive("wave speed", wave_speed) ** 2
    return np.asarray((inertia - n * pressure) / (m - n)), np.asarray((inertia - m * pressure) / (m - n))


def buckling_reference(
    area: npt.ArrayLike, transmural: npt.ArrayLike, wave_speed: npt.ArrayLike, density: float, m: float, n: float
) -> tuple[FloatArray, FloatArray]:
    """Return A0 and K of the law with p0 = 0 that passes through an imaged state.

    With a = A/A0 at imaging, u = K a^m and v = K a^n, the conditions u − v = p and
    m u − n v = ρc² give

        u = (ρc² − n p)/(m − n),  v = (ρc² − m p)/(m − n),
        a = (u/v)^(1/(m − n)),    K = v^(m/(m − n)) u^(−n/(m − n)).

    Both u and v must be above zero: ρc² > m p bounds distended tubes (p > 0, a > 1),
    ρc² > n p collapsed ones (p < 0, a < 1). At p = 0, A0 is the imaged area and
    K = ρc²/(m − n).

    Parameters
    ----------
    area : array_like
        Imaged area in m².
    transmural : array_like
        Transmural pressure at imaging, Pa.
    wave_speed : array_like
        c in m/s at the imaged state.
    density : float
        ρ of blood in kg/m³.
    m, n : float
        Exponents of the law.

    Returns
    -------
    reference_area, stiffness : ndarray
        A0 in m² and K in Pa.

    Raises
    ------
    ModelError
        A wave speed is at or below the bound of :func:`slowest_wave_speed`.

    Examples
    --------
    >>> [round(float(value), 9) for value in buckling_reference(1e-4, 0.0, 1.0, 1150.0, 10, -1.5)]
    [0.0001, 100.0]
    >>> buckling_reference(1e-4, 1000.0, 3.0, 1000.0, 9, -1.0)
    Traceback (most recent call last):
    geomprep.errors.ModelError: wave speed 3 m/s at a transmural pressure of 1000 Pa: ... faster than 3 m/s...
    """
    rising, falling = power_parts(transmural, wave_speed, density, m, n)
    bad = ~((rising > 0) & (falling > 0))
    if bad.any():
        shown, at = (np.broadcast_to(values, bad.shape)[bad].ravel()[0] for values in (wave_speed, transmural))
        raise ModelError(
            f"wave speed {shown:g} m/s at a transmural pressure of {at:g} Pa: a law with m = {m:g}, n = {n:g} and "
            f"p0 = 0 needs one faster than {float(slowest_wave_speed(at, density, m, n)):.6g} m/s; give a faster "
            "one or take the imaged reference state"
        )
    ratio = np.exp((np.log(rising) - np.log(falling)) / (m - n))
    stiffness = np.exp((m * np.log(falling) - n * np.log(rising)) / (m - n))
    return np.asarray(positive("area", area) / ratio), np.asarray(stiffness)
