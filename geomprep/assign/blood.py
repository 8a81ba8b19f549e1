"""Blood: density, viscosity and velocity profile, stated or published."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from geomprep.errors import InputError
from geomprep.literature import row
from geomprep.model import Basis, Blood, Origin

__all__ = ["BloodSettings", "assign_blood"]

_ROWS: Final = {
    "density": "blood-density",
    "viscosity": "blood-viscosity",
    "velocity_profile": "velocity-profile-parabolic",
}
_POSSIBLE: Final = {
    "density": (500.0, 2000.0, "kg/m3"),
    "viscosity": (1e-4, 1.0, "Pa.s"),
    "velocity_profile": (1e-3, 1000.0, ""),
}
"""What any liquid in vessels or phantoms can have; outside, a unit has slipped."""


@dataclass(frozen=True)
class BloodSettings:
    """What the case states about blood, SI; None takes the published value.

    Attributes
    ----------
    density : float, optional
        kg/m³.
    viscosity : float, optional
        Pa·s.
    velocity_profile : float, optional
        Exponent z; 2 is parabolic.
    """

    density: float | None = None
    viscosity: float | None = None
    velocity_profile: float | None = None


def assign_blood(settings: BloodSettings | None = None) -> tuple[Blood, tuple[Origin, ...]]:
    """Make the blood of a network.

    Parameters
    ----------
    settings : BloodSettings, optional

    Returns
    -------
    blood : Blood
    origins : tuple of Origin
        ``user`` for what was stated, ``published`` with the literature key for the rest.

    Raises
    ------
    InputError
        A number that no blood and no phantom liquid can have.

    Examples
    --------
    >>> assign_blood()[0]
    Blood(density=1060.0, viscosity=0.0035, velocity_profile=2.0)
    >>> assign_blood(BloodSettings(viscosity=4e-3))[1][1].detail
    'blood.viscosity'
    >>> assign_blood(BloodSettings(density=1.06))
    Traceback (most recent call last):
    geomprep.errors.InputError: blood.density = 1.06 kg/m3: it must lie between 500 and 2000 kg/m3; check the unit
    """
    stated = settings or BloodSettings()
    values: dict[str, float] = {}
    origins: list[Origin] = []
    for name, key in _ROWS.items():
        own = getattr(stated, name)
        published = row(key).value
        values[name] = _possible(name, published if own is None else own)
        origins.append(
            Origin(f"blood.{name}", Basis.PUBLISHED, key)
            if own is None
            else Origin(f"blood.{name}", Basis.USER, f"blood.{name}")
        )
    return Blood(**values), tuple(origins)


def _possible(name: str, value: float | None) -> float:
    """Return a value, or raise where no liquid can have it."""
    low, high, unit = _POSSIBLE[name]
    if value is None or not low <= value <= high:
        unit = f" {unit}" if unit else ""
        raise InputError(
            f"blood.{name} = {value:g}{unit}: it must lie between {low:g} and {high:g}{unit}; check the unit"
        )
    return float(value)
