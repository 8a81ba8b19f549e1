"""When two vessels are one, and when they differ."""

from __future__ import annotations

import math
from dataclasses import dataclass

from geomprep.errors import InputError

__all__ = ["ComparisonSettings"]


@dataclass(frozen=True)
class ComparisonSettings:
    """When two vessels are one, and when they differ; all defaults are judgements.

    A change counts where it is above its limit and above `noise_factor` standard deviations of a difference of two
    readings. No averaging along the vessel is credited: the error of a reader or of a threshold is common to it all.

    Attributes
    ----------
    within, named_within : float
        Distance of two axes that are one vessel, in mean radii; the second where both bear the same name.
    share : float
        Part of the shorter segment that must run along the other.
    angle : float
        Largest angle between the axes, rad.
    cell : float
        Step along the axes, in mean radii.
    length_change : float
        Relative.
    end_shift : float
        In mean radii: a junction has no sharper place than that, so lengths that differ by less do not count.
    radius_change, local_change : float
        Relative: of the radius of equal resistance, and of the radius averaged over five cells.
    noise_factor : float
        For changes at one place it rises with the number of places.
    voxel : float, optional
        Longest edge, m; two axes less than that apart are one vessel.
    voxel_fraction : float
        Standard deviation of radius and position in voxels, where no other is given.
    radius_deviation : float, optional
        Standard deviation of the radius, m.
    """

    within: float = 0.5
    named_within: float = 1.0
    share: float = 0.5
    angle: float = math.pi / 3
    cell: float = 0.5
    length_change: float = 0.05
    end_shift: float = 1.0
    radius_change: float = 0.05
    local_change: float = 0.2
    noise_factor: float = 2.0
    voxel: float | None = None
    voxel_fraction: float = 0.25
    radius_deviation: float | None = None

    def __post_init__(self) -> None:
        for name, value in vars(self).items():
            low, high = _BOUNDS.get(name, (0.0, math.inf))
            if value is not None and not low < value <= high:
                rule = f"above {low:g}" if high == math.inf else f"above {low:g}, up to {high:g}"
                raise InputError(f"{name} = {value:g}: a number {rule} is needed")

    @property
    def position_noise(self) -> float:
        """Standard deviation of each coordinate, m; 0 where no voxel is stated."""
        return self.voxel_fraction * (self.voxel or 0.0)

    @property
    def radius_noise(self) -> float:
        """Standard deviation of the radius, m; 0 where nothing is stated."""
        return self.position_noise if self.radius_deviation is None else self.radius_deviation


_BOUNDS = {"share": (0.0, 1.0), "angle": (0.0, math.pi / 2), "cell": (0.0, 2.0), "within": (0.0, 2.0)}
