"""Raw lines drawn along a truth, what was done to them, and the answer to each defect."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise
from typing import Any

import numpy as np

from geomprep.model import Centrelines
from phantoms.truth import Truth, arc

__all__ = ["Defect", "Spoiled", "Spoiler", "compacted", "drawn", "spoil"]


@dataclass(frozen=True, eq=False)
class Defect:
    """One planted fault.

    Attributes
    ----------
    kind : str
        ``gap``, ``spur``, ``copy``, ``kissing``, ``clique``, ``hole``, ``radius``, ``jagged`` or ``stray``.
    place : (3,) array
        Its middle in metres; NaN for what is everywhere.
    reach : float
        Radius of the ball about its place within which lines were changed, in metres.
    raw : tuple of int
        Raw points, in the order that the spoiler says.
    answer : str
        What is right: ``bridge``, ``drop``, ``fuse``, ``part``, ``collapse``, ``fill``,
        ``interpolate``, ``smooth``, ``report`` or ``ask``.
    facts : dict
        Numbers of the fault, as the spoiler says.
    """

    kind: str
    place: np.ndarray
    reach: float
    raw: tuple[int, ...]
    answer: str
    facts: dict[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, eq=False)
class Spoiled:
    """Raw lines, the truth under every point of them, and the defects planted so far; metres.

    Attributes
    ----------
    truth : Truth
    points : (n, 3) array
    radius : (n,) array
    lines : tuple of int arrays
        Numbers of the points along each line.
    line_segment : (m,) array
        Segment of the truth that a line draws, −1 for a false one.
    line_class : (m,) array
    segment : (n,) array
        Segment that each point lies on, −1 for a false point.
    along : (n,) array
        Distance from the start of that segment; NaN for a false point.
    true_points, true_radius : arrays
        Before noise, displacement and faults; NaN for a false point.
    defects : tuple of Defect
    """

    truth: Truth
    points: np.ndarray
    radius: np.ndarray
    lines: tuple[np.ndarray, ...]
    line_segment: np.ndarray
    line_class: np.ndarray
    segment: np.ndarray
    along: np.ndarray
    true_points: np.ndarray
    true_radius: np.ndarray
    defects: tuple[Defect, ...] = ()

    def of_kind(self, kind: str) -> tuple[Defect, ...]:
        """Defects of one kind."""
        return tuple(defect for defect in self.defects if defect.kind == kind)

    def centrelines(self, classes: bool = True) -> Centrelines:
        """The lines as the package takes them: raw coordinates in millimetres, the rest in SI.

        Parameters
        ----------
        classes : bool
            False: the file does not say what is artery and what is vein.
        """
        return Centrelines(
            points=self.points,
            radius=self.radius,
            raw_points=1e3 * self.points,
            connectivity=np.concatenate(self.lines),
            offsets=np.concatenate(([0], np.cumsum([len(line) for line in self.lines]))),
            vessel_class=self.line_class if classes else np.zeros(len(self.lines)),
            input_id=np.zeros(len(self.lines)),
            radius_basis=np.zeros(len(self.points)),
        )

    def clear(self, place: np.ndarray, reach: float) -> bool:
        """Whether a ball keeps off all defects planted so far."""
        return all(
            not np.isfinite(defect.place).all() or np.linalg.norm(defect.place - place) > defect.reach + reach
            for defect in self.defects
        )

    def with_points(self, points: np.ndarray, radius: np.ndarray) -> tuple[Spoiled, np.ndarray]:
        """Add false points; return the lines and the numbers of the new points."""
        count = len(points)
        nothing = np.full(count, np.nan)
        grown = replace(
            self,
            points=np.vstack((self.points, points)),
            radius=np.append(self.radius, np.broadcast_to(radius, count)),
            segment=np.append(self.segment, np.full(count, -1)),
            along=np.append(self.along, nothing),
            true_points=np.vstack((self.true_points, np.full((count, 3), np.nan))),
            true_radius=np.append(self.true_radius, nothing),
        )
        return grown, np.arange(len(self.points), len(grown.points))

    def with_copies(self, numbers: np.ndarray) -> tuple[Spoiled, np.ndarray]:
        """Add second copies of points, truth and all; return the lines and the numbers of the copies."""
        names = ("points", "radius", "segment", "along", "true_points", "true_radius")
        grown = replace(
            self, **{name: np.concatenate((getattr(self, name), getattr(self, name)[numbers])) for name in names}
        )
        return grown, np.arange(len(self.points), len(grown.points))

    def with_lines(
        self, lines: Sequence[np.ndarray], segment: int, vessel_class: int, instead_of: int | None = None
    ) -> Spoiled:
        """Add lines of one segment, in place of another line where one is named."""
        kept = [i for i in range(len(self.lines)) if i != instead_of]
        return replace(
            self,
            lines=(*(self.lines[i] for i in kept), *(np.asarray(line, np.int64) for line in lines)),
            line_segment=np.append(self.line_segment[kept], np.full(len(lines), segment)),
            line_class=np.append(self.line_class[kept], np.full(len(lines), vessel_class)).astype(np.uint8),
        )

    def with_defect(self, defect: Defect) -> Spoiled:
        """Add a label."""
        return replace(self, defects=(*self.defects, defect))

    def open_points(self) -> np.ndarray:
        """Points at line ends whose place no other line passes."""
        _, place = np.unique(self.points, axis=0, return_inverse=True)
        ends = np.concatenate([line[[0, -1]] for line in self.lines])
        used = np.concatenate([np.repeat(line, 2)[1:-1] for line in self.lines])
        uses = np.bincount(place.ravel()[used], minlength=len(self.points))
        return ends[uses[place.ravel()[ends]] == 1]


Spoiler = Callable[[Spoiled, np.random.Generator], Spoiled]
"""Takes lines and a random generator, gives lines with more defects and their labels."""


def drawn(truth: Truth, spacing: float = 0.5, style: str = "segments") -> Spoiled:
    """Draw clean lines along a truth.

    Parameters
    ----------
    truth : Truth
    spacing : float
        Distance between points in parts of the local mean radius, but 0.3 to 1.5 mm.
    style : str
        ``segments``: one line per segment, each with its own copies of its ends.
        ``routes``: one line from the root of a part to each of its other open ends, so that
        trunks are drawn many times over at the same points (trees only).
    """
    if style == "routes":
        return _routes(drawn(truth, spacing))
    if style != "segments":
        raise ValueError(f"style {style!r}: use segments or routes")
    points, radius, along, counts = [], [], [], []
    for segment in range(truth.n_segments):
        rows = truth.rows(segment)
        distance = arc(truth.points[rows])
        step = float(np.clip(spacing * truth.radius[rows].mean(), 0.3e-3, 1.5e-3))
        at = np.linspace(0, distance[-1], max(4, round(distance[-1] / step)) + 1)
        points.append(np.column_stack([np.interp(at, distance, truth.points[rows, axis]) for axis in range(3)]))
        points[-1][[0, -1]] = truth.nodes[truth.segments[segment]]
        radius.append(np.interp(at, distance, truth.radius[rows]))
        along.append(at)
        counts.append(len(at))
    starts = np.concatenate(([0], np.cumsum(counts)))
    places, sizes = np.concatenate(points), np.concatenate(radius)
    return Spoiled(
        truth=truth,
        points=places,
        radius=sizes,
        lines=tuple(np.arange(a, b) for a, b in pairwise(starts)),
        line_segment=np.arange(truth.n_segments),
        line_class=truth.vessel_class.copy(),
        segment=np.repeat(np.arange(truth.n_segments), counts),
        along=np.concatenate(along),
        true_points=places,
        true_radius=sizes,
    )


def _routes(lines: Spoiled) -> Spoiled:
    """The same points, drawn as one line from each root to each other open end of its part."""
    import networkx as nx

    truth = lines.truth
    if truth.loops:
        raise ValueError("routes are drawn along trees only")
    net = nx.Graph([(int(a), int(b), {"row": i}) for i, (a, b) in enumerate(truth.segments)])
    routes, classes = [], []
    for root in truth.roots:
        for end in sorted(set(truth.open_ends[truth.part[truth.open_ends] == truth.part[root]]) - {root}):
            path = nx.shortest_path(net, root, int(end))
            rows = [net.edges[pair]["row"] for pair in pairwise(path)]
            routes.append(np.concatenate([lines.lines[row][int(k > 0) :] for k, row in enumerate(rows)]))
            classes.append(truth.vessel_class[rows[0]])
    out, numbers = lines.with_copies(np.concatenate(routes))
    cuts = np.cumsum([len(route) for route in routes])[:-1]
    return compacted(
        replace(
            out,
            lines=tuple(np.split(numbers, cuts)),
            line_segment=np.full(len(routes), -1),
            line_class=np.array(classes, np.uint8),
        )
    )


def compacted(lines: Spoiled) -> Spoiled:
    """Leave out points that no line uses; labels follow."""
    used = np.zeros(len(lines.points), np.bool_)
    used[np.concatenate(lines.lines)] = True
    number = np.cumsum(used) - 1
    names = ("points", "radius", "segment", "along", "true_points", "true_radius")
    return replace(
        lines,
        **{name: getattr(lines, name)[used] for name in names},
        lines=tuple(number[line] for line in lines.lines),
        defects=tuple(
            replace(defect, raw=tuple(int(number[raw]) for raw in defect.raw if used[raw])) for defect in lines.defects
        ),
    )


def spoil(lines: Spoiled, seed: int, *spoilers: Spoiler) -> Spoiled:
    """Apply spoilers one after another, each with a generator of its own, and leave out unused points.

    Structure first (gaps, spurs, copies …), then radii, then noise: a later spoiler keeps off
    the places of earlier ones, and noise moves copies at one place together.
    """
    for number, spoiler in enumerate(spoilers):
        lines = spoiler(lines, np.random.default_rng([seed, number, 7]))
    return compacted(lines)
