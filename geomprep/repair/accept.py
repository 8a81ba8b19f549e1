"""What joining refuses: sizes and lines that mean nothing."""

from __future__ import annotations

import numpy as np

from geomprep.errors import InputError
from geomprep.model import BoolArray, Centrelines, FloatArray, IntArray

__all__ = ["refuse_unusable"]

_SHOWN = 5


def refuse_unusable(centrelines: Centrelines) -> BoolArray:
    """Refuse lines, radii and positions that cannot be used; return which points lines use.

    Raises
    ------
    InputError
        There is no line; a line has fewer than two points; a used point has a position
        that is not finite or a radius that is zero, negative or not a finite number.

    Examples
    --------
    >>> import numpy as np
    >>> line = Centrelines(np.eye(3)[:2], [1e-3, 0.0], np.eye(3)[:2], [0, 1], [0, 2], [1], [0], [0, 0])
    >>> refuse_unusable(line)
    Traceback (most recent call last):
    geomprep.errors.InputError: the radius of 1 of 2 points is not above zero: point 1 (0 m); ...
    """
    counts = np.diff(centrelines.offsets)
    if len(counts) == 0:
        raise InputError("there are no lines; a network needs at least one line of two points")
    short = np.flatnonzero(counts < 2)
    if len(short):
        raise InputError(
            f"{len(short)} of {len(counts)} lines have fewer than 2 points: {_listed('line', short, counts[short])}; "
            "a line needs 2 points; remove these lines from the file"
        )
    used = np.zeros(centrelines.n_points, np.bool_)
    used[centrelines.connectivity] = True
    _refuse_places(centrelines.points, used)
    _refuse_radii("point", centrelines.radius, used)
    if centrelines.line_radius is not None:
        # inputs without sizes on lines hold NaN for all of theirs
        given = np.zeros(256, np.bool_)
        given[centrelines.input_id[~np.isnan(centrelines.line_radius)]] = True
        _refuse_radii("line", centrelines.line_radius, given[centrelines.input_id])
    return used


def _refuse_places(points: FloatArray, used: BoolArray) -> None:
    """Refuse used points whose coordinates are not finite."""
    if np.isfinite(points).all():
        return
    bad = np.flatnonzero(used & ~np.isfinite(points).all(axis=1))
    if len(bad):
        first = ", ".join(f"point {point}" for point in bad[:_SHOWN])
        raise InputError(f"{len(bad)} of {used.sum()} points have coordinates that are not finite: {first}")


def _refuse_radii(what: str, radius: FloatArray, used: BoolArray) -> None:
    """Refuse used radii that are not finite and above zero."""
    bad = np.flatnonzero(used & ~((radius > 0) & (radius < np.inf)))
    if len(bad):
        raise InputError(
            f"the radius of {len(bad)} of {used.sum()} {what}s is not above zero: "
            f"{_listed(what, bad, radius[bad], ' m')}; every radius must be a finite number above 0 m; "
            "correct the size array in the file, or name another one in the case"
        )


def _listed(what: str, which: IntArray, values: FloatArray | IntArray, unit: str = "") -> str:
    """The first few of a list of bad things with their values."""
    shown = ", ".join(
        f"{what} {number} ({value:g}{unit})" for number, value in zip(which[:_SHOWN], values[:_SHOWN], strict=True)
    )
    return shown if len(which) <= _SHOWN else f"{shown} …"
