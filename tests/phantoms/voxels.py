"""The honest way to a rough skeleton: tubes into a mask, the mask thinned, radii by distance map."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.model import Centrelines
from phantoms.truth import Truth, arc

__all__ = ["VoxelPhantom", "mask_of", "voxelised"]

_LARGEST = 160


@dataclass(frozen=True, eq=False)
class VoxelPhantom:
    """A mask of the tubes, its skeleton and distance map; metres.

    Attributes
    ----------
    truth : Truth
    voxel : (3,) array
        Edges of a voxel.
    origin : (3,) array
        Centre of voxel (0, 0, 0).
    mask, skeleton : (i, j, k) bool arrays
    distance : (i, j, k) array
        From each voxel centre to the nearest centre outside.
    """

    truth: Truth
    voxel: np.ndarray
    origin: np.ndarray
    mask: np.ndarray
    skeleton: np.ndarray
    distance: np.ndarray

    def centrelines(self, vessel_class: int | None = None) -> Centrelines:
        """The skeleton's graph of 26 neighbours as lines of two points that share their points.

        Parameters
        ----------
        vessel_class : int, optional
            Of all lines; that of the truth where it has one only, else unknown.
        """
        number, pairs = _neighbours(self.skeleton)
        points = self.origin + np.argwhere(self.skeleton) * self.voxel
        classes = np.unique(self.truth.vessel_class)
        kind = vessel_class if vessel_class is not None else int(classes[0]) if len(classes) == 1 else 0
        return Centrelines(
            points=points,
            radius=self.distance[self.skeleton],
            raw_points=1e3 * points,
            connectivity=pairs.ravel(),
            offsets=2 * np.arange(len(pairs) + 1),
            vessel_class=np.full(len(pairs), kind),
            input_id=np.zeros(len(pairs)),
            radius_basis=np.zeros(number),
        )

    def axis_radius(self) -> Truth:
        """The true tree that carries the distance map's radius of its true axis."""
        from scipy.ndimage import map_coordinates

        at = (self.truth.points - self.origin) / self.voxel
        return self.truth.with_radius(map_coordinates(self.distance, at.T, order=1))

    @property
    def resolution(self) -> float:
        """Smallest diameter of the truth in voxels."""
        return float(2 * self.truth.radius.min() / self.voxel.max())


def voxelised(
    truth: Truth, voxel: float | tuple[float, float, float] = 0.5, seed: int = 0, flat_ends: bool = False
) -> VoxelPhantom:
    """Put a truth into a mask and thin it.

    Parameters
    ----------
    truth : Truth
    voxel : float or three
        Edges of a voxel in mm.
    seed : int
        Draws where the grid lies against the vessels.
    flat_ends : bool
        True: vessels are cut square at their open ends; False: they end in a half ball.

    Raises
    ------
    ValueError
        The mask would be larger than 160 voxels along an axis.
    """
    from scipy.ndimage import distance_transform_edt
    from skimage.morphology import skeletonize

    edges = 1e-3 * np.broadcast_to(np.asarray(voxel, float), 3)
    mask, origin = mask_of(truth, edges, np.random.default_rng([seed, 8]), flat_ends)
    skeleton = skeletonize(mask).astype(np.bool_)
    return VoxelPhantom(truth, edges, origin, mask, skeleton, distance_transform_edt(mask, sampling=edges))


def mask_of(
    truth: Truth, voxel: np.ndarray, rng: np.random.Generator, flat_ends: bool = False
) -> tuple[np.ndarray, np.ndarray]:
    """(mask, origin): voxels whose centre lies in the union of truncated cones with balls between them."""
    margin = truth.radius.max() + 2.5 * voxel
    origin = truth.points.min(axis=0) - margin - rng.uniform(0, 1, 3) * voxel
    shape = np.ceil((truth.points.max(axis=0) + margin - origin) / voxel).astype(int) + 1
    if shape.max() > _LARGEST:
        raise ValueError(f"a mask of {shape.tolist()} voxels; at most {_LARGEST} along an axis")
    mask = np.zeros(shape, np.bool_)
    for segment in range(truth.n_segments):
        rows = truth.rows(segment)
        points, radius = _coarser(truth.points[rows], truth.radius[rows], 0.5 * float(voxel.min()))
        cut = [flat_ends and truth.degree[node] == 1 for node in truth.segments[segment]]
        last = len(points) - 2
        for k in range(last + 1):
            flat = (cut[0] and k == 0, cut[1] and k == last)
            _fill(mask, (points[k : k + 2] - origin) / voxel, radius[k : k + 2], voxel, flat)
    return mask, origin


def _coarser(points: np.ndarray, radius: np.ndarray, step: float) -> tuple[np.ndarray, np.ndarray]:
    """Every so many points of a segment, its ends kept."""
    along = arc(points)
    take = np.unique(np.linspace(0, len(along) - 1, max(2, round(along[-1] / step) + 1)).round().astype(int))
    return points[take], radius[take]


def _fill(mask: np.ndarray, ends: np.ndarray, radius: np.ndarray, voxel: np.ndarray, flat: tuple[bool, bool]) -> None:
    """Fill one cone with a ball at either end (in place), within its own box; ends in voxels, radii in metres."""
    reach = radius.max() / voxel
    low = np.maximum(np.floor(ends.min(axis=0) - reach).astype(int), 0)
    high = np.minimum(np.ceil(ends.max(axis=0) + reach).astype(int) + 1, mask.shape)
    axes = [np.arange(a, b) for a, b in zip(low, high, strict=True)]
    x, y, z = (
        ((axis - ends[0, k]) * voxel[k]).reshape([-1 if i == k else 1 for i in range(3)]) for k, axis in enumerate(axes)
    )
    way = (ends[1] - ends[0]) * voxel
    length = float(way @ way)
    t = (x * way[0] + y * way[1] + z * way[2]) / length if length else 0 * (x + y + z)
    held = np.clip(t, 0.0, 1.0)
    apart = (x - held * way[0]) ** 2 + (y - held * way[1]) ** 2 + (z - held * way[2]) ** 2
    inside = apart <= (radius[0] + held * (radius[1] - radius[0])) ** 2
    if flat[0]:
        inside &= t >= 0
    if flat[1]:
        inside &= t <= 1
    mask[tuple(slice(a, b) for a, b in zip(low, high, strict=True))] |= inside


def _neighbours(skeleton: np.ndarray) -> tuple[int, np.ndarray]:
    """Number of voxels, and (e, 2) numbers of those that touch by face, edge or corner."""
    padded = np.pad(skeleton, 1)
    number = np.cumsum(padded).reshape(padded.shape) - 1
    offsets = [(i, j, k) for i in (-1, 0, 1) for j in (-1, 0, 1) for k in (-1, 0, 1) if (i, j, k) > (0, 0, 0)]
    pairs = []
    for offset in offsets:
        there = np.roll(padded, tuple(-value for value in offset), axis=(0, 1, 2)) & padded
        other = np.roll(number, tuple(-value for value in offset), axis=(0, 1, 2))
        pairs.append(np.column_stack((number[there], other[there])))
    found = np.concatenate(pairs)
    return int(skeleton.sum()), found[np.lexsort((found[:, 1], found[:, 0]))]
