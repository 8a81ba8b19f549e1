"""Walls: tube law and reference state of every station."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from geomprep.assign.origins import origins_by_rows
from geomprep.assign.wall_findings import wall_findings
from geomprep.assign.wall_stiffness import WaveSpeeds, wave_speeds
from geomprep.assign.wall_uses import WallSettings, WallUse, wall_uses
from geomprep.errors import InputError, ModelError, OpenQuestions, Question
from geomprep.findings import Finding
from geomprep.laws.reference_state import buckling_reference, power_parts, slowest_wave_speed
from geomprep.laws.stiffness import stiffness_from_wave_speed
from geomprep.laws.tube import FORMS
from geomprep.model import Basis, BoolArray, FloatArray, IntArray, Network, Origin, TubeLaw, Walls
from geomprep.units import format_quantity

__all__ = ["WallSettings", "assign_walls"]

_FORM = "power pair"


@dataclass(frozen=True, eq=False)
class _Part:
    """What one setting gave its stations."""

    use: WallUse
    stations: BoolArray
    speeds: WaveSpeeds
    reference_area: FloatArray
    stiffness: FloatArray
    reference_transmural: FloatArray


def assign_walls(
    network: Network,
    settings: Mapping[str, WallSettings],
    transmural_at_imaging: FloatArray,
    surroundings: IntArray | None = None,
) -> tuple[Walls, tuple[Origin, ...], tuple[Finding, ...]]:
    """Give every station a tube law that passes through its imaged state.

    At the imaged state the law has the imaged area and the given wave speed. What is called A0 is
    a choice of the setting:

    *imaged* (arteries where not stated)
        A0 = imaged area, p0 = transmural pressure at imaging, K = ρc²/(m − n).
    *buckling* (veins where not stated)
        p0 = 0; K and A0 together (:func:`geomprep.laws.reference_state.buckling_reference`).
        The law then collapses where the transmural pressure changes its sign. It exists only
        for c² > m p_tm/ρ where the vessel is distended at imaging, and for c² > n p_tm/ρ where
        it is collapsed (p_tm < 0, n < 0); a slower wave is refused. At p_tm = 0 both
        reference states agree.

    Parameters
    ----------
    network : Network
        With `blood` filled.
    settings : mapping
        :class:`WallSettings` by ``artery``, ``vein`` or name of a vessel.
    transmural_at_imaging : (k,) float array
        Transmural pressure of each station while it was imaged, Pa.
    surroundings : (k,) int array, optional
        Number of the surroundings of each station; 0 where not given.

    Returns
    -------
    walls : Walls
    origins : tuple of Origin
    findings : tuple of Finding
        Aggregated per setting or literature row, never one per station.

    Raises
    ------
    InputError
        A setting cannot be used (see :func:`geomprep.assign.wall_stiffness.wave_speeds`).
    OpenQuestions
        Veins without a stated stiffness.
    ModelError
        A wave speed is too slow for the buckling reference state.

    Examples
    --------
    See ``tests/assign/test_walls.py`` for whole networks.

    >>> WallSettings(wave_speed=4.0).gives_stiffness
    True
    >>> WallSettings().gives_stiffness
    False
    """
    pressure = _checked_pressure(network, transmural_at_imaging)
    if network.blood is None:
        raise InputError("the network has no blood yet; walls need its density: assign blood first")
    uses = wall_uses(network.segments, settings)
    parts = _parts(network, uses, pressure, network.blood.density)
    walls = _walls(network, parts, pressure, surroundings)
    return walls, _origins(walls, parts), wall_findings(network, walls, [(part.use, part.speeds) for part in parts])


def _checked_pressure(network: Network, transmural: FloatArray) -> FloatArray:
    """Transmural pressures of the right number, all finite."""
    pressure = np.asarray(transmural, dtype=np.float64)
    if pressure.shape != (len(network.stations),):
        raise InputError(
            f"transmural pressure at imaging: shape {pressure.shape} given, ({len(network.stations)},) needed"
        )
    if not np.isfinite(pressure).all():
        where = int(np.argmin(np.isfinite(pressure)))
        raise InputError(f"transmural pressure at imaging of station {where} is {pressure[where]}; it must be finite")
    return pressure


def _parts(network: Network, uses: Iterable[WallUse], pressure: FloatArray, density: float) -> list[_Part]:
    """Solve every setting, or list all questions that they leave open."""
    found: list[_Part] = []
    questions: list[Question] = []
    for use in uses:
        try:
            found.append(_part(network, use, pressure, density))
        except OpenQuestions as left:
            questions += left.questions
    if questions:
        raise OpenQuestions(questions)
    return found


def _part(network: Network, use: WallUse, pressure: FloatArray, density: float) -> _Part:
    """Reference state of the stations of one setting."""
    stations = np.repeat(use.segments, np.diff(network.stations.offsets))
    radius, transmural = network.stations.radius[stations], pressure[stations]
    area, exponents = np.pi * radius**2, dict(use.exponents.coefficients)
    speeds = wave_speeds(use, radius, transmural, density)
    if use.settings.reference_state == "imaged":
        return _Part(
            use, stations, speeds, area, stiffness_from_wave_speed(speeds.speed, density, **exponents), transmural
        )
    _refuse_slow(network, use, stations, speeds.speed, transmural)
    reference, stiffness = buckling_reference(area, transmural, speeds.speed, density, **exponents)
    return _Part(use, stations, speeds, reference, stiffness, np.zeros(len(area)))


def _refuse_slow(
    network: Network, use: WallUse, stations: BoolArray, speed: FloatArray, transmural: FloatArray
) -> None:
    """Raise naming the vessel whose wave speed lies furthest below the bound of its pressure."""
    density, exponents = network.blood.density if network.blood else np.nan, dict(use.exponents.coefficients)
    rising, falling = power_parts(transmural, speed, density, **exponents)
    bad = ~((rising > 0) & (falling > 0))
    if not bad.any():
        return
    bound = slowest_wave_speed(transmural, density, **exponents)
    worst = int(np.argmax(np.where(bad, bound - speed, -np.inf)))
    segment = network.stations.segment[stations][worst]
    vessel = network.segments.name[segment] or network.segments.id[segment]
    raise ModelError(
        f"[{use.key}] {vessel}: wave speed {speed[worst]:.4g} m/s at a transmural pressure of "
        f"{format_quantity(transmural[worst], 'mmHg')} while imaged; the buckling reference state needs more than "
        f"{bound[worst]:.4g} m/s there ({int(bad.sum())} of {len(bad)} stations are too slow): give a faster "
        'wave_speed, check the pressure at imaging, or set reference_state = "imaged"'
    )


def _walls(network: Network, parts: list[_Part], pressure: FloatArray, surroundings: IntArray | None) -> Walls:
    """Put the parts together, one law per class in use."""
    count, stations = len(network.segments), len(network.stations)
    classes = list(dict.fromkeys(part.use.vessel_class for part in parts))
    law, state = np.zeros(count, np.int64), np.full(count, "", dtype=object)
    reference, stiffness, zero = np.empty(stations), np.empty(stations), np.empty(stations)
    for part in parts:
        law[part.use.segments] = classes.index(part.use.vessel_class)
        state[part.use.segments] = part.use.settings.reference_state
        reference[part.stations], stiffness[part.stations] = part.reference_area, part.stiffness
        zero[part.stations] = part.reference_transmural
    outside = np.zeros(stations, np.int64) if surroundings is None else surroundings
    laws = tuple(_law(next(part.use for part in parts if part.use.vessel_class == name)) for name in classes)
    return Walls(laws, law, state, reference, stiffness, zero, pressure, outside)


def _law(use: WallUse) -> TubeLaw:
    """Tube law of a vessel class."""
    exponents = dict(use.exponents.coefficients)
    name = f"{use.vessel_class}-{_FORM.replace(' ', '-')}"
    return TubeLaw(name, _FORM, FORMS[_FORM].equation, exponents["m"], exponents["n"])


_AREA_FROM = {
    "imaged": "stations.area",
    "buckling": "stations.area, stations.imaging_transmural, stations.stiffness",
}
_ZERO_FROM = {"imaged": "stations.imaging_transmural", "buckling": "segments.reference_state"}


def _origins(walls: Walls, parts: list[_Part]) -> tuple[Origin, ...]:
    """Origins of everything that was filled."""
    states = [str(part.use.settings.reference_state) for part in parts]
    laws = [part.use.exponents.key for part in {part.use.vessel_class: part for part in reversed(parts)}.values()][::-1]
    here = [np.arange(len(laws)) == number for number in range(len(laws))]
    exponents = [(Basis.PUBLISHED, key, mask) for key, mask in zip(laws, here, strict=True)]
    return (
        *origins_by_rows("tube_laws.m", exponents),
        *origins_by_rows("tube_laws.n", exponents),
        *origins_by_rows(
            "stations.stiffness", [(part.speeds.basis, part.speeds.detail, part.stations) for part in parts]
        ),
        *origins_by_rows(
            "stations.reference_area",
            [(Basis.DERIVED, _AREA_FROM[state], part.stations) for state, part in zip(states, parts, strict=True)],
        ),
        *origins_by_rows(
            "stations.reference_transmural",
            [(Basis.DERIVED, _ZERO_FROM[state], part.stations) for state, part in zip(states, parts, strict=True)],
        ),
    )
