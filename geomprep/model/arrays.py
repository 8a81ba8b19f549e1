"""How the containers hold their arrays: checked once, then read-only."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError

__all__ = ["BoolArray", "FloatArray", "IntArray", "TextArray", "Uint8Array", "frozen", "same_length", "texts"]

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]
Uint8Array = npt.NDArray[np.uint8]
BoolArray = npt.NDArray[np.bool_]
TextArray = npt.NDArray[np.object_]


def frozen(name: str, values: npt.ArrayLike, dtype: npt.DTypeLike, tail: tuple[int, ...] = ()) -> npt.NDArray[Any]:
    r"""Return values as a read-only array of one dtype and trailing shape.

    A view is made where the dtype already fits, so that no copy of large data is taken.

    Parameters
    ----------
    name : str
        Name of the field, for the message.
    values : array_like
        Values of shape (n, \*tail).
    dtype : dtype
        Type of the stored array.
    tail : tuple of int
        Shape after the first axis.

    Raises
    ------
    InputError
        The trailing shape differs.

    Examples
    --------
    >>> frozen("radius", [1, 2], float)
    array([1., 2.])
    """
    array = np.asarray(values, dtype=dtype)
    if array.ndim != 1 + len(tail) or array.shape[1:] != tail:
        raise InputError(f"{name}: shape {array.shape} given, (n, {', '.join(map(str, tail))}) needed")
    view = array.view()
    view.flags.writeable = False
    return view


def texts(name: str, values: Iterable[object]) -> TextArray:
    """Return a read-only object array of Python strings."""
    return frozen(name, np.array([*map(str, values)], dtype=object), object)


def same_length(**arrays: npt.NDArray[Any]) -> int:
    """Return the common length of arrays, or raise naming both lengths."""
    lengths = {name: len(array) for name, array in arrays.items()}
    if len(set(lengths.values())) > 1:
        first, *rest = lengths.items()
        other = next(item for item in rest if item[1] != first[1])
        raise InputError(f"{other[0]} has {other[1]} rows, but {first[0]} has {first[1]}; they must agree")
    return next(iter(lengths.values()), 0)
