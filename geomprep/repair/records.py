"""The record of one candidate: what it is, what was chosen, what that changes."""

from __future__ import annotations

from dataclasses import dataclass, field

from geomprep.model import FloatArray, IntArray, Repair
from geomprep.repair.verdicts import Verdict

__all__ = ["Change", "recorded"]


@dataclass(frozen=True, eq=False)
class Change:
    """What a candidate is and what doing it changes.

    Attributes
    ----------
    reason : str
        One sentence with the numbers.
    place : (3,) float array
        m.
    conductance : (before, after), optional
        Local conductance at a viscosity of 1 Pa·s.
    raw : (k,) int array, optional
        Raw points that are moved, merged or dropped; −1 entries are none.
    score : float, optional
    """

    reason: str
    place: FloatArray
    conductance: tuple[float, float] | None = None
    raw: IntArray | None = field(default=None, repr=False)
    score: float | None = None


def recorded(kind: str, key: str, options: tuple[str, ...], verdict: Verdict, change: Change) -> Repair:
    """Return the record of a candidate; where it is left, nothing changes.

    Parameters
    ----------
    kind, key : str
        Name of the repair, and id.
    options : tuple of str
        The first leaves things as they are.
    verdict : Verdict
    change : Change

    Examples
    --------
    >>> import numpy as np
    >>> change = Change("…", np.zeros(3), (2.0, 0.0), np.array([4]))
    >>> spur = recorded("spur", "spur-1", ("leave", "drop"), Verdict("leave", "person"), change)
    >>> spur.conductance_after, spur.raw_points
    (2.0, ())
    """
    left = verdict.choice == options[0]
    before, after = change.conductance if change.conductance is not None else (None, None)
    x, y, z = change.place.tolist()
    return Repair(
        id=key,
        kind=kind,
        reason=change.reason,
        position=(x, y, z),
        choice=verdict.choice,
        options=options,
        verdict_by=verdict.by,
        score=change.score,
        conductance_before=before,
        conductance_after=before if left else after,
        raw_points=() if left or change.raw is None else tuple(change.raw[change.raw >= 0].tolist()),
    )
