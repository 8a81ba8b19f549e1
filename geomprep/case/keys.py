"""The table of keys of a case file: reading, messages and the manual are made from it."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from difflib import get_close_matches
from functools import cache
from importlib.resources import files

__all__ = ["Key", "key_table", "nearest", "section_names"]


@dataclass(frozen=True)
class Key:
    """One row of the table of keys.

    Attributes
    ----------
    section : str
        Name of the section; ``[]`` after it marks a list of tables, ``.*`` free names.
    key : str
    kind : str
        Kind of value: a quantity of :data:`geomprep.units.DIMENSIONS`, ``text``,
        ``choice``, ``file`` … as listed in :mod:`geomprep.case.values`.
    words : tuple of str
        The choices, or words accepted beside a quantity.
    default : str
        Value where the case states none, as it would be written; ``required`` or empty.
    rule : str
        Bounds in SI, such as ``> 0 and <= 1``.
    example : str
    description : str
    """

    section: str
    key: str
    kind: str
    words: tuple[str, ...]
    default: str
    rule: str
    example: str
    description: str


@cache
def key_table() -> dict[str, dict[str, Key]]:
    """Return the keys of every section: ``{section: {key: Key}}``.

    Examples
    --------
    >>> key_table()["blood"]["viscosity"].kind
    'viscosity'
    """
    table: dict[str, dict[str, Key]] = {}
    text = files("geomprep.case").joinpath("keys.csv").read_text(encoding="utf-8")
    for row in csv.DictReader(text.splitlines()):
        words = tuple(word.strip() for word in row["words"].split("|") if word.strip())
        table.setdefault(row["section"], {})[row["key"]] = Key(**{**row, "words": words})  # type: ignore[arg-type]
    return table


def section_names() -> tuple[str, ...]:
    """Return the names of the sections as a person writes them.

    Examples
    --------
    >>> section_names()[:3]
    ('[case]', '[[input]]', '[imaging_state]')
    """
    return tuple(
        f"[[{name[:-2]}]]" if name.endswith("[]") else f"[{name.replace('.*', '.<name>')}]" for name in key_table()
    )


def nearest(word: str, known: list[str]) -> str:
    """Say which known word is nearest, or list all where none is near.

    Examples
    --------
    >>> nearest("viscositty", ["density", "viscosity"])
    "did you mean 'viscosity'?"
    >>> nearest("q", ["density", "viscosity"])
    'known here: density, viscosity'
    """
    close = get_close_matches(word.lower(), known, n=1, cutoff=0.5)
    return f"did you mean '{close[0]}'?" if close else f"known here: {', '.join(known)}"
