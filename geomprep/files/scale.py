"""Which length unit and which meaning of the sizes fit the numbers, with the evidence.

Nothing is scaled here. Every hypothesis turns the sizes into radii in metres and is
held against radii published for the vessel class, and the extent of the lines against
the human body. The score ranks hypotheses; it is no probability of being right, and a
factor of two (radius or diameter) hardly shows in sizes alone.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from geomprep.files.size_arrays import SizeArray
from geomprep.literature import plausible_radius, size_rows
from geomprep.units import length_factor

if TYPE_CHECKING:
    from geomprep.files.contents import FileContents

__all__ = ["UNITS", "Hypothesis", "hypotheses", "length_text"]

UNITS: Final = ("mm", "cm", "m", "um", "in")
"""Length units that are tried."""

_MEANINGS: Final = ("radius", "diameter", "area")
_NAME_WEIGHT: Final = 0.9
"""Weight of what the name of an array says about its meaning."""
_UNNAMED: Final = {"radius": 0.5, "diameter": 0.35, "area": 0.15}
_EXTENT: Final = (0.05, 2.0)
"""Diagonal of the lines in metres, nearly always: one organ to a whole body."""
_LARGEST_VOLUME: Final = 6e-3
"""m³; more than the blood of an adult."""
_VOXELS_ACROSS: Final = (2.0, 40.0)
"""Lumen diameter in voxels of lines traced in an image."""
_VOXELS_A_STEP: Final = (0.2, 2.0)
"""Distance of neighbouring points in voxels, mostly; lines may have been resampled."""
_STEP_WEIGHT: Final = -2.0
"""The most that spacing may speak against a reading (a factor of 7)."""
_LEAST_SPREAD: Final = 0.5
"""Least spread of ln(radius) that is allowed for: a factor of 1.6 up or down."""
_CAPILLARY: Final = 2e-6
"""m; a red cell hardly passes."""
_WIDEST: Final = 0.03
"""m; wider than any vessel but a large aneurysm."""
_LONGEST: Final = 2.5
"""m; longer than a body."""


@dataclass(frozen=True)
class Hypothesis:
    """One reading of the numbers.

    Attributes
    ----------
    unit : str
        Length unit of positions and sizes.
    meaning : str
        ``radius``, ``diameter`` or ``area``.
    score : float
        Between 0 and 1; over all hypotheses of one array they sum to 1.
    evidence : tuple of str
        The numbers under this reading and what they were held against.
    impossible : tuple of str
        Numbers that no human vessel has.
    median_radius, largest_radius, diagonal, length, volume : float
        Under this reading, SI.
    """

    unit: str
    meaning: str
    score: float
    evidence: tuple[str, ...]
    impossible: tuple[str, ...]
    median_radius: float
    largest_radius: float
    diagonal: float
    length: float
    volume: float


@dataclass(frozen=True)
class _Drawn:
    """The lines of a file and the sums over its sizes, all in its own unit.

    `squares` is the integral of size squared along the lines, `sums` that of the size.
    """

    diagonal: float
    length: float
    step: float
    squares: float
    sums: float


@dataclass(frozen=True)
class _Reading:
    """The numbers under one hypothesis, SI."""

    median: float
    largest: float
    diagonal: float
    length: float
    step: float
    volume: float


@dataclass(frozen=True)
class _Judged:
    """What one piece of evidence says: weight (logarithm), sentence, whether impossible."""

    weight: float
    text: str
    impossible: bool = False


def hypotheses(
    contents: FileContents,
    size: SizeArray,
    vessels: str | None = None,
    voxel: tuple[float, float, float] | None = None,
) -> tuple[Hypothesis, ...]:
    """Rank the readings of a size array, best first.

    Parameters
    ----------
    contents : FileContents
    size : SizeArray
        The array under trial.
    vessels : str, optional
        ``arteries`` or ``veins`` where stated.
    voxel : tuple of float, optional
        Voxel edges in metres where stated.

    Returns
    -------
    tuple of Hypothesis
        Empty where the array holds no value above zero.
    """
    if not size.positive:
        return ()
    drawn = _drawn(contents, size)
    vessel_class = {"arteries": "artery", "veins": "vein"}.get(vessels or "", "any")
    found = []
    for unit in UNITS:
        for meaning in _MEANINGS:
            reading = _reading(drawn, size, length_factor(unit), meaning)
            judged = [
                _median(reading, vessel_class),
                _largest(reading, vessel_class),
                _extent(reading),
                _volume(reading),
            ]
            judged += _voxels(reading, voxel) if voxel else []
            weight = sum(each.weight for each in judged) + math.log(_name_weight(size, meaning))
            found.append((weight, unit, meaning, reading, judged))
    best = max(row[0] for row in found)
    total = sum(math.exp(row[0] - best) for row in found)
    ranked = sorted(found, key=lambda row: -row[0])
    return tuple(
        Hypothesis(
            unit,
            meaning,
            math.exp(weight - best) / total,
            tuple(each.text for each in judged),
            tuple(each.text for each in judged if each.impossible),
            reading.median,
            reading.largest,
            reading.diagonal,
            reading.length,
            reading.volume,
        )
        for weight, unit, meaning, reading, judged in ranked
    )


def _drawn(contents: FileContents, size: SizeArray) -> _Drawn:
    """Lengths of the lines and sums over their sizes."""
    points = np.asarray(contents.points, dtype=np.float64)
    connectivity, offsets = np.asarray(contents.connectivity), np.asarray(contents.offsets)
    if len(connectivity) < 2:
        return _Drawn(0.0, 0.0, 0.0, 0.0, 0.0)
    inside = np.ones(len(connectivity) - 1, dtype=bool)
    inner = offsets[1:-1]
    inside[inner[(inner > 0) & (inner < len(connectivity))] - 1] = False
    first, second = connectivity[:-1][inside], connectivity[1:][inside]
    along_step = points[second] - points[first]
    steps = np.sqrt(np.einsum("ij,ij->i", along_step, along_step))
    values = np.asarray(size.values, dtype=np.float64)
    if size.place == "points":
        along = 0.5 * (values[first] + values[second])
        square = 0.5 * (values[first] ** 2 + values[second] ** 2)
    else:
        along = np.repeat(values, np.maximum(np.diff(offsets) - 1, 0))
        square = along**2
    used = points[connectivity].T
    moved = steps[steps > 0]
    return _Drawn(
        diagonal=float(np.linalg.norm([float(np.ptp(column)) for column in used])),
        length=float(steps.sum()),
        step=float(np.median(moved)) if moved.size else 0.0,
        squares=float(np.nansum(square * steps)),
        sums=float(np.nansum(along * steps)),
    )


def _radius(size: float, meaning: str) -> float:
    """Radius in the unit of the file."""
    if meaning == "area":
        return math.sqrt(max(size, 0.0) / math.pi)
    return size * (0.5 if meaning == "diameter" else 1.0)


def _reading(drawn: _Drawn, size: SizeArray, factor: float, meaning: str) -> _Reading:
    """The numbers of a file under one hypothesis."""
    volume = drawn.sums if meaning == "area" else math.pi * drawn.squares * _radius(1.0, meaning) ** 2
    return _Reading(
        median=_radius(size.median_positive, meaning) * factor,
        largest=_radius(size.maximum, meaning) * factor,
        diagonal=drawn.diagonal * factor,
        length=drawn.length * factor,
        step=drawn.step * factor,
        volume=volume * factor**3,
    )


def _name_weight(size: SizeArray, meaning: str) -> float:
    """How far the name of the array speaks for a meaning."""
    if len(size.named) != 1:
        return _UNNAMED[meaning]
    return _NAME_WEIGHT if meaning in size.named else 0.5 * (1.0 - _NAME_WEIGHT)


def _outside(value: float, low: float, high: float) -> float:
    """How many times a value lies outside an interval, as a logarithm; 0 inside."""
    if value <= 0.0:
        return math.inf
    return max(math.log(low / value), math.log(value / high), 0.0)


def _bell(distance: float, spread: float) -> float:
    """Logarithm of a bell curve, cut off so that every weight is finite."""
    return -0.5 * min(abs(distance) / spread, 40.0) ** 2


def _inside(value: float, low: float, high: float) -> float:
    """Bell curve over ln(value) that has 95 % of itself (two spreads either way) in an interval."""
    distance = math.log(value / math.sqrt(low * high)) if value > 0.0 else math.inf
    return _bell(distance, 0.25 * math.log(high / low))


def _median(reading: _Reading, vessel_class: str) -> _Judged:
    """The median radius against the middle of the published vessels."""
    middles = np.log([math.sqrt(row.low * row.high) for row in size_rows(vessel_class) if row.low and row.high])
    spread = max(float(middles.std()), _LEAST_SPREAD)
    weight = _bell(math.log(reading.median) - float(middles.mean()), spread)
    low, high = plausible_radius(vessel_class)
    text = f"median radius {length_text(reading.median)} (plausible {length_text(low)} to {length_text(high)})"
    return _Judged(weight, text, reading.median < _CAPILLARY)


def _largest(reading: _Reading, vessel_class: str) -> _Judged:
    """The largest radius against the plausible ones."""
    weight = _bell(_outside(reading.largest, *plausible_radius(vessel_class)), _LEAST_SPREAD)
    return _Judged(weight, f"largest radius {length_text(reading.largest)}", reading.largest > _WIDEST)


def _extent(reading: _Reading) -> _Judged:
    """The diagonal of the lines against the human body."""
    weight = _inside(reading.diagonal, *_EXTENT)
    text = f"box diagonal {length_text(reading.diagonal)}, total length {length_text(reading.length)}"
    return _Judged(weight, text, reading.diagonal > _LONGEST)


def _volume(reading: _Reading) -> _Judged:
    """The lumen volume against the blood of an adult."""
    over = max(math.log(reading.volume / _LARGEST_VOLUME), 0.0) if reading.volume > 0 else 0.0
    return _Judged(_bell(over, 1.0), f"lumen volume {reading.volume * 1e6:.3g} mL", over > 0.0)


def _voxels(reading: _Reading, voxel: tuple[float, float, float]) -> list[_Judged]:
    """Lumen width and spacing of points in voxels."""
    edge = float(np.prod(voxel)) ** (1.0 / 3.0)
    across, step = 2.0 * reading.median / edge, reading.step / edge
    judged = [_Judged(_bell(_outside(across, *_VOXELS_ACROSS), 0.5), f"{across:.3g} voxels across the median lumen")]
    if step > 0:
        weight = max(_inside(step, *_VOXELS_A_STEP), _STEP_WEIGHT)
        judged.append(_Judged(weight, f"points {step:.3g} voxels apart"))
    return judged


def length_text(metres: float) -> str:
    """Write a length in the unit that suits its size.

    Examples
    --------
    >>> length_text(0.00213), length_text(0.31), length_text(2e-5), length_text(1500.0)
    ('2.13 mm', '310 mm', '20 um', '1500 m')
    """
    for unit, factor, above in (("m", 1.0, 1.0), ("mm", 1e-3, 1e-4), ("um", 1e-6, 0.0)):
        if metres >= above:
            return f"{metres / factor:.4g} {unit}" if unit == "m" else f"{metres / factor:.3g} {unit}"
    return f"{metres:.3g} m"
