"""What a lumen that is no circle does to laminar resistance: R per length = 8πμ/A² · friction shape.

The friction shape is 1 for a circle and above 1 for any other outline of the same area
(Pólya 1948, doi 10.1090/qam/26817, from memory: of all shapes the circle is the stiffest in torsion, which
is the same equation). It is a pure number, the same in every unit.
"""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.laws.arrays import FloatArray, positive

__all__ = [
    "ellipse_friction_shape",
    "friction_shape",
    "friction_shape_from_moment",
    "triangle_friction_shape",
]

Outline = Literal["elliptic", "triangular"]

_CIRCLE_COMPACTNESS: Final = 4 * np.pi  # P²/A
_TRIANGLE_COMPACTNESS: Final = 12 * np.sqrt(3)
_LEAST_CIRCLE: Final = 0.98  # P²/(4πA) of a polygon with rounding is below 1 by far less


def ellipse_friction_shape(axis_ratio: npt.ArrayLike) -> FloatArray:
    r"""Return (k + 1/k)/2 of an ellipse whose axes have the ratio k.

    Parameters
    ----------
    axis_ratio : array_like
        Long axis over short axis, or its inverse; above zero.

    Returns
    -------
    ndarray
        Friction shape, same shape as `axis_ratio`.

    Raises
    ------
    InputError
        A ratio is not finite and above zero.

    Notes
    -----
    With semi-axes a and b and the pressure gradient G, u = G a²b²/(2μ(a² + b²)) · (1 − x²/a² − y²/b²)
    solves μ∇²u = −G and is zero on the wall. Its integral is Q = πG a³b³/(4μ(a² + b²)), so
    G/Q = 4μ(a² + b²)/(πa³b³). Divided by 8πμ/A² with A = πab: (a² + b²)/(2ab).

    Examples
    --------
    >>> ellipse_friction_shape([1.0, 2.0, 5.0])
    array([1.  , 1.25, 2.6 ])
    """
    ratio = positive("axis ratio", axis_ratio)
    return np.asarray(0.5 * (ratio + 1 / ratio))


def triangle_friction_shape() -> float:
    """Return 5/(2π)·√3 = 1.378 of an equilateral triangle.

    Notes
    -----
    With the distances d₁, d₂, d₃ from the three sides, whose sum is the height h, and the pressure gradient
    G, u = G d₁d₂d₃/(μh) is zero on the wall. Normals of two sides have the product −1/2, so
    ∇²(d₁d₂d₃) = −(d₁ + d₂ + d₃) = −h and μ∇²u = −G. The mean of d₁d₂d₃ over the triangle is h³/60, so
    Q = G h²A/(60μ); with h² = √3 A, G/Q = 20√3 μ/A². Divided by 8πμ/A²: 5√3/(2π).

    Examples
    --------
    >>> round(triangle_friction_shape(), 4)
    1.3783
    """
    return float(5 * np.sqrt(3) / (2 * np.pi))


