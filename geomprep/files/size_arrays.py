"""Which arrays of a file may hold vessel sizes: one rule, no list of anybody's names."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from difflib import get_close_matches
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from geomprep.errors import CaseError

if TYPE_CHECKING:
    from geomprep.files.contents import FileContents

__all__ = ["SizeArray", "find_size_array", "size_arrays"]

_WORDS = ("radius", "diameter", "area")


@dataclass(frozen=True, eq=False)
class SizeArray:
    """An array that may hold sizes.

    Attributes
    ----------
    name : str
    place : str
        ``points`` or ``lines``.
    values : (n,) array
        As in the file.
    minimum, maximum : float
        Over finite values, in units of the file; NaN where there are none.
    median_positive : float
        Over finite values above zero.
    positive : int
        Number of finite values above zero.
    named : tuple of str
        Words of ``radius``, ``diameter``, ``area`` in the name.
    """

    name: str
    place: str
    values: npt.NDArray[Any] = field(repr=False)
    minimum: float
    maximum: float
    median_positive: float
    positive: int
    named: tuple[str, ...]

    def describe(self) -> str:
        """Place, range and whatever is odd about the values, for a person."""
        odd = len(self.values) - self.positive
        text = f"on {self.place}, {self.minimum:.4g} to {self.maximum:.4g}"
        if not self.positive:
            return text + ", no value above zero"
        return text + (f", {odd} of {len(self.values)} not above zero" if odd else "")


def _numeric(values: npt.NDArray[Any]) -> bool:
    """Whether values are numbers of one component."""
    return values.dtype.kind in "iuf" and (values.ndim == 1 or (values.ndim == 2 and values.shape[1] == 1))


def _size_array(name: str, place: str, values: npt.NDArray[Any]) -> SizeArray:
    """One array with its range."""
    flat = values.reshape(-1)
    finite = flat[np.isfinite(flat)].astype(np.float64)
    above = finite[finite > 0]
    low, high = (float(finite.min()), float(finite.max())) if finite.size else (math.nan, math.nan)
    middle = float(np.median(above)) if above.size else math.nan
    words = tuple(word for word in _WORDS if word in name.lower())
    return SizeArray(name, place, flat, low, high, middle, len(above), words)


def _all_arrays(contents: FileContents) -> list[tuple[str, str, npt.NDArray[Any]]]:
    """Name, place and values of every array."""
    found = [(name, "points", values) for name, values in contents.point_arrays.items()]
    return found + [(name, "lines", values) for name, values in contents.cell_arrays.items()]


def size_arrays(contents: FileContents) -> tuple[SizeArray, ...]:
    """Return the arrays that may hold sizes.

    The rule: numbers of one component, on points or lines, whose name contains radius,
    diameter or area in any case.

    Parameters
    ----------
    contents : FileContents

    Returns
    -------
    tuple of SizeArray
        In the order of the file, points first.
    """
    return tuple(
        _size_array(name, place, values)
        for name, place, values in _all_arrays(contents)
        if _numeric(values) and any(word in name.lower() for word in _WORDS)
    )


def find_size_array(contents: FileContents, stated: str, key: str) -> tuple[SizeArray, ...]:
    """Return the arrays that a stated name means: one, or two of one name.

    Parameters
    ----------
    contents : FileContents
    stated : str
        Name of the array; `` on points`` or `` on lines`` after it tells two of one name apart.
    key : str
        Key of the case for messages.

    Returns
    -------
    tuple of SizeArray
        Two where both points and lines have an array of this name.

    Raises
    ------
    CaseError
        No array has this name, or it holds no sizes.
    """
    everything = _all_arrays(contents)
    found = [array for array in everything if stated in (array[0], f"{array[0]} on {array[1]}")]
    if not found:
        names = [name for name, _, _ in everything]
        near = get_close_matches(stated, names, n=1)
        hint = f"did you mean '{near[0]}'?" if near else f"it holds {', '.join(names) or 'no arrays'}"
        raise CaseError(f"{key}.size_array = '{stated}': no such array in the file; {hint}")
    usable = tuple(_size_array(*array) for array in found if _numeric(array[2]))
    if not usable:
        shape = found[0][2].shape
        raise CaseError(f"{key}.size_array = '{stated}': must be numbers of one component, not {shape[1:] or 'text'}")
    if not any(array.positive for array in usable):
        raise CaseError(f"{key}.size_array = '{stated}': {usable[0].describe()}{_mirror(contents, usable[0])}")
    return usable


def _mirror(contents: FileContents, array: SizeArray) -> str:
    """Name of the array that this one is the negative of, if there is one."""
    for other in size_arrays(contents):
        if other.place == array.place and np.array_equal(other.values, -array.values) and other.positive:
            return f"; it is the negative of '{other.name}', name that one"
    return "; name another array"
