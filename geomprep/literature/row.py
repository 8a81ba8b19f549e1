"""One published number or relation."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["CHECKED", "KINDS", "Row"]

KINDS = ("value", "relation", "exponents", "size")
"""What a row can hold."""

CHECKED = ("seen", "memory", "common practice")
"""How a row was checked against its source."""


@dataclass(frozen=True)
class Row:
    """One published number or relation, SI.

    Attributes
    ----------
    key : str
        Name by which a case file and the network file refer to the row.
    kind : str
        One of :data:`KINDS`.
    of : str
        What it is, in words.
    vessel_class : str
        ``artery``, ``vein`` or ``any``.
    citation, doi, place : str
        Source, and where in it the number stands; `doi` may be empty.
    checked : str
        One of :data:`CHECKED`.
    confidence : str
        ``high`` or ``medium`` where `checked` is ``memory``; empty otherwise.
    quantity : str
        Kind of quantity of `value` (a name of :data:`geomprep.units.DIMENSIONS`); ``length``
        (a radius) for sizes.
    value : float, optional
        The value; for sizes the radius of the mean. None for relations and exponents.
    low, high : float, optional
        Published interval of the value; for sizes that of the radius.
    function : str
        For relations: name in :data:`geomprep.laws.stiffness.RELATIONS`.
    coefficients : tuple of (str, float)
        For relations: coefficients by name; for exponents: m and n.
    radius_low, radius_high : float, optional
        Radii within which the row may be used.
    transmural_pressure : float, optional
        State at which a stiffness holds, Pa; None where not known.
    population, note : str
        Who was measured and how; what else must be known.
    caution : str
        What a user must be told each time the row is used; usually empty.
    """

    key: str
    kind: str
    of: str
    vessel_class: str
    citation: str
    doi: str
    place: str
    checked: str
    confidence: str = ""
    quantity: str = ""
    value: float | None = None
    low: float | None = None
    high: float | None = None
    function: str = ""
    coefficients: tuple[tuple[str, float], ...] = ()
    radius_low: float | None = None
    radius_high: float | None = None
    transmural_pressure: float | None = None
    population: str = ""
    note: str = ""
    caution: str = ""

    def fits(self, vessel_class: str) -> bool:
        """Say whether the row may be used for a vessel class.

        Examples
        --------
        >>> Row("k", "value", "", "vein", "", "", "", "seen").fits("artery")
        False
        """
        return self.vessel_class in ("any", vessel_class)
