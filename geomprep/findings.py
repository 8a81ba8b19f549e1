"""What was seen and not changed: doubtful anatomy, unusual numbers, left-over choices."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from enum import StrEnum

__all__ = ["Finding", "Severity", "most_severe"]


class Severity(StrEnum):
    """How much a finding matters; ordered from least to most."""

    NOTE = "note"
    WARNING = "warning"
    ERROR = "error"


@dataclass(frozen=True)
class Finding:
    """Something seen by a stage and reported, never an exception.

    Attributes
    ----------
    kind : str
        Short stable word for the kind, such as ``isolated part``.
    severity : Severity
        ``note``, ``warning`` or ``error``.
    message : str
        One sentence for a person, with the numbers in it.
    where : str
        Id of the node, segment or input that it is about; empty for the whole network.
    position : tuple of float, optional
        Place in metres in the frame of the input.
    value, limit : float, optional
        The number seen and the limit it was held against, both SI.
    unit : str
        Unit of `value` and `limit` as a UCUM code; empty for a pure number.
    source : str
        Key of the literature row that gives the limit, or empty.
    """

    kind: str
    severity: Severity
    message: str
    where: str = ""
    position: tuple[float, float, float] | None = None
    value: float | None = None
    limit: float | None = None
    unit: str = ""
    source: str = ""


_ORDER = {Severity.NOTE: 0, Severity.WARNING: 1, Severity.ERROR: 2}


def most_severe(findings: Iterable[Finding]) -> Severity | None:
    """Return the highest severity among findings, or None where there are none.

    Examples
    --------
    >>> most_severe([Finding("a", Severity.NOTE, ""), Finding("b", Severity.ERROR, "")])
    <Severity.ERROR: 'error'>
    >>> most_severe([]) is None
    True
    """
    return max((finding.severity for finding in findings), key=_ORDER.__getitem__, default=None)
