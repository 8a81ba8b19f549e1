"""Areas and friction shapes of stations from the lumen surface and the mask of each input."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from geomprep.case.image_findings import area_findings, coarse_findings, shape_finding
from geomprep.case.sections import Case
from geomprep.curves import arc_length, line_sums, piece_integrals, pieces
from geomprep.errors import CaseError
from geomprep.files import MaskContents, read_mask, read_surface
from geomprep.files.frames import direction
from geomprep.findings import Finding
from geomprep.laws.shapes import friction_shape_from_moment
from geomprep.measure import Convention, VoxelGrid, cross_sections, junction_zones, mask_areas
from geomprep.measure.cross_sections import CutMark
from geomprep.model import Basis, BoolArray, FloatArray, IntArray, Network, Stations, TextArray
from geomprep.units import length_factor

__all__ = ["with_image_areas"]

_UNLIKE: Final = {"lumen_surface": 4.0, "mask": 2.0}
"""Ratio of radii from which what lies round a line is not taken for its lumen; voxels may be a neighbour's."""
_FARTHEST: Final = 3.0
"""Voxels farther from their line than this many of the largest radii belong to no line."""
_MOST_OF_A_STEP: Final = 0.45
"""Part of its first step by which the end of a line may be drawn away from lines that meet it."""
_LEAST_KNOWN: Final = 0.5
"""Part of ∫ds/r⁴ with measured outlines from which their mean stands for a segment."""

_MARK_WORDS: Final = {
    CutMark.OUTSIDE: "outside the surface",
    CutMark.OPEN: "at an opening or hole",
    CutMark.TOUCHING: "touching another lumen",
    CutMark.ABRUPT: "wider than the stations around allow",
    CutMark.INDENTED: "indented",
    CutMark.OBLIQUE: "oblique",
    CutMark.OFF_CENTRE: "off centre",
}
"""Why a section is doubtful; the first that holds is counted."""


@dataclass(frozen=True, eq=False)
class _Lines:
    """Stations of one input: their rows among all, and its lines alone.

    `mouth` says at the two ends of each line how far from there its lumen is not all its own, m.
    """

    rows: IntArray
    offsets: IntArray
    position: FloatArray
    radius: FloatArray
    mouth: FloatArray


@dataclass(frozen=True, eq=False)
class _Measured:
    """What one file says of the stations of its input.

    `why` says in a few words why a station keeps its radius, and is empty where it does not; radius and
    shape are not a number where nothing was measured.
    """

    radius: FloatArray
    shape: FloatArray
    why: TextArray
    sha256: str
    findings: tuple[Finding, ...]


def with_image_areas(case: Case, network: Network) -> tuple[Network, tuple[Finding, ...]]:
    """Let stations take their area from the lumen surface, or else from the mask, of their input.

    A station whose section is marked as doubtful keeps its radius; so do all where an input states
    neither file. Radii become those of the circle of equal area, with the basis ``measured``. A segment takes
    the mean friction shape of its outlines, weighted by ∫ds/r⁴, where they stand for half of
    that integral or more, and 1 elsewhere. A mask gives areas and no outlines.

    Parameters
    ----------
    case : Case
    network : Network
        Nodes, segments and stations; no later table.

    Returns
    -------
    network : Network
    findings : tuple of Finding
        How many stations were measured, why others were not, the largest differences, the friction shapes.

    Raises
    ------
    FileError
        A file cannot be read, or holds no surface or mask.
    CaseError
        No station lies in it, or its place cannot be told.

    Examples
    --------
    See ``tests/case/test_image_areas.py`` for whole cases.
    """
    stations = network.stations
    radius, shape = stations.radius.copy(), np.full(len(stations), np.nan)
    measured, findings = np.zeros(len(stations), np.bool_), list[Finding]()
    mouth = (
        _mouths(network) if any(statement.mask for statement in case.inputs) else np.zeros((len(network.segments), 2))
    )
    for number, statement in enumerate(case.inputs):
        lines = _lines_of(network, number, mouth)
        for key, measure in _MEASURES.items():
            if getattr(statement, key) is None or len(lines.rows) == 0:
                continue
            found = measure(case, number, lines)
            done = measured[lines.rows]
            new = (found.why == "") & ~done
            rows = lines.rows[new]
            radius[rows], shape[rows], measured[rows] = found.radius[new], found.shape[new], True
            said = f"{getattr(statement, key)} (SHA-256 {found.sha256})"
            findings += [*found.findings, *area_findings(network, (key, said), (rows, radius), found.why[~done])]
    if not findings:
        return network, ()
    basis = np.where(measured, Basis.MEASURED, stations.basis).astype(np.uint8)
    stations = Stations(stations.offsets, stations.distance, stations.position, radius, basis)
    friction, known = _friction_shapes(stations, shape)
    if not np.isnan(shape).all():
        findings.append(shape_finding(friction, known))
    segments = replace(network.segments, friction_shape=friction)
    return replace(network, segments=segments, stations=stations), tuple(findings)


