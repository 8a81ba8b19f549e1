"""What the velocity profile u(r) = U (z + 2)/z (1 − (r/R)^z) does to momentum and friction.

Sources: Hughes & Lubliner 1973, doi 10.1016/0025-5564(73)90027-8; Smith, Pullan & Hunter
2002, doi 10.1137/S0036139999355199.
"""

from __future__ import annotations

import math

from geomprep.errors import InputError

__all__ = ["friction_coefficient", "momentum_factor", "profile_exponent"]


def momentum_factor(velocity_profile: float) -> float:
    """Return the momentum correction (z + 2)/(z + 1) of a profile.

    Parameters
    ----------
    velocity_profile : float
        Exponent z > 0; 2 is parabolic, 9 blunt.

    Returns
    -------
    float
        Mean of u² over U²: 4/3 for a parabola, 1 for a flat profile.

    Raises
    ------
    InputError
        z is not finite and above zero.

    Examples
    --------
    >>> momentum_factor(9)
    1.1
    >>> momentum_factor(0)
    Traceback (most recent call last):
    geomprep.errors.InputError: velocity profile 0: the exponent must be finite and above zero (2 is parabolic)
    """
    _check(velocity_profile)
    return (velocity_profile + 2) / (velocity_profile + 1)


def profile_exponent(momentum_factor: float) -> float:
    """Return the exponent z of a momentum correction, (2 − α)/(α − 1).

    Raises
    ------
    InputError
        α does not lie between 1 and 2.

    Examples
    --------
    >>> round(profile_exponent(1.1), 12)
    9.0
    >>> profile_exponent(1.0)
    Traceback (most recent call last):
    geomprep.errors.InputError: momentum correction 1: it must lie between 1 and 2
    """
    if not 1 < momentum_factor < 2:
        raise InputError(f"momentum correction {momentum_factor:g}: it must lie between 1 and 2")
    return (2 - momentum_factor) / (momentum_factor - 1)


def friction_coefficient(viscosity: float, velocity_profile: float) -> float:
    """Return 2 (z + 2) π μ: the friction force per length over the mean velocity.

    The resistance per length is this over A².

    Parameters
    ----------
    viscosity : float
        μ in Pa·s.
    velocity_profile : float
        Exponent z.

    Returns
    -------
    float
        Pa·s (N per m per m/s).

    Examples
    --------
    >>> round(friction_coefficient(1.0, 2) / math.pi, 12)
    8.0
    """
    _check(velocity_profile)
    return 2 * (velocity_profile + 2) * math.pi * viscosity


def _check(velocity_profile: float) -> None:
    """Raise unless the exponent makes a profile."""
    if not 0 < velocity_profile < math.inf:
        raise InputError(
            f"velocity profile {velocity_profile:g}: the exponent must be finite and above zero (2 is parabolic)"
        )
