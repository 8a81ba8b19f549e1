"""Arteries or veins, line by line, from an array of the file."""

from __future__ import annotations

from difflib import get_close_matches
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from geomprep.errors import CaseError, Question
from geomprep.files.statement import InputStatement
from geomprep.findings import Finding, Severity
from geomprep.model import VESSEL_CLASSES, IntArray, Uint8Array

if TYPE_CHECKING:
    from geomprep.files.contents import FileContents

__all__ = ["class_questions", "line_classes"]

_UNKNOWN, _ARTERY, _VEIN = range(len(VESSEL_CLASSES))
_MOST_KINDS = 12
"""An array of more different values than this is no array of classes."""


def class_questions(contents: FileContents, statement: InputStatement, key: str) -> list[Question]:
    """Return what is open about the array that tells arteries from veins.

    Parameters
    ----------
    contents : FileContents
    statement : InputStatement
        Whose `vessels` is ``both``.
    key : str
        Section of the case, for messages.

    Returns
    -------
    list of Question
        About the name of the array, and about the values that mean artery and vein.

    Raises
    ------
    CaseError
        The stated array does not exist or holds no classes.
    """
    if statement.class_array is None:
        kinds = [(name, text) for name, array in _arrays(contents) if (text := _kinds(array))]
        text = f"which array of {statement.file} tells arteries from veins?"
        return [Question(f"{key}.class_array", text, *_columns(kinds))]
    values = _class_values(contents, statement.class_array, key)
    if statement.class_values is None:
        text = f"which values of '{statement.class_array}' mean artery and vein? It holds {_kinds(values)}"
        found = [f"{value:g}" for value in np.unique(values).tolist()]
        pairs = [f"{{ artery = {a}, vein = {v} }}" for a in found for v in found if a != v][:6]
        return [Question(f"{key}.class_values", text, tuple(pairs), ("",) * len(pairs))]
    return []


def _columns(rows: list[tuple[str, str]]) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Two columns of a list of pairs."""
    return tuple(first for first, _ in rows), tuple(second for _, second in rows)


def _arrays(contents: FileContents) -> list[tuple[str, npt.NDArray[Any]]]:
    """All arrays, those on lines first."""
    return [*contents.cell_arrays.items(), *contents.point_arrays.items()]


def _kinds(values: npt.NDArray[Any]) -> str:
    """The values of an array of classes with their counts; empty where it is none."""
    if values.ndim != 1 or values.dtype.kind not in "iufb":
        return ""
    kinds, counts = np.unique(values, return_counts=True)
    if not 2 <= len(kinds) <= _MOST_KINDS or np.any(kinds != np.round(kinds)):
        return ""
    return ", ".join(f"{kind:g} ({count}x)" for kind, count in zip(kinds.tolist(), counts.tolist(), strict=True))


def _class_values(contents: FileContents, stated: str, key: str) -> npt.NDArray[Any]:
    """Values of the stated array."""
    arrays = _arrays(contents)
    for name, values in arrays:
        if name == stated:
            if not _kinds(values):
                rule = f"must hold 2 to {_MOST_KINDS} different whole numbers, one per line or point"
                raise CaseError(f"{key}.class_array = '{stated}': {rule}")
            return values
    names = [name for name, _ in arrays]
    near = get_close_matches(stated, names, n=1)
    hint = f"did you mean '{near[0]}'?" if near else f"it holds {', '.join(names) or 'no arrays'}"
    raise CaseError(f"{key}.class_array = '{stated}': no such array in the file; {hint}")


def line_classes(contents: FileContents, statement: InputStatement, key: str) -> tuple[Uint8Array, list[Finding]]:
    """Return the class code of every line.

    Parameters
    ----------
    contents : FileContents
    statement : InputStatement
        With `vessels` stated; for ``both`` also `class_array` and `class_values`.
    key : str
        Section of the case, for messages.

    Returns
    -------
    codes : (m,) uint8 array
        In :data:`geomprep.model.VESSEL_CLASSES`. Where the array stands on points, a line
        takes the class that its points agree on; an end may differ, it can lie on another vessel.
    findings : list of Finding
        Lines whose class stays unknown.
    """
    m = contents.n_lines
    if statement.vessels != "both":
        code = {"arteries": _ARTERY, "veins": _VEIN}.get(statement.vessels or "", _UNKNOWN)
        return np.full(m, code, dtype=np.uint8), []
    values = _class_values(contents, str(statement.class_array), key)
    artery, vein = statement.class_values or (np.nan, np.nan)
    if len(values) != m or statement.class_array not in contents.cell_arrays:
        codes = _from_points(contents, values == artery, values == vein)
    else:
        codes = np.select([values == artery, values == vein], [_ARTERY, _VEIN], _UNKNOWN).astype(np.uint8)
    unknown = int((codes == _UNKNOWN).sum())
    if not unknown:
        return codes, []
    message = (
        f"{statement.file}: {unknown} of {m} lines are neither artery nor vein by '{statement.class_array}'; "
        "an unknown class joins anything"
    )
    return codes, [Finding("vessel class", Severity.WARNING, message, key)]


def _from_points(contents: FileContents, artery: npt.NDArray[np.bool_], vein: npt.NDArray[np.bool_]) -> Uint8Array:
    """Class of lines from the classes of their points, ends left out where a line has inner points."""
    m, offsets = contents.n_lines, contents.offsets
    line: IntArray = np.repeat(np.arange(m), np.diff(offsets))
    counted = np.ones(len(line), dtype=bool)
    long = np.diff(offsets) > 2
    counted[offsets[:-1][long]] = False
    counted[offsets[1:][long] - 1] = False
    arteries = np.bincount(line, weights=artery[contents.connectivity] & counted, minlength=m)
    veins = np.bincount(line, weights=vein[contents.connectivity] & counted, minlength=m)
    clear = [(arteries > 0) & (veins == 0), (veins > 0) & (arteries == 0)]
    return np.select(clear, [_ARTERY, _VEIN], _UNKNOWN).astype(np.uint8)
