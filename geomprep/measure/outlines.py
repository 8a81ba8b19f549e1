"""Curves in cutting planes: put in order, measured, and looked at for what may be wrong with them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.curves import line_sums, pieces
from geomprep.model import BoolArray, FloatArray, IntArray, chains, degrees

__all__ = ["Outlines", "crosses_itself", "dents", "holds", "outlines"]

_FLAT = 1e-12  # part of perimeter² below which an outline has no area


@dataclass(frozen=True, eq=False)
class Outlines:
    """Curves of many planes, each seen from a place at the origin of its plane.

    Attributes
    ----------
    points : (k, 2) float array
        Along all curves; a closed one repeats its first point. Curve i owns rows ``offsets[i]:offsets[i + 1]``.
    offsets : (c + 1,) int array
    edge : (k - c,) int array
        Edge, as given, between consecutive points.
    plane : (c,) int array
    closed : (c,) bool array
        Closed and without a branching.
    winding, turned_back : (c,) float array
        Angle by which the curve goes round the place, without sign, and by how much of it it goes back
        and forth, rad.
    area, perimeter, polar_moment : (c,) float array
        Of the polygon; the moment is that about the centre of area. Meaningful where closed.
    centre : (c, 2) float array
        Centre of area; the place itself where there is no area.
    pinched : (p,) int array
        Planes in which curves branch, one entry per branching.
    """

    points: FloatArray
    offsets: IntArray
    edge: IntArray
    plane: IntArray
    closed: BoolArray
    winding: FloatArray
    turned_back: FloatArray
    area: FloatArray
    perimeter: FloatArray
    polar_moment: FloatArray
    centre: FloatArray
    pinched: IntArray

    def curve(self, i: int) -> FloatArray:
        """Points of one curve."""
        return self.points[self.offsets[i] : self.offsets[i + 1]]


def outlines(points: FloatArray, edges: IntArray, plane: IntArray) -> Outlines:
    """Join edges to curves and measure them.

    Parameters
    ----------
    points : (n, 2) float array
        In the plane's own axes, the place that curves are seen from at the origin, m.
    edges : (e, 2) int array
    plane : (n,) int array
        Plane of each point; edges join points of one plane.

    Returns
    -------
    Outlines

    Notes
    -----
    With cross products ``c = x y' − x' y`` of consecutive points: area Σc/2, centre Σ(p + p')c/(6·area), polar
    moment about the origin Σc(p² + p·p' + p'²)/12 (Green's theorem).

    Examples
    --------
    >>> square = np.array([[1.0, 1], [-1, 1], [-1, -1], [1, -1]])
    >>> found = outlines(square, np.array([[0, 1], [2, 1], [2, 3], [3, 0]]), np.zeros(4, np.int64))
    >>> found.closed, found.area, found.perimeter, found.polar_moment.round(4)
    (array([ True]), array([4.]), array([8.]), array([2.6667]))
    >>> outlines(np.empty((0, 2)), np.empty((0, 2), np.int64), np.empty(0, np.int64)).closed
    array([], dtype=bool)
    """
    found = chains(len(points), edges)
    place = points[found.point]
    piece = pieces(found.offsets) if found.n_chains else None
    first = piece.first if piece is not None else np.empty(0, np.int64)
    starts = piece.starts if piece is not None else np.empty(0, np.int64)
    near, far = place[first], place[first + 1]
    cross = near[:, 0] * far[:, 1] - near[:, 1] * far[:, 0]
    turn = np.arctan2(cross, np.einsum("ij,ij->i", near, far))
    signed, winding = line_sums(cross, starts) / 2, line_sums(turn, starts)
    perimeter = line_sums(np.linalg.norm(far - near, axis=1), starts)
    whole = np.abs(signed) > _FLAT * perimeter**2
    divisor = np.where(whole, signed, 1.0)
    centre = line_sums((near + far) * cross[:, None], starts) / (6 * divisor[:, None]) * whole[:, None]
    square = (near * near + near * far + far * far).sum(axis=1)
    moment = np.sign(signed) * line_sums(cross * square, starts) / 12
    return Outlines(
        points=place,
        offsets=found.offsets,
        edge=found.edge,
        plane=plane[found.point[found.offsets[:-1]]],
        closed=found.ring & whole,
        winding=np.abs(winding),
        turned_back=0.5 * (line_sums(np.abs(turn), starts) - np.abs(winding)),
        area=np.abs(signed),
        perimeter=perimeter,
        polar_moment=moment - np.abs(signed) * (centre**2).sum(axis=1),
        centre=centre,
        pinched=plane[degrees(len(points), edges) > 2],
    )


def dents(found: Outlines, chosen: IntArray) -> FloatArray:
    """Return how far some closed curves dip below their convex hulls at most, m.

    Parameters
    ----------
    found : Outlines
    chosen : (r,) int array
        Curves with an area.

    Examples
    --------
    >>> notched = np.array([[1.0, 1], [0, 0.5], [-1, 1], [-1, -1], [1, -1]])
    >>> found = outlines(notched, np.array([[0, 1], [1, 2], [2, 3], [3, 4], [4, 0]]), np.zeros(5, np.int64))
    >>> dents(found, np.array([0]))
    array([0.5])
    """
    from scipy.spatial import ConvexHull

    def deepest(outline: FloatArray) -> float:
        """Largest distance of a corner from the nearest side of the hull."""
        sides = ConvexHull(outline).equations
        return float(-(outline @ sides[:, :2].T + sides[:, 2]).max(axis=1).min())

    return np.array([deepest(found.curve(i)) for i in chosen.tolist()], dtype=np.float64)


def holds(outline: FloatArray, places: FloatArray) -> BoolArray:
    """Tell which places lie inside a closed outline, by the parity of crossings.

    Parameters
    ----------
    outline : (k, 2) float array
        Its first point repeated at the end.
    places : (q, 2) float array

    Examples
    --------
    >>> square = np.array([[0.0, 0], [1, 0], [1, 1], [0, 1], [0, 0]])
    >>> holds(square, np.array([[0.5, 0.5], [1.5, 0.5]]))
    array([ True, False])
    """
    x, y = places[:, :1], places[:, 1:]
    near, far = outline[:-1], outline[1:]
    rise = far[:, 1] - near[:, 1]
    spans = (near[:, 1] > y) != (far[:, 1] > y)
    at = near[:, 0] + (y - near[:, 1]) * (far[:, 0] - near[:, 0]) / np.where(rise != 0, rise, 1.0)
    return np.asarray((spans & (at > x)).sum(axis=1) % 2 == 1)


def crosses_itself(outline: FloatArray) -> bool:
    """Tell whether any two pieces of a closed outline properly cross.

    Parameters
    ----------
    outline : (k, 2) float array
        Its first point repeated at the end.

    Examples
    --------
    >>> crosses_itself(np.array([[0.0, 0], [1, 1], [1, 0], [0, 1], [0, 0]]))
    True
    """
    near, far = outline[:-1], outline[1:]
    along = far - near

    def side(points: FloatArray) -> FloatArray:
        """On which side of every piece each point lies."""
        away = points[None] - near[:, None]
        return np.asarray(along[:, None, 0] * away[..., 1] - along[:, None, 1] * away[..., 0])

    apart = side(near) * side(far) < 0
    return bool((apart & apart.T).any())
