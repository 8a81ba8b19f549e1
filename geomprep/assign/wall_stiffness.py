"""The wave speed at the imaged state of every station, from what a setting states."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from geomprep.assign.wall_uses import DEFAULT_STIFFNESS, WallUse
from geomprep.errors import InputError, OpenQuestions, Question
from geomprep.laws.reference_state import slowest_wave_speed
from geomprep.laws.stiffness import RELATIONS, thin_wall_speed, wall_modulus
from geomprep.literature import Row, row, rows
from geomprep.model import Basis, FloatArray

__all__ = ["WaveSpeeds", "wave_speeds"]

_PLURAL: Final = {"artery": "arteries", "vein": "veins"}


@dataclass(frozen=True, eq=False)
class WaveSpeeds:
    """Wave speed of stations and where it comes from.

    Attributes
    ----------
    speed : (k,) float array
        m/s at the imaged state.
    basis : Basis
    detail : str
        Literature key, or case keys and the radius that was used.
    source : Row, optional
        The literature row, where one was used.
    by_default : bool
        Whether nothing was stated and the default of the class was taken.
    """

    speed: FloatArray
    basis: Basis
    detail: str
    source: Row | None = None
    by_default: bool = False


def wave_speeds(use: WallUse, radius: FloatArray, transmural: FloatArray, density: float) -> WaveSpeeds:
    """Find the wave speed at the imaged state.

    Parameters
    ----------
    use : WallUse
        The setting.
    radius, transmural : (k,) float array
        Imaged equal-area radius in m and transmural pressure in Pa of the stations it holds for.
    density : float
        ρ of blood in kg/m³.

    Returns
    -------
    WaveSpeeds

    Raises
    ------
    InputError
        The setting contradicts itself, lacks a number, or names a row that gives no stiffness of
        this class.
    OpenQuestions
        Nothing is stated for veins: no default is surely known.
    """
    settings = use.settings
    _check_positive(use)
    if settings.stiffness in (None, "user"):
        if settings.wave_speed is not None:
            return WaveSpeeds(np.full(len(radius), settings.wave_speed), Basis.USER, f"{use.key}.wave_speed")
        if settings.young_modulus is not None:
            return _from_modulus(use, radius, density)
        if settings.stiffness == "user":
            raise InputError(f'[{use.key}]: stiffness = "user" needs wave_speed, or young_modulus and wall_thickness')
    key = settings.stiffness or DEFAULT_STIFFNESS.get(use.vessel_class)
    if key is None:
        raise OpenQuestions([_question(use, transmural, density)])
    return _from_row(use, row(key), radius, density)


def _check_positive(use: WallUse) -> None:
    """Raise where a stated number is impossible or two of them contradict each other."""
    settings = use.settings
    for name in ("wave_speed", "young_modulus", "wall_thickness"):
        value = getattr(settings, name)
        if value is not None and not 0 < value < math.inf:
            raise InputError(f"[{use.key}]: {name} = {value:g} (SI); it must be finite and above zero")
    if settings.wave_speed is not None and settings.young_modulus is not None:
        raise InputError(f"[{use.key}]: wave_speed and young_modulus are both stated; keep one of them")
    if settings.stiffness not in (None, "user") and (settings.wave_speed or settings.young_modulus):
        raise InputError(
            f"[{use.key}]: stiffness = '{settings.stiffness}' and a number of your own are both stated; "
            'keep one of them (stiffness = "user" for the number)'
        )


def _poisson_ratio(use: WallUse) -> float:
    """Poisson ratio that was stated, else that of an incompressible wall."""
    stated = use.settings.poisson_ratio
    return float(row("wall-poisson-ratio").value or 0.0) if stated is None else stated


def _from_modulus(use: WallUse, radius: FloatArray, density: float) -> WaveSpeeds:
    """Wave speed of the thin wall of an artery whose E and h are stated."""
    modulus, thickness = use.settings.young_modulus, use.settings.wall_thickness
    if use.vessel_class == "vein":
        raise InputError(
            f"[{use.key}]: young_modulus does not fix the law of a collapsible vein, whose two branches bend and "
            "stretch; state wave_speed"
        )
    if modulus is None or thickness is None:
        raise InputError(f"[{use.key}]: young_modulus needs wall_thickness beside it")
    ratio = _poisson_ratio(use)
    speed = thin_wall_speed(wall_modulus(modulus, thickness, radius), density, ratio)
    stated = ["young_modulus", "wall_thickness"] + (["poisson_ratio"] if use.settings.poisson_ratio is not None else [])
    keys = ", ".join(f"{use.key}.{name}" for name in stated)
    return WaveSpeeds(speed, Basis.USER, f"{keys}; Poisson ratio {ratio:g}, r0 = stations.radius (imaged)")


def _from_row(use: WallUse, source: Row, radius: FloatArray, density: float) -> WaveSpeeds:
    """Wave speed that a published row gives at the imaged radii."""
    gives = RELATIONS[source.function].gives if source.kind == "relation" else source.quantity
    if gives not in ("wave speed", "wall modulus", "speed"):
        raise InputError(
            f"[{use.key}]: stiffness = '{source.key}' gives {gives or source.kind}, no stiffness; {_ways(use)}"
        )
    if not source.fits(use.vessel_class):
        raise InputError(f"[{use.key}]: '{source.key}' holds for {_PLURAL[source.vessel_class]}; {_ways(use)}")
    if source.kind == "value":
        speed = np.full(len(radius), float(source.value or 0.0))
    else:
        speed = RELATIONS[source.function].function(radius, **dict(source.coefficients))
        if gives == "wall modulus":
            speed = thin_wall_speed(speed, density, _poisson_ratio(use))
    return WaveSpeeds(speed, Basis.PUBLISHED, source.key, source, use.settings.stiffness is None)


def _stiffness_rows(vessel_class: str) -> list[Row]:
    """Rows that may be named as the stiffness of a class."""
    return [
        one
        for one in rows()
        if one.fits(vessel_class)
        and (
            (one.kind == "value" and one.quantity == "speed")
            or (one.kind == "relation" and RELATIONS[one.function].gives != "thickness ratio")
        )
    ]


def _ways(use: WallUse) -> str:
    """Keys that would do, for messages."""
    keys = ", ".join(one.key for one in _stiffness_rows(use.vessel_class))
    return f"choose one of {keys}, or user with a wave_speed"


def _question(use: WallUse, transmural: FloatArray, density: float) -> Question:
    """What to ask where nothing is stated for veins."""
    exponents = dict(use.exponents.coefficients)
    bounds = slowest_wave_speed(transmural, density, exponents["m"], exponents["n"])
    bound = float(bounds.max(initial=0.0)) if use.settings.reference_state == "buckling" else 0.0
    candidates, evidence = (
        [f"wave_speed above {bound:.4g} m/s"],
        [
            f"bound of the buckling reference state at {float(np.abs(transmural).max(initial=0.0)):.4g} Pa"
            if bound
            else "any speed fits the imaged reference state"
        ],
    )
    for one in _stiffness_rows(use.vessel_class):
        state = ' with reference_state = "imaged"' if one.value is not None and one.value <= bound else ""
        speed = "" if one.value is None else f" ({one.value:g} m/s)"
        candidates.append(f'stiffness = "{one.key}"{speed}{state}')
        evidence.append(f"{one.of}; {one.caution or one.citation}")
    return Question(
        f"{use.key}.wave_speed",
        "How fast does a pressure wave run in the veins? No published wave speed of these veins is surely known.",
        tuple(candidates),
        tuple(evidence),
    )
