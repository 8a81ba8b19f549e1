"""What presses on the vessels from outside: pressure of every station from the surroundings it lies in."""

from __future__ import annotations

import difflib
from collections.abc import Collection, Mapping
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from geomprep.assign.gravity import Gravity, heights
from geomprep.assign.origins import origins_by_rows
from geomprep.errors import CaseError
from geomprep.findings import Finding, Severity
from geomprep.model import VESSEL_CLASSES, Basis, BoolArray, FloatArray, IntArray, Network, Origin, Surroundings
from geomprep.units import STANDARD_GRAVITY

__all__ = [
    "ATMOSPHERE_SOURCE",
    "CRANIUM",
    "StationSurroundings",
    "SurroundingsSettings",
    "station_surroundings",
    "surroundings_at_imaging",
]

ATMOSPHERE_SOURCE: Final = "gauge-pressure-atmosphere"
"""Key of the literature row for the zero of gauge pressure."""

CRANIUM: Final = "cranium"
"""Id of the surroundings whose pressure ``imaging_state.intracranial_pressure`` is."""

_ATMOSPHERE: Final = "atmosphere"
_CLASS_WORDS: Final = {"artery": "artery", "arteries": "artery", "vein": "vein", "veins": "vein"}
_EVERYTHING: Final = "all"


@dataclass(frozen=True)
class SurroundingsSettings:
    """One ``[surroundings.<id>]`` of a case, SI.

    Attributes
    ----------
    pressure : float
        Gauge pressure in Pa at `reference_height`.
    reference_height : float
        Metres, on the scale of node heights.
    fluid_density : float, optional
        kg/m³; None for the same pressure everywhere.
    vessels : tuple of str
        Names of vessels, ``arteries``, ``veins``, or ``all``.
    """

    pressure: float
    reference_height: float = 0.0
    fluid_density: float | None = None
    vessels: tuple[str, ...] = (_EVERYTHING,)


@dataclass(frozen=True, eq=False)
class StationSurroundings:
    """Surroundings in use and what they do at every station.

    Attributes
    ----------
    surroundings : tuple of Surroundings
        In the order of the case; the atmosphere last, where a vessel lies in no other.
    index : (k,) int array
        Number of the surroundings of each station.
    external_pressure : (k,) float array
        Gauge pressure outside each station, Pa.
    origins : tuple of Origin
    findings : tuple of Finding
    """

    surroundings: tuple[Surroundings, ...]
    index: IntArray
    external_pressure: FloatArray
    origins: tuple[Origin, ...]
    findings: tuple[Finding, ...]


def station_surroundings(
    network: Network, settings: Mapping[str, SurroundingsSettings], field: Gravity
) -> StationSurroundings:
    """Find the surroundings and the external pressure of every station.

    A vessel named by name lies there; else its class decides; else ``all``. A vessel that none
    of them reaches lies in the atmosphere at gauge pressure 0. In a fluid column the pressure falls
    with height z as p(z) = p − ρ g (z − z_reference).

    Parameters
    ----------
    network : Network
    settings : mapping of str to SurroundingsSettings
        By id.
    field : Gravity
        Gives the heights of stations.

    Returns
    -------
    StationSurroundings

    Raises
    ------
    CaseError
        A name fits no vessel, or two surroundings claim one vessel with equal right.
    """
    owner = _owner(network, settings)
    ids = [*settings]
    used = [row for row in range(len(ids)) if np.any(owner == row)]
    found = [_record(ids[row], settings[ids[row]]) for row in used]
    open_air = owner < 0
    if open_air.any() or not found:
        found.append(Surroundings("open air" if _ATMOSPHERE in settings else _ATMOSPHERE, 0.0))
    renumbered = np.full(len(ids) + 1, len(used), np.int64)
    renumbered[used] = np.arange(len(used))
    index = renumbered[owner][network.stations.segment]
    return StationSurroundings(
        surroundings=tuple(found),
        index=index,
        external_pressure=_pressure(found, index, heights(field, network.stations.position)),
        origins=_origins(found, settings),
        findings=_unused(ids, used) + _in_air(network, settings, open_air),
    )


def surroundings_at_imaging(
    settings: Mapping[str, SurroundingsSettings], intracranial_pressure: float | None
) -> tuple[dict[str, SurroundingsSettings], tuple[Finding, ...]]:
    """Return the surroundings as they were while imaged.

    Parameters
    ----------
    settings : mapping of str to SurroundingsSettings
        As modelled, by id.
    intracranial_pressure : float, optional
        Pressure in the cranium while imaged, Pa.

    Returns
    -------
    settings : dict
        The pressure of :data:`CRANIUM` replaced where one is stated.
    findings : tuple of Finding
        A warning where a pressure is stated and no vessel is said to lie in the cranium.

    Examples
    --------
    >>> surroundings_at_imaging({"cranium": SurroundingsSettings(900.0)}, 1300.0)[0]["cranium"].pressure
    1300.0
    >>> len(surroundings_at_imaging({}, 1300.0)[1])
    1
    """
    found = dict(settings)
    if intracranial_pressure is None:
        return found, ()
    if CRANIUM in found:
        found[CRANIUM] = replace(found[CRANIUM], pressure=intracranial_pressure)
        return found, ()
    message = (
        "imaging_state.intracranial_pressure is stated, but there is no [surroundings.cranium] that says which "
        "vessels lie inside: it presses on nothing."
    )
    return found, (Finding("intracranial pressure not used", Severity.WARNING, message),)


