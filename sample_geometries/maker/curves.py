"""Smooth curves through way points: the analytic description of every sample vessel."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import numpy.typing as npt

__all__ = ["Floats", "SplineCurve"]

Floats = npt.NDArray[np.float64]

_SUBSTEPS = 400  # length by the trapezium rule on this many pieces per way point: error below 1e-6 of it


class SplineCurve:
    """A natural cubic spline through way points, with a radius that never overshoots.

    The parameter is the centripetal chord length, which keeps the curve free of loops
    where way points are unevenly spaced. The radius runs along the true arc length through
    the radii at the way points (monotone cubic: Fritsch and Carlson 1980,
    doi:10.1137/0717021), so a taper stays a taper.

    Parameters
    ----------
    way_points : (k, 3) array
        Places the curve passes through, k >= 2.
    radii : (k,) array
        Radius at each way point.
    """

    def __init__(self, way_points: npt.ArrayLike, radii: npt.ArrayLike) -> None:
        points = np.asarray(way_points, dtype=np.float64)
        self._knots = np.concatenate(([0.0], np.cumsum(np.sqrt(np.linalg.norm(np.diff(points, axis=0), axis=1)))))
        self._points = points
        self._curvature = _natural_spline(self._knots, points)
        pieces = [np.linspace(a, b, _SUBSTEPS, endpoint=False) for a, b in pairwise(self._knots)]
        self._fine = np.append(np.concatenate(pieces), self._knots[-1])
        speed = np.linalg.norm(self._evaluate(self._fine, derivative=True), axis=1)
        steps = np.diff(self._fine) * (speed[1:] + speed[:-1]) / 2
        self._arc = np.concatenate(([0.0], np.cumsum(steps)))
        self.way_distance = self._arc[::_SUBSTEPS]
        self._radii = np.asarray(radii, dtype=np.float64)
        self._slopes = _monotone_slopes(self.way_distance, self._radii)

    @property
    def length(self) -> float:
        """Arc length of the whole curve."""
        return float(self._arc[-1])

    def position(self, distance: npt.ArrayLike) -> Floats:
        """(n, 3) places at (n,) arc lengths from the start."""
        return self._evaluate(np.interp(np.atleast_1d(distance), self._arc, self._fine))

    def radius(self, distance: npt.ArrayLike) -> Floats:
        """(n,) radii at (n,) arc lengths from the start."""
        at = np.clip(np.atleast_1d(distance), 0.0, self.length)
        piece = np.clip(np.searchsorted(self.way_distance, at, side="right") - 1, 0, len(self._radii) - 2)
        width = np.diff(self.way_distance)[piece]
        t = (at - self.way_distance[piece]) / width
        value = self._radii[piece] * (1 + 2 * t) * (1 - t) ** 2 + self._radii[piece + 1] * t**2 * (3 - 2 * t)
        return value + width * t * (1 - t) * (self._slopes[piece] * (1 - t) - self._slopes[piece + 1] * t)

    def _evaluate(self, parameter: Floats, derivative: bool = False) -> Floats:
        """(n, 3) spline values, or derivatives by the parameter."""
        piece = np.clip(np.searchsorted(self._knots, parameter, side="right") - 1, 0, len(self._knots) - 2)
        width = np.diff(self._knots)[piece][:, None]
        right = (parameter - self._knots[piece])[:, None] / width
        left = 1 - right
        start, end = self._points[piece], self._points[piece + 1]
        bend0, bend1 = self._curvature[piece], self._curvature[piece + 1]
        if derivative:
            return (end - start) / width + width / 6 * ((1 - 3 * left**2) * bend0 + (3 * right**2 - 1) * bend1)
        return left * start + right * end + width**2 / 6 * ((left**3 - left) * bend0 + (right**3 - right) * bend1)


def _natural_spline(knots: Floats, values: Floats) -> Floats:
    """(k, 3) second derivatives of the natural cubic spline through values at knots."""
    second = np.zeros_like(values)
    if len(knots) < 3:
        return second
    width = np.diff(knots)
    matrix = np.diag((width[:-1] + width[1:]) / 3)
    matrix += np.diag(width[1:-1] / 6, 1) + np.diag(width[1:-1] / 6, -1)
    slope = np.diff(values, axis=0) / width[:, None]
    second[1:-1] = np.linalg.solve(matrix, np.diff(slope, axis=0))
    return second


def _monotone_slopes(x: Floats, y: Floats) -> Floats:
    """(k,) slopes of the monotone cubic through y at x (harmonic mean of the neighbours)."""
    slope = np.diff(y) / np.diff(x)
    if len(slope) == 1:
        return np.repeat(slope, 2)
    before, after = slope[:-1], slope[1:]
    same = before * after > 0
    total = np.where(same, before + after, 1.0)
    middle = np.where(same, 2 * before * after / total, 0.0)
    return np.concatenate((slope[:1], middle, slope[-1:]))
