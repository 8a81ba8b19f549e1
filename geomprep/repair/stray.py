"""Stray parts: pieces that hang together with nothing else and are too short to be a vessel."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.curves import piece_integrals
from geomprep.errors import InputError
from geomprep.model import VESSEL_CLASSES, FloatArray, IntArray, PointGraph, Repair, anchor_ids, raw_order
from geomprep.repair.edits import without_edges
from geomprep.repair.parts import components
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.verdicts import Verdict

__all__ = ["StraySettings", "drop_stray"]

_OPTIONS = _, _DROP = "leave", "drop"
_BEYOND = 1.25


@dataclass(frozen=True)
class StraySettings:
    """When a part is dropped.

    Attributes
    ----------
    use : bool
        False keeps all parts.
    shorter_than : float
        A part shorter than this, in metres …
    share_below : float
        … and than this share of the longest part of its vessel class is dropped.

    Raises
    ------
    InputError
        A limit lies outside its range.
    """

    use: bool = True
    shorter_than: float = 9e-3
    share_below: float = 0.1

    def __post_init__(self) -> None:
        """Refuse limits outside their range."""
        if not self.shorter_than >= 0.0:
            raise InputError(f"repair.stray.shorter_than = {self.shorter_than:g} m: must not be negative")
        if not 0.0 <= self.share_below < 1.0:
            raise InputError(f"repair.stray.share_below = {self.share_below:g}: must be at least 0 and below 1")


@dataclass(frozen=True, eq=False)
class _Parts:
    """Connected parts: length, volume, length of the longest of their class, edges' parts."""

    of_edge: IntArray
    length: FloatArray
    volume: FloatArray
    longest: FloatArray


def drop_stray(graph: PointGraph, settings: StraySettings, given: Given) -> StepResult:
    """Drop short parts, each on record with its length and volume.

    A part with a protected point is kept. Longer parts without a way to an open end that the case
    names are left out, on record, once inlets and outlets are known.

    Parameters
    ----------
    graph : PointGraph
    settings : StraySettings
    given : Given

    Returns
    -------
    StepResult

    Examples
    --------
    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> z = np.linspace(0, 120e-3, 61)[:, None] * [0, 0, 1.0]
    >>> graph = join(Centrelines.of_lines([z, z[:4] + [30e-3, 0, 0]], 2e-3)).graph
    >>> drop_stray(graph, StraySettings(), Given()).graph.n_edges
    60
    """
    if not settings.use:
        return StepResult(graph)
    count, label = components(graph.n_points, graph.edges)
    if count < 2:
        return StepResult(graph)
    parts = _parts(graph, label, count)
    proposed = (parts.length < settings.shorter_than) & (parts.length < settings.share_below * parts.longest)
    near = (parts.length < _BEYOND * settings.shorter_than) & (
        parts.length < _BEYOND * settings.share_below * parts.longest
    )
    near[label[graph.protected]] = False
    rows = np.flatnonzero(near)
    ids = anchor_ids("part", graph.raw_points, _anchors(graph, label, rows))
    repairs: list[Repair] = []
    fate = np.full(count, -1, np.int64)
    for part, key in zip(rows.tolist(), ids.tolist(), strict=True):
        if given.verdicts.wanted(key, bool(proposed[part])):
            verdict = given.verdicts.settle(key, _OPTIONS, _DROP)
            if verdict.choice == _DROP:
                fate[part] = len(repairs)
            repairs.append(_record(graph, (parts, label, part), key, verdict))
    return StepResult(without_edges(graph, fate[parts.of_edge]), tuple(repairs))


def _parts(graph: PointGraph, label: IntArray, count: int) -> _Parts:
    """Length and volume of each part, and the length of the longest part of its class."""
    of_edge = label[graph.edges[:, 0]]
    ends = graph.points[graph.edges]
    step = np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1)
    size = graph.radius[graph.edges]
    volume = piece_integrals(step, size[:, 0], size[:, 1])[:, 0]
    length = np.bincount(of_edge, step, minlength=count).astype(np.float64)
    code = np.zeros(count, np.int64)
    np.maximum.at(code, label, graph.vessel_class.astype(np.int64))
    longest = np.zeros(len(VESSEL_CLASSES))
    np.maximum.at(longest, code, length)
    total = np.bincount(of_edge, volume, minlength=count).astype(np.float64)
    return _Parts(of_edge, length, total, longest[code])


def _anchors(graph: PointGraph, label: IntArray, parts: IntArray) -> IntArray:
    """First and last raw point of each part in the order of raw coordinates; −1 where a part has none."""
    chosen = np.flatnonzero(np.isin(label, parts) & (graph.source_point >= 0))
    order = chosen[raw_order(graph.raw_points, graph.source_point[chosen])]
    order = order[np.argsort(label[order], kind="stable")]
    first = np.searchsorted(label[order], parts, side="left")
    last = np.searchsorted(label[order], parts, side="right") - 1
    return (
        graph.source_point[np.stack((order[first], order[last]), axis=1)] if len(order) else np.empty((0, 2), np.int64)
    )


def _record(graph: PointGraph, where: tuple[_Parts, IntArray, int], key: str, verdict: Verdict) -> Repair:
    """The repair of one part."""
    parts, label, part = where
    members = np.flatnonzero(label == part)
    reason = (
        f"a part of {1e3 * parts.length[part]:.3g} mm and {1e9 * parts.volume[part]:.3g} mm³ hangs together with "
        f"nothing else; the longest of its class has {1e3 * parts.longest[part]:.3g} mm"
    )
    place, raw = graph.points[members].mean(axis=0), graph.source_point[members]
    return recorded("stray part", key, _OPTIONS, verdict, Change(reason=reason, place=place, raw=raw))
