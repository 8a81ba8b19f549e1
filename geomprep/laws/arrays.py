"""Array types of the formulas, and the one check they share."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError

__all__ = ["FloatArray", "positive"]

FloatArray = npt.NDArray[np.float64]


def positive(name: str, values: npt.ArrayLike) -> FloatArray:
    """Return values as floats, or raise naming the first that is not finite and above zero.

    Parameters
    ----------
    name : str
        What the values are, for the message.
    values : array_like
        Values of any shape.

    Raises
    ------
    InputError
        A value is zero, negative, infinite or not a number.

    Examples
    --------
    >>> positive("area", [1, 2])
    array([1., 2.])
    >>> positive("area", [1, 0])
    Traceback (most recent call last):
    geomprep.errors.InputError: area = 0 (number 1 of 0…1): it must be finite and above zero
    """
    array = np.asarray(values, dtype=np.float64)
    bad = ~(np.isfinite(array) & (array > 0))
    if bad.any():
        first = int(np.argmax(bad.ravel()))
        raise InputError(
            f"{name} = {array.ravel()[first]:g} (number {first} of 0…{array.size - 1}): "
            "it must be finite and above zero"
        )
    return array