def _lines_of(network: Network, number: int, mouth: FloatArray) -> _Lines:
    """Stations of the segments of one input."""
    own = network.segments.input_id == number
    counts = np.diff(network.stations.offsets)
    rows = np.flatnonzero(np.repeat(own, counts))
    offsets = np.concatenate(([0], np.cumsum(counts[own])))
    return _Lines(rows, offsets, network.stations.position[rows], network.stations.radius[rows], mouth[own])


def _mouths(network: Network) -> FloatArray:
    """How far from its ends each segment shares its lumen with a parent, as drawn, m.

    Its axis leaves the parent's lumen first; at 45° its inner side follows one radius of its own later.
    """
    zones = junction_zones(network)
    reach = zones.distance[:, Convention.LUMEN_EXIT]
    mouth = np.zeros((len(network.segments), 2))
    mouth[zones.segment, zones.end] = reach + np.where(reach > 0, np.sqrt(zones.area / np.pi), 0.0)
    return mouth


def _of_surface(case: Case, number: int, lines: _Lines) -> _Measured:
    """Areas and friction shapes of cross-sections."""
    statement = case.inputs[number]
    surface = read_surface(case.folder / str(statement.lumen_surface))
    factor = length_factor(statement.length_unit or "", f"input[{number}].length_unit")
    found = cross_sections(surface.points * factor, surface.triangles, lines.position, lines.offsets)
    radius = np.sqrt(found.area / np.pi)
    unlike, words = _unlike("lumen_surface", radius, lines.radius)
    if unlike.all():
        raise _nowhere(case, number, "lumen_surface", "it must be in the unit and frame of the lines")
    reasons = {words: unlike & ~np.isnan(radius)}
    reasons = {**{word: found.marked(mark) for mark, word in _MARK_WORDS.items()}, **reasons}
    why = _first_that_holds(reasons)
    shape = np.full(len(why), np.nan)
    clear = why == ""
    shape[clear] = friction_shape_from_moment(found.area[clear], found.polar_moment[clear])
    return _Measured(radius, shape, why, surface.sha256, surface.findings)


def _of_mask(case: Case, number: int, lines: _Lines) -> _Measured:
    """Areas of voxels; a mask says nothing of outlines here."""
    mask = read_mask(case.folder / str(case.inputs[number].mask))
    grid = _grid(case, number, mask)
    (place, near, shared), radius = _drawn_apart(lines, grid), lines.radius
    found = mask_areas(mask.inside, grid, place, lines.offsets, radius, _FARTHEST * float(radius.max()))
    depth = _depth(grid, mask, lines.position)
    if found.empty.all() or (depth < 0).all():
        raise _nowhere(case, number, "mask", "check its unit, frame and origin")
    measured = np.sqrt(found.area / np.pi)
    unlike, words = _unlike("mask", measured, radius)
    reasons = {
        "where the vessel leaves its parent": shared,
        "within half a voxel of other lines": near,
        "without voxels": found.empty,
        "next to a station without voxels": _beside(found.empty & ~near & ~shared, lines.offsets),
        "within a radius of the border of the mask": depth < radius,
        words: unlike,
    }
    why = _first_that_holds(reasons)
    coarse = coarse_findings(2 * measured[why == ""] / float(np.prod(grid.spacing)) ** (1 / 3))
    return _Measured(measured, np.full(len(why), np.nan), why, mask.sha256, (*mask.findings, *coarse))


_MEASURES: Final[dict[str, Callable[[Case, int, _Lines], _Measured]]] = {
    "lumen_surface": _of_surface,
    "mask": _of_mask,
}
"""Key of an input -> what measures its stations; later ones where earlier ones could not."""


def _unlike(key: str, measured: FloatArray, stated: FloatArray) -> tuple[BoolArray, str]:
    """Stations whose radius is far from the stated one, or not measured, and words for them."""
    most = _UNLIKE[key]
    words = f"unlike the stated radius by a factor of {most:g} or more"
    return ~((measured < most * stated) & (measured > stated / most)), words