def friction_shape(area: npt.ArrayLike, perimeter: npt.ArrayLike, outline: Outline = "elliptic") -> FloatArray:
    r"""Return the friction shape of a measured outline from its area and perimeter.

    From the compactness C = P²/A, or κ = C/(4π), which is 1 for a circle, for two families of outlines:

    - elliptic (veins of the neck, arteries): (8C/3 − 8π/3)/(8π) = (4κ − 1)/3;
    - triangular (dural sinuses): (25C/17 + 40√3/17)/(8π) from the equilateral triangle on; a rounder one lies
      on the parabola κ − b(κ − 1)² from the circle to it.

    Use :func:`friction_shape_from_moment` where the outline is of neither kind or its edge is rough: a stair of
    voxels lengthens the perimeter and hardly moves the second moment.

    Parameters
    ----------
    area, perimeter : array_like
        m² and m; not a number gives not a number.
    outline : str
        ``elliptic`` or ``triangular``.

    Returns
    -------
    ndarray
        1 or above.

    Raises
    ------
    InputError
        A value is not above zero, an outline is shorter than the circle of its area, or unknown.

    Notes
    -----
    Source of both lines: Mortensen, Okkels & Bruus 2005, doi 10.1103/PhysRevE.71.057301 (coefficients from
    memory; they give the circle and the equilateral triangle exactly). The parabola is ours: a circle with a
    wave of n periods and small height ε has κ = 1 + (n² − 1)ε²/2 and the shape 1 + 2(n − 1)ε², so that for n = 3 it
    starts with the slope 1, and it ends in the triangle. Error against the closed forms, and for triangles
    rounded by a radius (in sides of the inner triangle) against solved velocity fields:

    ==========================  ============  ============  ==================
    shape                       elliptic      triangular    from the moment
    ==========================  ============  ============  ==================
    circle                      0             0             0
    ellipse 2:1                 +0.1 %        −7 %          0
    ellipse 3:1                 +0.7 %        −19.5 %       0
    ellipse 5:1                 +1.8 %        −31 %         0
    equilateral triangle        +36 %         0             −12 %
    triangle rounded by 0.1     +14 %         −2 %          −11 %
    triangle rounded by 0.4     +4 %          −1 %          −6 %
    ==========================  ============  ============  ==================

    Examples
    --------
    >>> friction_shape([np.pi, np.nan], [2 * np.pi, np.nan])
    array([ 1., nan])
    >>> float(friction_shape(np.sqrt(3) / 4, 3.0, "triangular").round(4))
    1.3783
    """
    compactness = _compactness(area, perimeter)
    if outline == "elliptic":
        relation = compactness / (3 * np.pi) - 1 / 3
    elif outline == "triangular":
        beyond, most = compactness / _CIRCLE_COMPACTNESS - 1, _TRIANGLE_COMPACTNESS / _CIRCLE_COMPACTNESS - 1
        rounded = 1 + beyond - (most + 1 - triangle_friction_shape()) * (beyond / most) ** 2
        sharp = (25 * compactness + 40 * np.sqrt(3)) / (17 * 8 * np.pi)
        relation = np.where(compactness < _TRIANGLE_COMPACTNESS, rounded, sharp)
    else:
        raise InputError(f"outline '{outline}': it must be elliptic or triangular")
    return np.asarray(np.maximum(relation, 1.0))


def friction_shape_from_moment(area: npt.ArrayLike, polar_moment: npt.ArrayLike) -> FloatArray:
    r"""Return 2π I/A² of a measured outline, from its area and its polar second moment.

    Parameters
    ----------
    area, polar_moment : array_like
        A in m² and I = ∫(x² + y²) dA about the centre of area in m⁴; not a number gives not a number.

    Returns
    -------
    ndarray
        1 or above.

    Raises
    ------
    InputError
        A value is not above zero, or a moment lies below that of the circle of the same area.

    Notes
    -----
    Saint-Venant's torsion constant J ≈ A⁴/(4π²I) (1880, from memory) put into A²/(2πJ); used for
    channels of any outline by Bahrami, Yovanovich & Culham 2006, doi 10.1115/1.2234786 (from memory). Error against the
    closed forms: none for every ellipse (I = πab(a² + b²)/4), −12.3 % for the equilateral triangle
    (I = √3 s⁴/48).

    Examples
    --------
    >>> float(friction_shape_from_moment(2 * np.pi, np.pi * 2 * 5 / 4).round(12))
    1.25
    """
    areas, moments = _measured("area", area), _measured("polar moment", polar_moment)
    shape = 2 * np.pi * moments / areas**2
    low = np.ravel(shape < _LEAST_CIRCLE)
    if low.any():
        raise InputError(
            f"2π·polar moment/area² = {np.ravel(shape)[low][0]:.3g}: no outline lies below 1, the circle; "
            "take the moment about the centre of area"
        )
    return np.asarray(np.maximum(shape, 1.0))


def _compactness(area: npt.ArrayLike, perimeter: npt.ArrayLike) -> FloatArray:
    """P²/A, or raise where no outline can have it."""
    compactness = np.asarray(_measured("perimeter", perimeter) ** 2 / _measured("area", area))
    low = np.ravel(compactness < _LEAST_CIRCLE * _CIRCLE_COMPACTNESS)
    if low.any():
        value = np.ravel(compactness)[low][0] / _CIRCLE_COMPACTNESS
        raise InputError(
            f"perimeter²/(4π·area) = {value:.3g}: no outline lies below 1, the circle; check the units of both"
        )
    return compactness


def _measured(name: str, values: npt.ArrayLike) -> FloatArray:
    """Values as floats, not a number where nothing was measured; raise where one is not above zero."""
    array = np.asarray(values, dtype=np.float64)
    positive(name, array[~np.isnan(array)])
    return array
