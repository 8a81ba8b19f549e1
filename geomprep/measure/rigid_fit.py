"""The rigid motion that lays one set of points upon another, without knowing which point answers to which."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.spatial import KDTree

from geomprep.errors import InputError
from geomprep.model import FloatArray

__all__ = ["RigidFit", "rigid_fit"]

_ROUNDS, _FIRST_ROUNDS, _MOST = 200, 15, 4000
_STILL = 1e-13  # a motion below this part of the size is rounding
_PROPER = ((1.0, 1.0), (1.0, -1.0), (-1.0, 1.0), (-1.0, -1.0))


@dataclass(frozen=True, eq=False)
class RigidFit:
    """A rotation, then a shift: ``points @ rotation.T + shift``.

    Attributes
    ----------
    rotation : (3, 3) float array
    shift : (3,) float array
        m.
    angle : float
        Angle of the rotation, rad.
    distance : float
        Root mean square of the distances that counted, m.
    """

    rotation: FloatArray
    shift: FloatArray
    angle: float
    distance: float

    def moved(self, points: npt.ArrayLike) -> FloatArray:
        """Return points after the motion, (n, 3)."""
        return np.asarray(np.asarray(points, dtype=np.float64) @ self.rotation.T + self.shift, dtype=np.float64)


def rigid_fit(moving: npt.ArrayLike, resting: npt.ArrayLike, counted: float = 0.8) -> RigidFit:
    """Find the rotation and shift that lay moving points upon resting ones.

    Nearest points are taken as answering to one another, from either side, the best rotation for them is
    solved, and so on until nothing moves. Five starts are tried: as given, and the four proper
    ways to lay principal axes upon one another; the one that ends nearest is refined.

    Parameters
    ----------
    moving, resting : (n, 3) and (m, 3) array_like
        m; weights follow from their density, so lay them evenly.
    counted : float
        Part of the pairs of nearest points that count, above 0 to 1: the rest may be new or gone.

    Returns
    -------
    RigidFit

    Raises
    ------
    InputError
        There are fewer than 3 points on a side, or `counted` is out of range.

    References
    ----------
    Besl & McKay 1992, doi:10.1109/34.121791 (nearest points); Arun et al. 1987, doi:10.1109/TPAMI.1987.4767965
    (rotation by singular values); both from memory.

    Examples
    --------
    A quarter turn about z and a shift:

    >>> corner = np.array([[0, 0, 0], [1, 0, 0], [2, 0, 0], [3, 0, 0], [0, 1, 0], [0, 2, 0], [0, 0, 1.0]])
    >>> turned = corner @ np.array([[0, -1, 0], [1, 0, 0], [0, 0, 1.0]]).T + [5, 0, 0]
    >>> found = rigid_fit(turned, corner, counted=1.0)
    >>> f"{np.degrees(found.angle):.3f} {abs(found.moved(turned) - corner).max() < 1e-9}"
    '90.000 True'
    """
    a, b = _thinned(moving), _thinned(resting)
    if min(len(a), len(b)) < 3:
        raise InputError(f"{min(len(a), len(b))} point(s) on one side: a rigid fit needs 3 or more; leave it out")
    if not 0 < counted <= 1:
        raise InputError(f"counted = {counted}: a part of the pairs above 0, up to 1, is needed")
    tree = KDTree(b)
    ends = [_settled(a, b, tree, start, counted, _FIRST_ROUNDS) for start in _starts(a, b)]
    rotation, shift, _ = min(ends, key=lambda end: end[2])
    rotation, shift, distance = _settled(a, b, tree, (rotation, shift), counted, _ROUNDS)
    return RigidFit(rotation, shift, _angle(rotation), distance)


def _thinned(points: npt.ArrayLike) -> FloatArray:
    """At most some thousand of the points, evenly."""
    every = np.asarray(points, dtype=np.float64).reshape(-1, 3)
    if len(every) <= _MOST:
        return every
    return every[np.linspace(0, len(every) - 1, _MOST).astype(np.int64)]


def _starts(a: FloatArray, b: FloatArray) -> list[tuple[FloatArray, FloatArray]]:
    """As given, and centre upon centre with principal axes upon principal axes."""
    centre_a, centre_b = a.mean(axis=0), b.mean(axis=0)
    axes_a = np.linalg.eigh(np.cov((a - centre_a).T))[1]
    axes_b = np.linalg.eigh(np.cov((b - centre_b).T))[1]
    found = [(np.eye(3), np.zeros(3))]
    for first, second in _PROPER:
        sign = np.array([first, second, 1.0])
        sign[2] = np.linalg.det(axes_b) * np.linalg.det(axes_a) * first * second  # no mirror image
        rotation = (axes_b * np.sign(sign)) @ axes_a.T
        found.append((rotation, centre_b - rotation @ centre_a))
    return found


def _settled(
    a: FloatArray, b: FloatArray, tree: KDTree, start: tuple[FloatArray, FloatArray], counted: float, rounds: int
) -> tuple[FloatArray, FloatArray, float]:
    """Motion after rounds of nearest points and best rotation, and the distance left."""
    rotation, shift = start
    size = float(np.linalg.norm(np.ptp(b, axis=0))) or 1.0
    for _ in range(rounds):
        source, target, _ = _pairs(a, b, tree, rotation, shift, counted)
        turned, moved = _best_motion(source, target)
        change = max(float(np.abs(turned - rotation).max()) * size, float(np.abs(moved - shift).max()))
        rotation, shift = turned, moved
        if change <= _STILL * size:
            break
    return rotation, shift, _pairs(a, b, tree, rotation, shift, counted)[2]


def _pairs(
    a: FloatArray, b: FloatArray, tree: KDTree, rotation: FloatArray, shift: FloatArray, counted: float
) -> tuple[FloatArray, FloatArray, float]:
    """Nearest points from both sides, the nearest part of them, and their root mean square distance."""
    moved = a @ rotation.T + shift
    far, near = tree.query(moved)
    back, nearest = KDTree(moved).query(b)
    distance = np.concatenate((far, back))
    source, target = np.concatenate((a, a[nearest])), np.concatenate((b[near], b))
    kept = distance <= np.quantile(distance, counted)
    return source[kept], target[kept], float(np.sqrt(np.mean(distance[kept] ** 2)))


def _best_motion(source: FloatArray, target: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Rotation and shift of least squares for points that answer to one another."""
    from_centre, to_centre = source.mean(axis=0), target.mean(axis=0)
    left, _, right = np.linalg.svd((target - to_centre).T @ (source - from_centre))
    sign = np.array([1.0, 1.0, np.sign(np.linalg.det(left @ right)) or 1.0])
    rotation = (left * sign) @ right
    return rotation, to_centre - rotation @ from_centre


def _angle(rotation: FloatArray) -> float:
    """Angle of a rotation; from sine and cosine, so that small angles keep their digits."""
    twice_sine = np.linalg.norm(
        [rotation[2, 1] - rotation[1, 2], rotation[0, 2] - rotation[2, 0], rotation[1, 0] - rotation[0, 1]]
    )
    return float(np.arctan2(twice_sine, np.trace(rotation) - 1.0))