def _first_that_holds(reasons: dict[str, BoolArray]) -> TextArray:
    """The first reason that holds for each station, empty where none does."""
    return np.select(list(reasons.values()), list(reasons), "").astype(object)


def _nowhere(case: Case, number: int, key: str, remedy: str) -> CaseError:
    """The error for a file in which no station lies."""
    name = getattr(case.inputs[number], key)
    return CaseError(
        f"input[{number}].{key} = '{name}': no station of '{case.inputs[number].file}' lies in it; {remedy}"
    )


def _grid(case: Case, number: int, mask: MaskContents) -> VoxelGrid:
    """Place of the voxels in metres, in the frame of the lines."""
    statement, key = case.inputs[number], f"input[{number}]"
    factor = length_factor(mask.length_unit or statement.length_unit or "", f"{key}.length_unit")
    turn = np.eye(3)
    if mask.frame:
        if statement.frame is None:
            raise CaseError(
                f"{key}.mask = '{statement.mask}': its voxels lie in the frame {mask.frame}, but the frame of the lines "
                f'is not stated; state {key}.frame, e.g. frame = "LPS"'
            )
        turn = np.stack([direction(mask.frame, letter) for letter in statement.frame.upper()])
    return VoxelGrid(turn @ mask.origin * factor, mask.spacing * factor, turn @ mask.directions)


def _drawn_apart(lines: _Lines, grid: VoxelGrid) -> tuple[FloatArray, BoolArray, BoolArray]:
    """Stations with ends that meet others moved inwards by half a voxel; those nearer to such an end; those in a mouth.

    A voxel astride the place where lines meet goes to one of them, whose share of it ends there; so much
    of the other line would seem empty.
    """
    place, row = lines.position.copy(), np.arange(len(lines.rows))
    near, shared = np.zeros((2, len(lines.rows)), np.bool_)
    first, last = lines.offsets[:-1], lines.offsets[1:] - 1
    line = np.repeat(np.arange(len(first)), np.diff(lines.offsets))
    along = arc_length(lines.position, lines.offsets)
    _, same, count = np.unique(lines.position[np.r_[first, last]], axis=0, return_inverse=True, return_counts=True)
    meets = (count[same.ravel()] > 1).reshape(2, -1)
    for side, end, towards, others in ((0, first, -1, meets[0]), (1, last, 1, meets[1])):
        step = lines.position[end - towards] - lines.position[end]
        length = np.linalg.norm(step, axis=1)
        half = others * np.linalg.norm((step / length[:, None]) @ grid.directions * grid.spacing, axis=1) / 2
        place[end] += np.minimum(half / length, _MOST_OF_A_STEP)[:, None] * step
        away = np.abs(along - along[end][line])
        border = 0.5 * (away + away[np.clip(row + towards, first[line], last[line])])
        shared |= border < lines.mouth[:, side][line]
        border[end] = _MOST_OF_A_STEP * length
        near |= border < half[line]
    return place, near, shared


def _beside(marked: BoolArray, offsets: IntArray) -> BoolArray:
    """Stations with a marked neighbour on their line."""
    before, after = np.roll(marked, 1), np.roll(marked, -1)
    before[offsets[:-1]] = after[offsets[1:] - 1] = False
    return np.asarray(before | after)


def _depth(grid: VoxelGrid, mask: MaskContents, place: FloatArray) -> FloatArray:
    """Distance of places to the nearest face of the box of voxels, below 0 outside, m."""
    index = ((place - grid.origin) @ grid.directions) / grid.spacing
    inwards = np.minimum(index + 0.5, np.array(mask.inside.shape) - 0.5 - index)
    return np.asarray((inwards * grid.spacing).min(axis=1))


def _friction_shapes(stations: Stations, shape: FloatArray) -> tuple[FloatArray, BoolArray]:
    """Friction shape of every segment, and where it was measured."""
    piece = pieces(stations.offsets)
    step = stations.distance[piece.first + 1] - stations.distance[piece.first]
    ends = stations.radius[piece.first], stations.radius[piece.first + 1]
    half = piece_integrals(step, *ends)[:, 3] / 2
    weight = np.bincount(piece.first, half, len(shape)) + np.bincount(piece.first + 1, half, len(shape))
    there = ~np.isnan(shape)
    columns = np.stack((weight, weight * there, weight * np.where(there, shape, 0.0)), axis=1)
    total, seen, weighted = line_sums(columns, stations.offsets[:-1]).T
    known = seen >= _LEAST_KNOWN * total
    return np.where(known, weighted / np.where(known, seen, 1.0), 1.0), known