def _record(name: str, one: SurroundingsSettings) -> Surroundings:
    """Surroundings as the network carries them."""
    return Surroundings(name, one.pressure, one.reference_height, one.fluid_density)


def _owner(network: Network, settings: Mapping[str, SurroundingsSettings]) -> IntArray:
    """Row of the surroundings of every segment; −1 for none."""
    owner = np.full(len(network.segments), -1, np.int64)
    rank = np.full(len(network.segments), -1, np.int64)
    for row, (name, one) in enumerate(settings.items()):
        for word in one.vessels:
            inside, right = _members(network, word, name)
            clash = np.flatnonzero(inside & (rank == right) & (owner != row))
            if clash.size:
                vessel = network.segments.name[clash[0]] or network.segments.id[clash[0]]
                other = [*settings][owner[clash[0]]]
                raise CaseError(
                    f"surroundings.{name}.vessels: '{word}' puts {vessel} here, but surroundings.{other} claims it "
                    "with equal right; name the vessel in one of them"
                )
            won = inside & (rank < right)
            owner[won], rank[won] = row, right
    return owner


def _members(network: Network, word: str, name: str) -> tuple[BoolArray, int]:
    """Segments that a word means, and how strong its claim is: all 0, class 1, name 2."""
    if word == _EVERYTHING:
        return np.ones(len(network.segments), np.bool_), 0
    if word in _CLASS_WORDS:
        code = VESSEL_CLASSES.index(_CLASS_WORDS[word])
        return network.segments.vessel_class == code, 1
    names = [" ".join(str(vessel).split()).casefold() for vessel in network.segments.name]
    wanted = " ".join(word.split()).casefold()
    inside = np.array([vessel == wanted for vessel in names], np.bool_)
    if not wanted or not inside.any():
        known = sorted({str(vessel) for vessel in network.segments.name if vessel})
        near = difflib.get_close_matches(word, known, n=3, cutoff=0.0)
        raise CaseError(
            f"surroundings.{name}.vessels: '{word}' is no vessel of this network; "
            f"write all, arteries, veins{'' if not near else ', or such as ' + ', '.join(near)}"
        )
    return inside, 2


def _pressure(found: list[Surroundings], index: IntArray, height: FloatArray) -> FloatArray:
    """External pressure of stations at their heights."""
    pressure = np.array([one.pressure for one in found])
    reference = np.array([one.reference_height for one in found])
    weight = np.array([STANDARD_GRAVITY * (one.fluid_density or 0.0) for one in found])
    return np.asarray(pressure[index] - weight[index] * (height - reference[index]), dtype=np.float64)


def _origins(found: list[Surroundings], stated: Collection[str]) -> tuple[Origin, ...]:
    """Where pressure, height and density of each surroundings come from."""
    rows = np.eye(len(found), dtype=np.bool_)
    pressure, height, density = [], [], []
    for row, one in zip(rows, found, strict=True):
        path = f"surroundings.{one.id}"
        own = one.id in stated
        pressure.append((Basis.USER, f"{path}.pressure", row) if own else (Basis.PUBLISHED, ATMOSPHERE_SOURCE, row))
        zero = (Basis.DERIVED, "conventions.reference_height", row)  # the plane of height 0 itself
        height.append(zero if one.reference_height == 0.0 else (Basis.USER, f"{path}.reference_height", row))
        density.append((Basis.USER, f"{path}.fluid_density", row & (one.fluid_density is not None)))
    return (
        *origins_by_rows("surroundings.pressure", pressure),
        *origins_by_rows("surroundings.reference_height", height),
        *origins_by_rows("surroundings.fluid_density", density),
    )


def _unused(ids: list[str], used: list[int]) -> tuple[Finding, ...]:
    """A finding for surroundings in which no vessel lies."""
    return tuple(
        Finding("surroundings without vessels", Severity.WARNING, f"No vessel lies in surroundings.{name}.", where=name)
        for row, name in enumerate(ids)
        if row not in used
    )


def _in_air(network: Network, settings: Mapping[str, SurroundingsSettings], open_air: BoolArray) -> tuple[Finding, ...]:
    """A finding where some vessels lie in stated surroundings and others in none."""
    if not settings or not open_air.any():
        return ()
    message = (
        f"{np.count_nonzero(open_air)} of {len(network.segments)} segments lie in no stated surroundings; "
        "the atmosphere (0 Pa) presses on them."
    )
    return (Finding("vessels in the atmosphere", Severity.NOTE, message),)
