"""One line per fault of a network file."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

__all__ = ["WORDS", "Fault"]

WORDS: Final[dict[str, str]] = {
    "json": "the file is not well-formed JSON in UTF-8",
    "duplicate": "a key stands twice in one object",
    "missing": "a required field is not there",
    "unknown": "a field that the format does not know",
    "type": "a value of the wrong type",
    "length": "a list or a text of the wrong length",
    "choice": "a word that is none of those allowed",
    "form": "a text of the wrong form",
    "range": "a number outside its range, or not finite",
    "unit": "the units differ from those of the format",
    "identity": "an id stands twice",
    "reference": "a row number or an id leads nowhere",
    "incidence": "nodes, segments, junctions, inlets and outlets do not fit together",
    "ends": "an inlet or an outlet says too much or too little",
    "heights": "heights do not follow from positions and gravity",
    "stations": "stations do not fit their segment, or its numbers do not follow from them",
    "wall law": "the tube law does not give the imaged area",
    "basis": "a number has no basis, or one that leads nowhere",
    "companion": "the companion is missing or not the one named",
    "steady check": "the steady check does not solve its own equations",
}
"""First word of every fault -> what it means."""

_LONGEST = 400


@dataclass(frozen=True)
class Fault:
    """Something wrong in a network file.

    Attributes
    ----------
    word : str
        Kind of fault, one of :data:`WORDS`.
    place : str
        Table, field and row, such as ``segments.length[3]``.
    message : str
        The value, the rule and the way out.

    Examples
    --------
    >>> str(Fault("range", "stations.radius[0]", "0.0 must be > 0"))
    'range: stations.radius[0]: 0.0 must be > 0'
    """

    word: str
    place: str
    message: str

    def __str__(self) -> str:
        """Return word, place and message in one line, whatever texts of the file stand in it."""
        line = f"{self.word}: {self.place or 'file'}: {self.message}"
        shown = line if len(line) <= _LONGEST else line[:_LONGEST] + " …"
        return "".join(sign if sign.isprintable() else ascii(sign)[1:-1] for sign in shown)
