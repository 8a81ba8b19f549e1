"""Tube laws: transmural pressure and lumen area, one from the other.

Every law is written as p_tm = p0 + K f(A/A0): K is the stiffness in Pa, p0 the transmural
pressure at which A = A0, and f the law's own *load*. :data:`FORMS` is the closed table of
laws; a new law is one module with `load`, `load_slope`, `area_ratio` and `lowest_load`, and
one row here.

The transmural pressure is the pressure inside minus the pressure outside.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError, ModelError
from geomprep.laws import power_pair
from geomprep.laws.arrays import FloatArray, positive

__all__ = ["FORMS", "Form", "area", "form_named", "pressure", "slope", "wave_speed"]


@dataclass(frozen=True)
class Form:
    """One tube law.

    Attributes
    ----------
    equation : str
        The law as text, as it stands in the network file.
    parameters : tuple of str
        Names of the shape parameters, in the order in which the functions take them.
    load, load_slope : callable
        f(a, *shape) and a·df/da.
    area_ratio : callable
        Inverse of `load`.
    lowest_load : callable
        Load (of *shape) that a vanishing area approaches.
    """

    equation: str
    parameters: tuple[str, ...]
    load: Callable[..., FloatArray]
    load_slope: Callable[..., FloatArray]
    area_ratio: Callable[..., FloatArray]
    lowest_load: Callable[..., float]


FORMS: Final[dict[str, Form]] = {
    "power pair": Form(
        power_pair.EQUATION,
        power_pair.PARAMETERS,
        power_pair.load,
        power_pair.load_slope,
        power_pair.area_ratio,
        power_pair.lowest_load,
    ),
}
"""Name of each law -> its functions and its equation."""


def form_named(name: str) -> Form:
    """Return the law of a name.

    Raises
    ------
    InputError
        No law has this name.

    Examples
    --------
    >>> form_named("power pair").parameters
    ('m', 'n')
    >>> form_named("rubber")
    Traceback (most recent call last):
    geomprep.errors.InputError: tube law 'rubber' is unknown; choose one of power pair
    """
    if name not in FORMS:
        raise InputError(f"tube law '{name}' is unknown; choose one of {', '.join(FORMS)}")
    return FORMS[name]


def pressure(
    area: npt.ArrayLike,
    reference_area: npt.ArrayLike,
    stiffness: npt.ArrayLike,
    reference_transmural: npt.ArrayLike,
    shape: Sequence[float],
    form: str = "power pair",
) -> FloatArray:
    """Return the transmural pressure at which a tube has an area.

    Parameters
    ----------
    area, reference_area : array_like
        A and A0 in m², > 0; arrays of shapes that broadcast.
    stiffness : array_like
        K in Pa, > 0.
    reference_transmural : array_like
        p0 in Pa.
    shape : sequence of float
        Shape parameters of the law: (m, n) of the power pair.
    form : str
        Name in :data:`FORMS`.

    Returns
    -------
    ndarray
        p_tm in Pa.

    Raises
    ------
    InputError
        An area or a stiffness is not above zero, or the law is unknown.

    Examples
    --------
    >>> float(pressure(4e-6, 1e-6, 1000.0, 50.0, (0.5, 0.0)))
    1050.0
    >>> pressure([], [], [], [], (0.5, 0.0))
    array([], dtype=float64)
    """
    ratio = positive("area", area) / positive("reference area", reference_area)
    loads = form_named(form).load(ratio, *shape)
    return np.asarray(np.asarray(reference_transmural) + positive("stiffness", stiffness) * loads)


def area(
    pressure: npt.ArrayLike,
    reference_area: npt.ArrayLike,
    stiffness: npt.ArrayLike,
    reference_transmural: npt.ArrayLike,
    shape: Sequence[float],
    form: str = "power pair",
) -> FloatArray:
    """Return the area of a tube at a transmural pressure (the inverse of :func:`pressure`).

    Parameters
    ----------
    pressure : array_like
        p_tm in Pa. For the artery exponents (n = 0) it must lie above p0 − K, where the law
        closes the tube; for n < 0 every finite pressure has an area.
    reference_area, stiffness, reference_transmural : array_like
        A0 in m², K and p0 in Pa.
    shape : sequence of float
        Shape parameters of the law: (m, n) of the power pair.
    form : str
        Name in :data:`FORMS`.

    Returns
    -------
    ndarray
        A in m².

    Raises
    ------
    ModelError
        The law has no area at a pressure.

    Examples
    --------
    >>> float(area(1050.0, 1e-6, 1000.0, 50.0, (0.5, 0.0)))
    4e-06
    >>> area(-950.0, 1e-6, 1000.0, 50.0, (0.5, 0.0))
    Traceback (most recent call last):
    geomprep.errors.ModelError: transmural pressure -950 Pa: this power pair law has an area only above -950 Pa
    """
    law = form_named(form)
    zero, scale = np.asarray(reference_transmural, dtype=np.float64), positive("stiffness", stiffness)
    loads = np.asarray((np.asarray(pressure, dtype=np.float64) - zero) / scale)
    lowest = law.lowest_load(*shape)
    bad = ~(np.isfinite(loads) & (loads > lowest))
    if bad.any():
        shown, limit = (np.broadcast_to(v, loads.shape)[bad].ravel()[0] for v in (pressure, zero + lowest * scale))
        raise ModelError(f"transmural pressure {shown:g} Pa: this {form} law has an area only above {limit:g} Pa")
    return np.asarray(positive("reference area", reference_area) * law.area_ratio(loads, *shape))


def slope(
    area: npt.ArrayLike,
    reference_area: npt.ArrayLike,
    stiffness: npt.ArrayLike,
    shape: Sequence[float],
    form: str = "power pair",
) -> FloatArray:
    """Return dp/dA of a tube law.

    Parameters
    ----------
    area, reference_area : array_like
        A and A0 in m².
    stiffness : array_like
        K in Pa.
    shape : sequence of float
        Shape parameters of the law.
    form : str
        Name in :data:`FORMS`.

    Returns
    -------
    ndarray
        dp/dA in Pa/m²; the compliance per length is its inverse.

    Examples
    --------
    >>> float(slope(1e-4, 1e-4, 200.0, (0.5, 0.0)))
    1000000.0
    """
    areas = positive("area", area)
    loads = form_named(form).load_slope(areas / positive("reference area", reference_area), *shape)
    return np.asarray(positive("stiffness", stiffness) * loads / areas)


def wave_speed(  # one value for each array of the formula c² = (A/ρ) dp/dA
    area: npt.ArrayLike,
    reference_area: npt.ArrayLike,
    stiffness: npt.ArrayLike,
    density: float,
    shape: Sequence[float],
    form: str = "power pair",
) -> FloatArray:
    """Return the speed of a small pressure wave, c² = (A/ρ) dp/dA.

    Source: Bramwell & Hill 1922, doi 10.1098/rspb.1922.0022.

    Parameters
    ----------
    area, reference_area : array_like
        A and A0 in m².
    stiffness : array_like
        K in Pa.
    density : float
        ρ of blood in kg/m³.
    shape : sequence of float
        Shape parameters of the law.
    form : str
        Name in :data:`FORMS`.

    Returns
    -------
    ndarray
        c in m/s.

    Examples
    --------
    >>> float(wave_speed(1e-4, 1e-4, 2000.0, 1000.0, (0.5, 0.0)))
    1.0
    """
    areas = positive("area", area)
    gradient = slope(areas, reference_area, stiffness, shape, form)
    return np.asarray(np.sqrt(areas / positive("density", density) * gradient))
