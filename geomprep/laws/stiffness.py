"""Stiffness relations: how the constants of a tube law are found.

One quantity stands behind all of them, the wave speed c at a known state; the moduli differ
by fixed factors (thin wall: ρc² = E h/(2 (1 − ν²) r0)). The trade also writes ρc² = E h/(2 r0)
(:func:`moens_korteweg_speed`), which is 13 % slower than the thin wall with ν = 1/2; each
function here says which of the two it uses.

:data:`RELATIONS` is the closed table of fitted relations; a literature row names one of them
with its coefficients.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.laws.arrays import FloatArray, positive
from geomprep.laws.power_pair import check_exponents

__all__ = [
    "RELATIONS",
    "Relation",
    "exponential_modulus",
    "moens_korteweg_speed",
    "power_wave_speed",
    "stiffness_from_modulus",
    "stiffness_from_wave_speed",
    "thin_wall_speed",
    "wall_modulus",
    "wall_thickness_ratio",
    "wave_speed_from_stiffness",
]


def stiffness_from_wave_speed(wave_speed: npt.ArrayLike, density: float, m: float, n: float) -> FloatArray:
    """Return K = ρc²/(m − n) of a power pair whose wave speed at A = A0 is given.

    Parameters
    ----------
    wave_speed : array_like
        c in m/s at the reference area.
    density : float
        ρ of blood in kg/m³.
    m, n : float
        Exponents of the law.

    Returns
    -------
    ndarray
        K in Pa.

    Examples
    --------
    >>> float(stiffness_from_wave_speed(1.0, 1150.0, 10, -1.5))
    100.0
    >>> stiffness_from_wave_speed([], 1060.0, 10, -1.5)
    array([], dtype=float64)
    """
    check_exponents(m, n)
    return np.asarray(positive("density", density) * positive("wave speed", wave_speed) ** 2 / (m - n))


def wave_speed_from_stiffness(stiffness: npt.ArrayLike, density: float, m: float, n: float) -> FloatArray:
    """Return the wave speed at A = A0, c = sqrt(K (m − n)/ρ).

    Examples
    --------
    >>> float(wave_speed_from_stiffness(100.0, 1150.0, 10, -1.5))
    1.0
    """
    check_exponents(m, n)
    return np.asarray(np.sqrt(positive("stiffness", stiffness) * (m - n) / positive("density", density)))


def wall_modulus(young_modulus: npt.ArrayLike, wall_thickness: npt.ArrayLike, radius: npt.ArrayLike) -> FloatArray:
    """Return E h/r0 in Pa.

    Parameters
    ----------
    young_modulus, wall_thickness, radius : array_like
        E in Pa, h and r0 in m, all at the same state.

    Examples
    --------
    >>> float(wall_modulus(4e5, 1e-3, 4e-3))
    100000.0
    """
    return np.asarray(
        positive("Young's modulus", young_modulus)
        * positive("wall thickness", wall_thickness)
        / positive("radius", radius)
    )


def stiffness_from_modulus(wall_modulus: npt.ArrayLike, poisson_ratio: float) -> FloatArray:
    """Return K = (E h/r0)/(1 − ν²) of the artery law (m = 1/2, n = 0).

    Source: Formaggia, Lamponi & Quarteroni 2003, doi 10.1023/B:ENGI.0000007980.01347.29.

    Parameters
    ----------
    wall_modulus : array_like
        E h/r0 in Pa; r0 is the radius at the reference area.
    poisson_ratio : float
        ν in [0, 1/2]; 1/2 is an incompressible wall.

    Returns
    -------
    ndarray
        K in Pa.

    Raises
    ------
    InputError
        ν lies outside [0, 1/2].

    Examples
    --------
    >>> float(stiffness_from_modulus(75000.0, 0.5))
    100000.0
    >>> stiffness_from_modulus(75000.0, 1.0)
    Traceback (most recent call last):
    geomprep.errors.InputError: Poisson ratio 1: it must lie between 0 and 0.5
    """
    return np.asarray(positive("E h/r0", wall_modulus) / _plane_stress(poisson_ratio))


def thin_wall_speed(wall_modulus: npt.ArrayLike, density: float, poisson_ratio: float) -> FloatArray:
    """Return c = sqrt((E h/r0)/(2 ρ (1 − ν²))), the thin wall held lengthwise.

    Source: Formaggia, Lamponi & Quarteroni 2003, doi 10.1023/B:ENGI.0000007980.01347.29.

    Parameters
    ----------
    wall_modulus : array_like
        E h/r0 in Pa.
    density : float
        ρ of blood in kg/m³.
    poisson_ratio : float
        ν in [0, 1/2].

    Returns
    -------
    ndarray
        c in m/s.

    Examples
    --------
    >>> float(thin_wall_speed(1500.0, 1000.0, 0.5))
    1.0
    """
    return np.asarray(np.sqrt(stiffness_from_modulus(wall_modulus, poisson_ratio) / (2 * positive("density", density))))


def moens_korteweg_speed(wall_modulus: npt.ArrayLike, density: float) -> FloatArray:
    """Return c = sqrt((E h/r0)/(2 ρ)), the classical speed without the factor 1 − ν².

    Source: Korteweg 1878, doi 10.1002/andp.18782411206. Not used for tube laws here: it is
    sqrt(1 − ν²) of :func:`thin_wall_speed`, 13.4 % slower for ν = 1/2.

    Examples
    --------
    >>> float(moens_korteweg_speed(2000.0, 1000.0))
    1.0
    """
    return np.asarray(np.sqrt(positive("E h/r0", wall_modulus) / (2 * positive("density", density))))


def exponential_modulus(radius: npt.ArrayLike, k1: float, k2: float, k3: float) -> FloatArray:
    """Return E h/r0 = k1 exp(k2 r0) + k3.

    Source of the form: Olufsen 1999, Am J Physiol Heart Circ Physiol 276:H257-H268.

    Parameters
    ----------
    radius : array_like
        r0 in m.
    k1, k3 : float
        Pa.
    k2 : float
        1/m, negative.

    Returns
    -------
    ndarray
        E h/r0 in Pa.

    Examples
    --------
    >>> float(exponential_modulus(1.0, 0.0, -1.0, 5e4))
    50000.0
    """
    return np.asarray(k1 * np.exp(k2 * positive("radius", radius)) + k3)


def power_wave_speed(radius: npt.ArrayLike, speed: float, diameter: float, exponent: float) -> FloatArray:
    """Return c = speed·(diameter/D)^exponent with D = 2 r.

    Source of the form: Reymond et al. 2009, doi 10.1152/ajpheart.00037.2009.

    Parameters
    ----------
    radius : array_like
        r in m at the pressure state of the row.
    speed : float
        Wave speed in m/s at the diameter named next.
    diameter : float
        m.
    exponent : float

    Returns
    -------
    ndarray
        c in m/s.

    Examples
    --------
    >>> float(power_wave_speed(0.5e-3, 13.3, 1e-3, 0.3))
    13.3
    """
    return np.asarray(speed * (diameter / (2 * positive("radius", radius))) ** exponent)


def wall_thickness_ratio(radius: npt.ArrayLike, a: float, b: float, c: float, d: float) -> FloatArray:
    """Return h/r0 = a exp(b r0) + c exp(d r0).

    Source of the form: Blanco et al. 2015, IEEE Trans Biomed Eng 62:736-753,
    doi 10.1109/TBME.2014.2364522.

    Parameters
    ----------
    radius : array_like
        r0 in m.
    a, c : float
        Pure numbers.
    b, d : float
        1/m.

    Returns
    -------
    ndarray
        Wall thickness over radius.

    Examples
    --------
    >>> float(wall_thickness_ratio(1.0, 0.2, 0.0, 0.0, 0.0))
    0.2
    """
    radii = positive("radius", radius)
    return np.asarray(a * np.exp(b * radii) + c * np.exp(d * radii))


def _plane_stress(poisson_ratio: float) -> float:
    """Factor 1 − ν² of a wall held lengthwise."""
    if not 0 <= poisson_ratio <= 0.5:
        raise InputError(f"Poisson ratio {poisson_ratio:g}: it must lie between 0 and 0.5")
    return 1 - poisson_ratio**2


@dataclass(frozen=True)
class Relation:
    """One fitted relation of a quantity with the radius.

    Attributes
    ----------
    gives : str
        ``wave speed``, ``wall modulus`` (E h/r0) or ``thickness ratio`` (h/r0).
    coefficients : tuple of (str, str)
        Name and kind of each coefficient, the kind as text of an SI unit.
    function : callable
        Takes the radius in m and the coefficients by name, in SI.
    """

    gives: str
    coefficients: tuple[tuple[str, str], ...]
    function: Callable[..., FloatArray]


RELATIONS: Final[dict[str, Relation]] = {
    "power_wave_speed": Relation(
        "wave speed", (("speed", "m/s"), ("diameter", "m"), ("exponent", "")), power_wave_speed
    ),
    "exponential_modulus": Relation("wall modulus", (("k1", "Pa"), ("k2", "1/m"), ("k3", "Pa")), exponential_modulus),
    "wall_thickness_ratio": Relation(
        "thickness ratio", (("a", ""), ("b", "1/m"), ("c", ""), ("d", "1/m")), wall_thickness_ratio
    ),
}
"""Name of each relation -> what it gives, its coefficients and its function of the radius."""
