"""How well the image resolves each vessel, and how much of a resistance rests on vessels it does not resolve.

Resistance goes with r⁻⁴: an error of half a voxel in a vessel two voxels wide is a factor of several.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
import numpy.typing as npt

from geomprep.curves import line_sums, piece_integrals, pieces
from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.laws.arrays import positive
from geomprep.measure.curves import check_lines
from geomprep.model import FloatArray, IntArray, Uint8Array

__all__ = [
    "Resolution",
    "ResolutionLevel",
    "longest_edge",
    "resolution",
    "resolution_findings",
    "unresolved_share",
]

_NOT_RESOLVED, _BIASED = 4.0, 8.0  # voxels across


class ResolutionLevel(IntEnum):
    """How many voxels lie across a vessel: from 8, from 4, or fewer."""

    RESOLVED = 0
    BIASED = 1
    NOT_RESOLVED = 2


@dataclass(frozen=True, eq=False)
class Resolution:
    """Voxels across the n stations and m segments.

    Attributes
    ----------
    diameter_in_voxels : (n,) float array
        2r over the longest edge of a voxel.
    level : (n,) uint8 array
        :class:`ResolutionLevel` of each station.
    segment_diameter_in_voxels : (m,) float array
        The same of the radius of equal resistance.
    segment_level : (m,) uint8 array
        The level above which less than half of the segment's ∫ds/r⁴ lies.
    share_not_resolved, share_biased : (m,) float array
        Part of each segment's ∫ds/r⁴ where fewer than 4, and from 4 to 8, voxels lie across.
    """

    diameter_in_voxels: FloatArray
    level: Uint8Array
    segment_diameter_in_voxels: FloatArray
    segment_level: Uint8Array
    share_not_resolved: FloatArray
    share_biased: FloatArray


def resolution(distance: FloatArray, radius: FloatArray, offsets: IntArray, voxel: npt.ArrayLike) -> Resolution:
    """Count the voxels across vessels.

    Fewer than 4 do not resolve a lumen; fewer than 8 leave its area biased by partial volume.

    Parameters
    ----------
    distance, radius : (n,) float array
        Distance along each segment from its first station and radius there, m.
    offsets : (m + 1,) int array
        Segment i owns stations ``offsets[i]:offsets[i + 1]``, at least two.
    voxel : float or (3,) array_like
        Edges of a voxel, m; the longest counts.

    Returns
    -------
    Resolution

    Raises
    ------
    InputError
        A radius or edge is not above zero, or the arrays do not describe segments.

    References
    ----------
    8: best accuracy of areas in MR at a signal-to-noise ratio of 10 and more (abstract seen, authors unknown
    to us); 4 is a judgement.

    Examples
    --------
    Diameters of 2 and 6 mm in voxels of 0.6 mm:

    >>> found = resolution(np.array([0, 0.01] * 2), np.array([1e-3, 1e-3, 3e-3, 3e-3]), np.array([0, 2, 4]), 0.6e-3)
    >>> found.segment_diameter_in_voxels.round(2).tolist(), found.segment_level.tolist()
    ([3.33, 10.0], [2, 0])
    """
    radius, edge = positive("radius", radius), longest_edge(voxel)
    check_lines(distance, offsets, radius=radius)
    piece = pieces(offsets)
    step, near, far = distance[piece.first + 1] - distance[piece.first], radius[piece.first], radius[piece.first + 1]
    whole = line_sums(piece_integrals(step, near, far)[:, 3], piece.starts)
    low, high = 0.5 * _NOT_RESOLVED * edge, 0.5 * _BIASED * edge
    below = [line_sums(_part_below(step, near, far, limit), piece.starts) / whole for limit in (low, high)]
    of_segment = 2 * (line_sums(step, piece.starts) / whole) ** 0.25 / edge
    return Resolution(
        diameter_in_voxels=2 * radius / edge,
        level=((radius < high).astype(np.uint8) + (radius < low)).astype(np.uint8),
        segment_diameter_in_voxels=of_segment,
        segment_level=((below[1] >= 0.5).astype(np.uint8) + (below[0] >= 0.5)).astype(np.uint8),
        share_not_resolved=below[0],
        share_biased=below[1] - below[0],
    )


def longest_edge(voxel: npt.ArrayLike) -> float:
    """Return the longest edge of a voxel.

    Parameters
    ----------
    voxel : float or (3,) array_like
        Edges, m.

    Raises
    ------
    InputError
        An edge is not above zero.

    Examples
    --------
    >>> longest_edge([0.3e-3, 0.3e-3, 1e-3])
    0.001
    """
    return float(np.max(positive("voxel", voxel)))


def _part_below(step: FloatArray, near: FloatArray, far: FloatArray, limit: float) -> FloatArray:
    """∫ds/r⁴ of the part of each piece where the linear radius is below a limit."""
    low, high = np.minimum(near, far), np.maximum(near, far)
    run = high - low
    part = np.where(run > 0, np.clip((limit - low) / np.where(run > 0, run, 1.0), 0.0, 1.0), low < limit)
    return piece_integrals(step * part, low, low + part * run)[:, 3]


def resolution_findings(found: Resolution, ids: Sequence[str]) -> tuple[Finding, ...]:
    """Report the segments that are not resolved, or biased.

    Parameters
    ----------
    found : Resolution
    ids : (m,) sequence of str

    Returns
    -------
    tuple of Finding
        In the order of segments; ``not resolved`` (warning) or ``biased by resolution`` (note).

    Examples
    --------
    >>> found = resolution(np.array([0, 0.01]), np.array([1e-3, 1e-3]), np.array([0, 2]), 0.6e-3)
    >>> print(resolution_findings(found, ["s1"])[0].message)
    3.3 voxels across, 100 % of the resistance below 4: not resolved; its resistance is not known from this image
    """
    return tuple(_finding(found, ids, int(row)) for row in np.flatnonzero(found.segment_level))


def _finding(found: Resolution, ids: Sequence[str], row: int) -> Finding:
    """What is said of one segment."""
    across = float(found.segment_diameter_in_voxels[row])
    if found.segment_level[row] == ResolutionLevel.NOT_RESOLVED:
        kind, severity, limit, share = "not resolved", Severity.WARNING, _NOT_RESOLVED, found.share_not_resolved[row]
        means = "not resolved; its resistance is not known from this image"
    else:
        kind, severity, limit = "biased by resolution", Severity.NOTE, _BIASED
        share = found.share_not_resolved[row] + found.share_biased[row]
        means = "partial volume may bias its radius"
    message = f"{across:.1f} voxels across, {100 * share:.0f} % of the resistance below {limit:g}: {means}"
    return Finding(kind, severity, message, where=ids[row], value=across, limit=limit)


def unresolved_share(resistance: npt.ArrayLike, flow: npt.ArrayLike, share: npt.ArrayLike) -> FloatArray:
    """Return the part of the inlet-to-outlet resistance that rests on vessels below resolution.

    With one inlet and one outlet the resistance between them is Σ R q²/Q² (the power lost over the square
    of the flow), so each segment's part in it is that of the power; with more ends it is the power's.

    Parameters
    ----------
    resistance : (m,) array_like
        Of segments, Pa·s/m³, from 0.
    flow : (m,) or (k, m) array_like
        Through segments, m³/s, in any direction; k states at once.
    share : (m,) array_like
        Part of each segment's resistance that is not resolved, as in :class:`Resolution`.

    Returns
    -------
    () or (k,) float array
        0 to 1; not a number where nothing flows.

    Raises
    ------
    InputError
        A resistance is negative or a share outside 0 to 1.

    References
    ----------
    Klein & Randić 1993, doi 10.1007/BF01164627 (effective resistance; from memory).

    Examples
    --------
    A resolved trunk of 1, then two equal unresolved branches of 2 side by side: half of the resistance.

    >>> float(unresolved_share([1.0, 2.0, 2.0], [1.0, 0.5, 0.5], [0.0, 1.0, 1.0]))
    0.5
    """
    drag, part = np.asarray(resistance, dtype=np.float64), np.asarray(share, dtype=np.float64)
    if not (drag >= 0).all():
        raise InputError(f"resistance = {np.min(drag):g}: segments need resistances from 0")
    if not ((part >= 0) & (part <= 1 + 1e-9)).all():
        raise InputError(f"share = {part[~((part >= 0) & (part <= 1 + 1e-9))][0]:g}: parts from 0 to 1 are needed")
    power = drag * np.asarray(flow, dtype=np.float64) ** 2
    total = power.sum(axis=-1)
    return np.asarray((power @ part) / np.where(total > 0, total, np.nan))
