"""The floor of partial volume: many points that share one small radius, which is that of the voxels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.model import Basis, PointGraph
from geomprep.repair.steps import Given, StepResult

__all__ = ["FloorSettings", "report_floor"]

_VESSELS = 3
_NEAR_VOXEL = 1.3
_ALIKE = 1.005


@dataclass(frozen=True)
class FloorSettings:
    """When equal radii are reported.

    Attributes
    ----------
    share_above : float
        Share of all points within half a percent of one radius, on three vessels at least, from which it is a floor.

    Raises
    ------
    InputError
        The share lies outside its range.
    """

    share_above: float = 0.15

    def __post_init__(self) -> None:
        """Refuse a share outside its range."""
        if not 0.0 < self.share_above <= 1.0:
            raise InputError(f"repair.floor.share_above = {self.share_above:g}: must be above 0 and at most 1")


def report_floor(graph: PointGraph, settings: FloorSettings, given: Given) -> StepResult:
    """Report a radius that many points share, when it is the smallest or close to a voxel; nothing is changed.

    Parameters
    ----------
    graph : PointGraph
    settings : FloorSettings
    given : Given

    Returns
    -------
    StepResult
        The graph given, and one finding at most.

    Examples
    --------
    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> z = np.linspace(0, 20e-3, 21)[:, None] * [0, 0, 1.0]
    >>> vessels = [z + [8e-3 * k, 0, 0] for k in range(5)]
    >>> graph = join(Centrelines.of_lines(vessels, [0.4e-3, 0.4e-3, 0.4e-3, 0.4e-3, 1.5e-3])).graph
    >>> report_floor(graph, FloorSettings(), Given(voxel=0.4e-3)).findings[0].kind
    'radius floor'
    """
    stated = graph.radius[graph.radius_basis == Basis.MEASURED]
    if len(stated) == 0:
        return StepResult(graph)
    values = np.sort(stated)
    limit = _NEAR_VOXEL * given.voxel if given.voxel else float(values[0])
    starts = values[: max(int(np.searchsorted(values, limit, side="right")), 1)]
    counts = np.searchsorted(values, _ALIKE * starts, side="right") - np.arange(len(starts))
    number = int(np.argmax(counts))
    value, share = float(starts[number]), float(counts[number]) / len(stated)
    if share < settings.share_above or value > limit:
        return StepResult(graph)
    branches = given.branches(graph)
    radius = graph.radius[branches.cut.point]
    vessels = np.unique(branches.chain[(radius >= value) & (radius <= _ALIKE * value)])
    if len(vessels) < _VESSELS or len(vessels) == branches.cut.n_chains:
        return StepResult(graph)
    voxel = f", voxels have {1e3 * given.voxel:.3g} mm" if given.voxel else ""
    message = (
        f"{100 * share:.0f} % of the points, on {len(vessels)} vessels, have the radius {1e3 * value:.4g} mm"
        f"{voxel}: most likely the smallest that the image shows, not the vessels' own; their resistance is not known"
    )
    return StepResult(graph, (), (Finding("radius floor", Severity.WARNING, message, value=value, unit="m"),))
