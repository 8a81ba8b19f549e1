"""What was changed and what people decided about it."""

from __future__ import annotations

from dataclasses import dataclass, field

__all__ = ["Decision", "Repair"]


@dataclass(frozen=True)
class Repair:
    """Something changed (or offered for change), with its reason and its local effect.

    Attributes
    ----------
    id : str
        Stable id: kind and a hash of the raw coordinates of its anchor points.
    kind : str
        Name of the repair step, such as ``fused copies``.
    reason : str
        One sentence with the numbers that led to it.
    position : tuple of float
        Place in metres.
    choice : str
        What was done; one of `options`.
    options : tuple of str
        What could be done.
    verdict_by : str
        ``rule``, ``person`` or ``open`` (asked and not decided: left as in the input).
    score : float, optional
        Between 0 and 1, where the step scores its candidates.
    conductance_before, conductance_after : float, optional
        Local hydraulic conductance in m³/(Pa·s) at unit blood viscosity of 1 Pa·s.
    raw_points : tuple of int
        Raw points that it moved, merged or dropped.
    after : tuple of str
        Ids of repairs this one depends on.
    """

    id: str
    kind: str
    reason: str
    position: tuple[float, float, float]
    choice: str
    options: tuple[str, ...]
    verdict_by: str = "rule"
    score: float | None = None
    conductance_before: float | None = None
    conductance_after: float | None = None
    raw_points: tuple[int, ...] = field(default=(), repr=False)
    after: tuple[str, ...] = ()


@dataclass(frozen=True)
class Decision:
    """A person's choice on a repair or a finding."""

    id: str
    choice: str
    note: str
    recorded_by: str
