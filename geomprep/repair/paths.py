"""Jagged paths: one bounded smoothing that does not shrink, by the positional noise that the case declares."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.linalg import solveh_banded

from geomprep.curves import arc_length
from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.model import FloatArray, IntArray, PointGraph, Repair, anchor_ids, raw_order
from geomprep.repair.branches import Branches
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.verdicts import Verdict

__all__ = ["PathSettings", "smooth_paths"]

_OPTIONS = _LEAVE, _SMOOTH = "leave", "smooth"
_PENALTIES = 10.0 ** np.arange(-1.0, 7.6, 0.5)
_FIXED = 1e9
_LARGEST = 4.0
"""Largest displacement, in parts of the noise."""
_IN_LUMEN = 0.5
"""Largest displacement, in parts of the local radius."""
_SHORTEST = 5
_JAGGED = np.radians(25.0)


@dataclass(frozen=True)
class PathSettings:
    """How much noise the positions carry.

    Attributes
    ----------
    positional_noise : float, optional
        Standard deviation of a position along each axis in metres; nothing is smoothed where none is declared.

    Raises
    ------
    InputError
        The noise is negative.
    """

    positional_noise: float | None = None

    def __post_init__(self) -> None:
        """Refuse a negative noise."""
        if self.positional_noise is not None and not self.positional_noise >= 0.0:
            raise InputError(f"repair.paths.positional_noise = {self.positional_noise:g} m: must not be negative")


def smooth_paths(graph: PointGraph, settings: PathSettings, given: Given) -> StepResult:
    """Smooth the path of every chain between its ends, which stay where they are.

    A penalised spline on the points of each chain: the sum of squared displacements plus a penalty
    times the sum of squared third differences is least, so that straight lines and arcs keep their shape. The
    penalty of each chain is the one of least expected error for the declared noise, among those that move
    its points by no more than the noise along each axis in the root mean square. No point moves farther than four
    times the noise or half the radius.

    Parameters
    ----------
    graph : PointGraph
    settings : PathSettings
    given : Given

    Returns
    -------
    StepResult
        One repair for all paths, with their length before and after. Where no noise is declared and the paths
        are jagged, a finding says so.

    Notes
    -----
    Penalised differences: Whittaker 1923, doi:10.1017/S0013091500077853; Eilers & Marx 1996,
    doi:10.1214/ss/1038425655. Choice of the penalty at known noise by the unbiased risk estimate of Mallows 1973,
    doi:10.1080/00401706.1973.10489103. Repeated averaging would shrink curved vessels.

    Examples
    --------
    A straight vessel drawn in steps of half a millimetre from side to side:

    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> n = np.arange(81)
    >>> line = np.stack((0.25 * (n % 2), 0 * n, 0.5 * n), axis=1) * 1e-3
    >>> smooth = smooth_paths(join(Centrelines.of_lines([line], 2e-3)).graph, PathSettings(0.15e-3), Given()).graph
    >>> print(f"{np.linalg.norm(np.diff(smooth.points, axis=0), axis=1).sum():.4f}")
    0.0400
    """
    branches = given.branches(graph)
    noise = settings.positional_noise
    if not noise:
        return StepResult(graph, (), _jagged_finding(branches))
    key = str(anchor_ids("paths", graph.raw_points, _anchors(graph))[0])
    verdict = given.verdicts.settle(key, _OPTIONS, _SMOOTH)
    place = _smoothed(branches, noise)
    moved = np.linalg.norm(place - graph.points, axis=1)
    repair = _record(branches, place, moved, key, verdict)
    if verdict.choice == _LEAVE or not moved.any():
        return StepResult(graph, (repair,) if moved.any() else ())
    return StepResult(replace(graph, points=place), (repair,))


def _anchors(graph: PointGraph) -> IntArray:
    """First and last raw point of the graph, in the order of raw coordinates."""
    source = graph.source_point[graph.source_point >= 0]
    order = source[raw_order(graph.raw_points, source)]
    return order[[0, -1]][None]


def _smoothed(branches: Branches, noise: float) -> FloatArray:
    """Positions of all points after smoothing."""
    graph, cut = branches.graph, branches.cut
    counts = np.diff(cut.offsets)
    raw = graph.points[cut.point]
    place, best = raw.copy(), np.full(cut.n_chains, np.inf)
    best[counts < _SHORTEST] = -np.inf
    limit = np.minimum(_LARGEST * noise, _IN_LUMEN * graph.radius[cut.point])
    rank = _ranks(cut.offsets)
    for penalty in _PENALTIES:
        found = _solved(raw, cut.offsets, float(penalty))
        step = found - raw
        square = np.add.reduceat((step**2).sum(axis=1), cut.offsets[:-1]) / (3.0 * counts)
        free = np.add.reduceat(1.0 / (1.0 + penalty * rank), cut.offsets[:-1]) / counts
        risk = square + 2.0 * noise**2 * free
        better = (risk < best) & (square <= noise**2)
        best[better] = risk[better]
        row = better[branches.chain]
        far = np.maximum(np.linalg.norm(step, axis=1) / limit, 1.0)
        place[row] = raw[row] + (step / far[:, None])[row]
    result = graph.points.copy()
    inner = np.ones(len(place), np.bool_)
    inner[cut.offsets[:-1]] = inner[cut.offsets[1:] - 1] = False
    result[cut.point[inner]] = place[inner]
    return result


def _ranks(offsets: IntArray) -> FloatArray:
    """Eigenvalues of the penalty of each chain, as of a periodic one: (2 sin(πk / 2n))⁶ for k = 1 … n."""
    counts = np.repeat(np.diff(offsets), np.diff(offsets))
    number = np.arange(offsets[-1]) - np.repeat(offsets[:-1], np.diff(offsets)) + 1
    rank: FloatArray = (2.0 * np.sin(0.5 * np.pi * number / counts)) ** 6
    return rank


def _solved(raw: FloatArray, offsets: IntArray, penalty: float) -> FloatArray:
    """Positions at one penalty for all chains, by one solve of a band of seven."""
    count = len(raw)
    inside = np.ones(max(count - 3, 0), np.bool_)  # differences of four points of one chain
    for step in range(1, 4):
        ends = offsets[1:-1] - step
        inside[ends[(ends >= 0) & (ends < len(inside))]] = False
    weight = np.ones(count)
    weight[offsets[:-1]] = weight[offsets[1:] - 1] = _FIXED
    band = np.zeros((4, count))
    band[3] = weight
    stencil = (-1.0, 3.0, -3.0, 1.0)
    rows = np.flatnonzero(inside)
    for a, first in enumerate(stencil):
        for b, second in enumerate(stencil[: a + 1]):
            band[3 - (a - b), rows + a] += penalty * first * second
    solution: FloatArray = solveh_banded(band, weight[:, None] * raw, overwrite_ab=True, overwrite_b=True)
    return solution


def _record(branches: Branches, place: FloatArray, moved: FloatArray, key: str, verdict: Verdict) -> Repair:
    """The one repair of all paths."""
    graph, cut = branches.graph, branches.cut
    before = float(branches.length.sum())
    after = float(arc_length(place[cut.point], cut.offsets)[cut.offsets[1:] - 1].sum())
    rms = float(np.sqrt((moved[moved > 0] ** 2).mean() / 3.0)) if moved.any() else 0.0
    reason = (
        f"{np.count_nonzero(moved)} points moved by {1e3 * rms:.3g} mm along each axis in the root mean square and "
        f"{1e3 * moved.max():.3g} mm at most; length {1e3 * before:.5g} mm before, {1e3 * after:.5g} mm after"
    )
    spot, raw = graph.points[int(np.argmax(moved))], graph.source_point[moved > 0]
    return recorded("smoothed paths", key, _OPTIONS, verdict, Change(reason=reason, place=spot, raw=raw))


def _jagged_finding(branches: Branches) -> tuple[Finding, ...]:
    """Say that paths are jagged where half of their steps turn sharply within a radius."""
    graph, cut = branches.graph, branches.cut
    step = np.diff(graph.points[cut.point], axis=0)
    length = np.linalg.norm(step, axis=1)
    same = branches.chain[2:] == branches.chain[:-2]
    fine = length[:-1] + length[1:] < 2.0 * graph.radius[cut.point[1:-1]]
    dot = np.einsum("ij,ij->i", step[:-1], step[1:]) / np.maximum(length[:-1] * length[1:], np.finfo(float).tiny)
    turn = np.arccos(np.clip(dot[same & fine], -1.0, 1.0))
    if len(turn) < 10 or float(np.mean(turn > _JAGGED)) < 0.3:
        return ()
    return (
        Finding(
            "jagged paths",
            Severity.WARNING,
            f"{100.0 * np.mean(turn > _JAGGED):.0f} % of the steps within a radius turn by more than 25°: paths follow "
            "voxels or carry noise, and lengths are too long; declare repair.paths.positional_noise to smooth them",
            value=float(np.mean(turn > _JAGGED)),
        ),
    )
