"""Lumped values of a vessel from its profile integrals: resistance, inertance, compliance.

A lumped value keeps what a vessel does as a whole. Each is an integral along the vessel, never a
formula of a mean radius: on a taper from 2 to 1 mm that would make the resistance 32 % too
small.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from geomprep.curves import line_sums, pieces
from geomprep.laws.arrays import FloatArray, positive
from geomprep.laws.blood import friction_coefficient

__all__ = [
    "characteristic_impedance",
    "compliance",
    "distensibility",
    "inertance",
    "resistance",
    "resistance_from_area",
]


def resistance(inverse_fourth_power: npt.ArrayLike, viscosity: float, velocity_profile: float) -> FloatArray:
    """Return R = 2 (z + 2) μ/π ∫ ds/r⁴; for z = 2 it is Poiseuille's 8 μ l/(π r⁴).

    Parameters
    ----------
    inverse_fourth_power : array_like
        ∫ ds/r⁴ of each vessel in 1/m³.
    viscosity : float
        μ in Pa·s.
    velocity_profile : float
        Exponent z of the profile.

    Returns
    -------
    ndarray
        R in Pa·s/m³.

    Examples
    --------
    >>> float(resistance(np.pi / 8, 1.0, 2.0))
    1.0
    """
    return resistance_from_area(np.asarray(inverse_fourth_power) / np.pi**2, viscosity, velocity_profile)


def resistance_from_area(inverse_area_squared: npt.ArrayLike, viscosity: float, velocity_profile: float) -> FloatArray:
    """Return R = 2 (z + 2) π μ ∫ ds/A².

    Parameters
    ----------
    inverse_area_squared : array_like
        ∫ ds/A² of each vessel in 1/m³.
    viscosity : float
        μ in Pa·s.
    velocity_profile : float
        Exponent z of the profile.

    Returns
    -------
    ndarray
        R in Pa·s/m³.

    Examples
    --------
    >>> float(resistance_from_area(1 / (8 * np.pi), 1.0, 2.0))
    1.0
    >>> resistance_from_area([], 1.0, 2.0)
    array([], dtype=float64)
    """
    friction = friction_coefficient(float(positive("viscosity", viscosity)), velocity_profile)
    return np.asarray(friction * np.asarray(inverse_area_squared))


def inertance(inverse_area: npt.ArrayLike, density: float) -> FloatArray:
    """Return L = ρ ∫ ds/A of a flat profile (a parabola at low frequency has 4/3 of it).

    Parameters
    ----------
    inverse_area : array_like
        ∫ ds/A of each vessel in 1/m.
    density : float
        ρ in kg/m³.

    Returns
    -------
    ndarray
        L in Pa·s²/m³.

    Examples
    --------
    >>> float(inertance(1e5, 1060.0))
    106000000.0
    """
    return np.asarray(positive("density", density) * np.asarray(inverse_area))


def distensibility(wave_speed: npt.ArrayLike, density: float) -> FloatArray:
    """Return 1/(ρc²), the relative change of area per pressure.

    Source: Bramwell & Hill 1922, doi 10.1098/rspb.1922.0022.

    Examples
    --------
    >>> float(distensibility(2.0, 1000.0))
    0.00025
    """
    return np.asarray(1 / (positive("density", density) * positive("wave speed", wave_speed) ** 2))


def compliance(
    distance: npt.ArrayLike, radius: npt.ArrayLike, distensibility: npt.ArrayLike, offsets: npt.ArrayLike
) -> FloatArray:
    """Return C = ∫ A/(ρc²) ds of each vessel from its stations.

    Between two stations the radius is linear (as everywhere) and the distensibility is taken
    as linear; the integrand is then a cubic, which Simpson's rule integrates exactly. So the
    result is exact where the distensibility is linear in the radius, a constant wave speed and
    a constant E h among them; elsewhere its error falls with the square of the station spacing.

    Parameters
    ----------
    distance, radius, distensibility : (k,) array_like
        Along all vessels: m, m and 1/Pa.
    offsets : (s + 1,) array_like of int
        Vessel i holds rows ``offsets[i]:offsets[i + 1]``, at least two.

    Returns
    -------
    (s,) ndarray
        C in m³/Pa.

    Examples
    --------
    >>> float(compliance([0.0, 1.0], [1.0, 1.0], [2.0, 2.0], [0, 2])[0] / np.pi)
    2.0
    >>> compliance([], [], [], [0])
    array([], dtype=float64)
    """
    r, d, at = positive("radius", radius), positive("distensibility", distensibility), np.asarray(distance)
    piece = pieces(np.asarray(offsets, dtype=np.int64))
    near, far = piece.first, piece.first + 1
    middle = (r[near] + r[far]) ** 2 * (d[near] + d[far]) / 2
    cubic = r[near] ** 2 * d[near] + middle + r[far] ** 2 * d[far]
    return line_sums(np.pi / 6 * (at[far] - at[near]) * cubic, piece.starts)


def characteristic_impedance(area: npt.ArrayLike, wave_speed: npt.ArrayLike, density: float) -> FloatArray:
    """Return Zc = ρc/A: pressure over flow of a wave that runs one way.

    Parameters
    ----------
    area : array_like
        Lumen area in m².
    wave_speed : array_like
        c in m/s at that area.
    density : float
        ρ in kg/m³.

    Returns
    -------
    ndarray
        Zc in Pa·s/m³.

    Examples
    --------
    >>> float(characteristic_impedance(1e-4, 5.0, 1000.0))
    50000000.0
    """
    speed = positive("wave speed", wave_speed)
    return np.asarray(positive("density", density) * speed / positive("area", area))
