"""What is said of areas that stations took from a surface or a mask."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np

from geomprep.findings import Finding, Severity
from geomprep.model import BoolArray, FloatArray, IntArray, Network, TextArray
from geomprep.units import format_quantity

__all__ = ["area_findings", "coarse_findings", "shape_finding"]

_SHOWN: Final = 3
_FEW_ACROSS: Final = 4.0
"""Voxels per diameter below which a lumen is not resolved."""
_FAR_IN_THE_MIDDLE: Final = 1.25
"""Ratio of the median measured radius to the stated one from which the stated sizes are doubtful."""


def area_findings(
    network: Network, source: tuple[str, str], taken: tuple[IntArray, FloatArray], why: TextArray
) -> Iterator[Finding]:
    """Say how many stations were measured by one file, why others were not, and the largest differences.

    Parameters
    ----------
    network : Network
        With the radii as they were stated.
    source : (str, str)
        Key of the case and words for the file.
    taken : (t,) int array and (k,) float array
        Rows of the stations that take their area from it, radii of all stations in metres.
    why : (w,) str array
        Why a station that had no measured area yet keeps its radius, or empty.

    Yields
    ------
    Finding
    """
    key, words = source[0].replace("_", " "), source[1]
    rows, radius = taken
    reasons, counts = np.unique(why[why != ""].astype(str), return_counts=True)
    listed = ", ".join(f"{counts[i]} {reasons[i]}" for i in np.argsort(-counts, kind="stable"))
    kept = f"; {counts.sum()} keep the radius they have ({listed})" if len(counts) else ""
    message = f"{words}: {len(rows)} of {len(why)} stations take their area from the {key}{kept}"
    few = len(rows) < counts.sum()
    yield Finding(f"areas from {key}", Severity.WARNING if few else Severity.NOTE, message, value=float(len(rows)))
    if len(rows):
        yield _differences(network, key, rows, radius[rows])


def _differences(network: Network, key: str, rows: IntArray, radius: FloatArray) -> Finding:
    """The middle ratio of measured to stated radii, and the largest, one per segment."""
    stations = network.stations
    ratio = radius / stations.radius[rows]
    size = np.abs(np.log(ratio))
    order = np.argsort(-size, kind="stable")
    first = np.unique(stations.segment[rows][order], return_index=True)[1]
    largest = order[np.sort(first)[:_SHOWN]]
    shown = ", ".join(
        f"{format_quantity(float(stations.radius[rows[i]]), 'mm', 3)} → {format_quantity(float(radius[i]), 'mm', 3)} "
        f"in {network.segments.id[stations.segment[rows[i]]]}"
        for i in largest.tolist()
    )
    middle, row = float(np.median(ratio)), int(rows[largest[0]])
    far = abs(np.log(middle)) > np.log(_FAR_IN_THE_MIDDLE)
    hint = "; check what size_means says" if far else ""
    message = f"radii of the {key} over those stated: median {middle:.3f}; largest differences: {shown}{hint}"
    x, y, z = stations.position[row].tolist()
    return Finding(
        f"radii of {key} and lines",
        Severity.WARNING if far else Severity.NOTE,
        message,
        where=str(network.segments.id[stations.segment[row]]),
        position=(x, y, z),
        value=float(ratio[largest[0]]),
    )


def coarse_findings(across: FloatArray) -> tuple[Finding, ...]:
    """Say how many measured stations are too few voxels across for their areas to be smooth.

    Parameters
    ----------
    across : (t,) float array
        Voxels per diameter.

    Returns
    -------
    tuple of Finding
        Empty where all are resolved.

    Examples
    --------
    >>> coarse_findings(np.array([2.5, 8.0]))[0].message[:67]
    '1 of 2 stations measured by the mask are less than 4 voxels across:'
    """
    few = int(np.count_nonzero(across < _FEW_ACROSS))
    message = (
        f"{few} of {len(across)} stations measured by the mask are less than {_FEW_ACROSS:g} voxels across: the scatter of "
        "their areas makes resistances too high; state a finer mask, or leave it out there"
    )
    coarse = Finding(
        "mask too coarse", Severity.WARNING, message, value=float(across.min(initial=np.inf)), limit=_FEW_ACROSS
    )
    return (coarse,) if few else ()


def shape_finding(friction: FloatArray, known: BoolArray) -> Finding:
    """Say how many segments have a measured friction shape, and its range.

    Parameters
    ----------
    friction : (s,) float array
    known : (s,) bool array
        Where it was measured.

    Returns
    -------
    Finding

    Examples
    --------
    >>> print(shape_finding(np.array([1.25, 1.0]), np.array([True, False])).message)
    friction shapes of 1 of 2 segments were measured (1.250 to 1.250); 1 stay at 1, less than half measured
    """
    inside = friction[known]
    span = f" ({inside.min():.3f} to {inside.max():.3f})" if len(inside) else ""
    rest = int(np.count_nonzero(~known))
    left = f"; {rest} stay at 1, less than half measured" if rest else ""
    message = f"friction shapes of {len(inside)} of {len(friction)} segments were measured{span}{left}"
    return Finding("friction shapes", Severity.NOTE, message, value=float(friction.max(initial=1.0)))
