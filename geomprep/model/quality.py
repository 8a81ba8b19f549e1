"""How well the geometry of a segment is known: its radius profile, its resolution, its intervals."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.model.arrays import FloatArray, IntArray, Uint8Array, frozen, same_length

__all__ = [
    "PROFILE_KINDS",
    "RESOLUTION_LEVELS",
    "Narrowing",
    "SegmentBending",
    "SegmentIntervals",
    "SegmentProfiles",
    "SegmentResolution",
]

PROFILE_KINDS = ("constant", "linear", "piecewise")
"""Name in files of each form of ln r along a segment."""

RESOLUTION_LEVELS = ("resolved", "biased", "not resolved")
"""Name in files of each level: from 8 voxels across, from 4, fewer."""


class _Columns:
    """Columns of one length: codes as uint8, counts as integers, the rest as floats."""

    def __post_init__(self) -> None:
        """Make the arrays read-only and check that they fit together."""
        kinds = {"kind": np.uint8, "level": np.uint8, "pieces": np.int64, "inflections": np.int64}
        names = [name for name in self.__dataclass_fields__ if name != "confidence"]  # type: ignore[attr-defined]
        for name in names:
            object.__setattr__(self, name, frozen(name, getattr(self, name), kinds.get(name, np.float64)))
        same_length(**{name: getattr(self, name) for name in names})


@dataclass(frozen=True, eq=False)
class SegmentProfiles(_Columns):
    """Form of ln r along each segment, (s,) arrays.

    Attributes
    ----------
    kind : uint8 array
        Code in :data:`PROFILE_KINDS`.
    pieces : int array
    scatter : float array
        Standard deviation of ln r about the profile.
    noise_bias : float array
        E[r⁻⁴] of that scatter over r⁻⁴ without it, if all of it is noise.
    ratio_for_volume, ratio_median : float array
        Resistance of one cylinder of that radius over that of the stations.
    """

    kind: Uint8Array
    pieces: IntArray
    scatter: FloatArray
    noise_bias: FloatArray
    ratio_for_volume: FloatArray
    ratio_median: FloatArray


@dataclass(frozen=True, eq=False)
class SegmentBending(_Columns):
    """How each segment bends, (s,) arrays; comparable only at like steps.

    Attributes
    ----------
    inflections : int array
        Places where the principal normal turns about.
    sum_of_angles : float array
        Sum of the angles, in-plane and torsional, between successive pieces over the length, rad/m.
    total_curvature : float array
        Sum of the angles between successive pieces, rad.
    step : float array
        Mean distance between stations, m.
    """

    inflections: IntArray
    sum_of_angles: FloatArray
    total_curvature: FloatArray
    step: FloatArray


@dataclass(frozen=True, eq=False)
class SegmentResolution(_Columns):
    """Voxels across each segment, (s,) arrays.

    Attributes
    ----------
    diameter_in_voxels : float array
        Of the radius of equal resistance.
    level : uint8 array
        Code in :data:`RESOLUTION_LEVELS`.
    share_not_resolved, share_biased : float array
        Part of ∫ds/r⁴ with fewer than 4 voxels across, and with 4 to 8.
    """

    diameter_in_voxels: FloatArray
    level: Uint8Array
    share_not_resolved: FloatArray
    share_biased: FloatArray


@dataclass(frozen=True, eq=False)
class SegmentIntervals(_Columns):
    """Intervals of each segment's integrals under the noise that the voxel brings, (s,) arrays in SI.

    Attributes
    ----------
    confidence : float
        Probability that an interval is meant to hold the truth.
    length_low, length_high, volume_low, volume_high : float array
    inverse_fourth_power_low, inverse_fourth_power_high : float array
        Of ∫ds/r⁴: the interval of the resistance at the viscosity that the file states.
    """

    confidence: float
    length_low: FloatArray
    length_high: FloatArray
    volume_low: FloatArray
    volume_high: FloatArray
    inverse_fourth_power_low: FloatArray
    inverse_fourth_power_high: FloatArray


@dataclass(frozen=True)
class Narrowing:
    """A narrowing or widening of a segment against the vessel beside it.

    Attributes
    ----------
    segment : int
    kind : str
        ``narrowing`` or ``widening``.
    start, end, place : float
        Distance along the segment of both edges and of the extreme radius, m.
    radius, reference_radius : float
        There, and expected there from the vessel beside it, m.
    degree_by_diameter, degree_by_area : float
        |1 − r/reference| and |1 − (r/reference)²|.
    focal : str
        ``focal``, or ``cannot be told`` where it is long or has a reference on one side only: a narrow vessel
        then looks like a narrowed one.
    against_distal, against_original : float, optional
        Narrowings of arteries: against the normal vessel beyond, and against the lumen estimated at the place.
    """

    segment: int
    kind: str
    start: float
    end: float
    place: float
    radius: float
    reference_radius: float
    degree_by_diameter: float
    degree_by_area: float
    focal: str
    against_distal: float | None = None
    against_original: float | None = None
