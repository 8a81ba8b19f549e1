"""Limits of the step that joins lines into one graph."""

from __future__ import annotations

from dataclasses import dataclass, fields

from geomprep.errors import InputError

__all__ = ["JoinSettings"]


@dataclass(frozen=True)
class JoinSettings:
    """Limits of joining, all in parts of the local radius.

    Attributes
    ----------
    tolerance : float
        Points of one vessel class closer than this part of the smaller radius are one point.
    copies_within : float
        Lines that run within this part of the radius of a common middle line (and so
        within twice as much of one another) are copies of one vessel. Veins are
        fused within `tolerance` only; beyond it a person is asked.
    copies_overlap : float
        Radii that two lines must share before they count as copies rather than as crossing.
    copies_radius_ratio : float
        Largest ratio between the radii of two copies.
    joints_within : float
        A line end within this part of the radius of another line joins it.
    radii_agree_within : float
        Copies at identical points whose radii lie within this part of the largest are
        averaged; smaller ones belong to a side branch drawn over its parent.

    Raises
    ------
    InputError
        A value is negative, not a number, or too large to mean what it should.

    Examples
    --------
    >>> JoinSettings(tolerance=1e-4).copies_within
    0.05
    >>> JoinSettings(tolerance=-1)
    Traceback (most recent call last):
    geomprep.errors.InputError: repair.join.tolerance = -1: must be at least 0 and below 1 (a part of the radius)
    """

    tolerance: float = 1e-3
    copies_within: float = 0.05
    copies_overlap: float = 2.0
    copies_radius_ratio: float = 1.5
    joints_within: float = 0.1
    radii_agree_within: float = 0.15

    def __post_init__(self) -> None:
        """Refuse values outside their range."""
        for field in fields(self):
            value = getattr(self, field.name)
            low, high, meaning = _RANGES.get(field.name, (0.0, 1.0, "a part of the radius"))
            if not low <= value < high:
                raise InputError(
                    f"repair.join.{field.name} = {value:g}: must be at least {low:g} and below {high:g} ({meaning})"
                )


_RANGES = {
    "copies_within": (0.0, 0.2, "a part of the radius; lines further apart are not copies"),
    "copies_overlap": (1.0, 100.0, "a length in radii"),
    "copies_radius_ratio": (1.0, 10.0, "a ratio of radii"),
}
