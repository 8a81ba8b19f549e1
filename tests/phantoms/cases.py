"""Phantoms by kind and seed. Seeds 0 to 999 are for tuning, 10000 and above for reporting."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from geomprep.model import Centrelines
from phantoms import spoil_gaps, spoil_kissing, spoil_shape, spoil_values
from phantoms.lines import Spoiled, Spoiler, drawn, spoil
from phantoms.pairs import paired_trees
from phantoms.rings import ring
from phantoms.trees import Growth, crossing_vessels, murray_tree
from phantoms.truth import ARTERY, Truth
from phantoms.veins import venous_outflow
from phantoms.voxels import VoxelPhantom, voxelised

__all__ = ["KINDS", "Case", "cases"]


@dataclass(frozen=True, eq=False)
class Case:
    """One phantom of one kind.

    Attributes
    ----------
    kind : str
    seed : int
    truth : Truth
    spoiled : Spoiled or None
        Lines and labels; no labels in clean kinds; None for voxel kinds.
    voxels : VoxelPhantom or None
    """

    kind: str
    seed: int
    truth: Truth
    spoiled: Spoiled | None = None
    voxels: VoxelPhantom | None = None

    @property
    def centrelines(self) -> Centrelines:
        """The raw lines with their classes."""
        return self.spoiled.centrelines() if self.spoiled is not None else self.voxels.centrelines()


def cases(kind: str, first_seed: int, n: int) -> Iterator[Case]:
    """Make n phantoms of one kind from a first seed on, one at a time.

    Parameters
    ----------
    kind : str
        One of :data:`KINDS`.
    first_seed : int
        0 to 999 for tuning, 10000 and above for reporting.
    n : int

    Raises
    ------
    ValueError
        The kind is not known, or a seed belongs to neither set.

    Examples
    --------
    >>> [(case.kind, case.seed, case.truth.loops) for case in cases("clean tree", 3, 2)]
    [('clean tree', 3, 0), ('clean tree', 4, 0)]
    >>> next(cases("clean tree", 5000, 1))
    Traceback (most recent call last):
    ValueError: seeds 5000 to 5000: use 0 to 999 for tuning, 10000 and above for reporting
    """
    last = first_seed + n - 1
    if not (first_seed >= 0 and last <= 999) and first_seed < 10_000:
        raise ValueError(f"seeds {first_seed} to {last}: use 0 to 999 for tuning, 10000 and above for reporting")
    if kind not in KINDS:
        raise ValueError(f"kind {kind!r}: one of {', '.join(KINDS)}")
    for seed in range(first_seed, last + 1):
        yield KINDS[kind](kind, seed)


def _truth(seed: int, of: tuple[str, ...] = ("tree", "ring", "pair", "veins")) -> Truth:
    """A truth; the sort goes round with the seed."""
    return TRUTHS[of[seed % len(of)]](seed)


def _like_vessels(seed: int) -> Truth:
    """Two trees of one class side by side."""
    return paired_trees(seed, classes=(ARTERY, ARTERY))


def _arteries_crossing(seed: int) -> Truth:
    """A tree and passing vessels, all of one class."""
    return crossing_vessels(seed, classes=(ARTERY,))


TRUTHS: dict[str, Callable[[int], Truth]] = {
    "tree": murray_tree,
    "ring": ring,
    "pair": paired_trees,
    "veins": venous_outflow,
    "crossing": crossing_vessels,
    "like vessels": _like_vessels,
    "arteries crossing": _arteries_crossing,
}


def _lines(kind: str, seed: int, of: tuple[str, ...], spoilers: tuple[Spoiler, ...], style: str = "segments") -> Case:
    """A case of planted defects."""
    truth = _truth(seed, of)
    return Case(kind, seed, truth, spoil(drawn(truth, style=style), seed, *spoilers))


def _voxels(kind: str, seed: int, of: str, resolution: float) -> Case:
    """A case of voxels: the voxel is so many times smaller than the smallest diameter."""
    rng = np.random.default_rng([seed, 9])
    voxel = rng.uniform(*{"ring": (0.36, 0.42), "veins": (0.75, 0.8)}.get(of, (0.3, 0.7)))
    smallest = resolution * voxel / 2 * rng.uniform(1.0, 1.2)
    truth = _small(of, seed, voxel, smallest)
    return Case(kind, seed, truth, voxels=voxelised(truth, voxel, seed))


def _small(of: str, seed: int, voxel: float, smallest: float) -> Truth:
    """A truth that fits into 160 voxels along each axis, with room between its tubes; the first seed that does."""
    for attempt in range(60):
        try:
            truth = _of_size(of, seed + 1_000_000 * attempt, voxel, smallest)
        except (ValueError, RuntimeError):  # no room for it at this size
            continue
        if np.ptp(truth.points, axis=0).max() + 2 * truth.radius.max() < 153e-3 * voxel:
            return truth
    raise RuntimeError(f"seed {seed}: no {of} fits into 160 voxels of {voxel:g} mm in 60 attempts")


def _of_size(of: str, seed: int, voxel: float, smallest: float) -> Truth:
    """A truth whose vessels are no thinner than a radius in mm."""
    rules = Growth(smallest=smallest, depth=3, gap=2.5 * voxel, hole=2.0 * voxel, length=(7.0, 11.0))
    if of == "tree":
        return murray_tree(seed, smallest * np.random.default_rng(seed).uniform(1.9, 2.8), rules)
    if of == "ring":
        return ring(seed, replace(rules, depth=1, length=(6.0, 8.0)), fenestrations=seed % 2)
    if of == "pair":
        return paired_trees(seed, replace(rules, depth=2, length=(8.0, 11.0)), root_radius=2.0 * smallest)
    return venous_outflow(seed, smallest, size=0.58, gap=rules.gap)


_ARTERIES = ("tree", "ring", "like vessels")
_ALL = ("tree", "ring", "pair", "veins")
_GAPS = (
    partial(spoil_gaps.slab_gaps, strength=6.0, count=1),
    partial(spoil_gaps.gaps, strength=6.0, count=3),
)
_STRUCTURE = (
    partial(spoil_gaps.gaps, strength=6.0, count=2),
    partial(spoil_kissing.kissing, count=1),
    spoil_shape.spurs,
    spoil_shape.copies,
    partial(spoil_shape.cliques, count=1),
    spoil_shape.stray_parts,
)

KINDS: dict[str, Callable[[str, int], Case]] = {
    "clean": partial(_lines, of=_ALL, spoilers=()),
    "clean tree": partial(_lines, of=("tree",), spoilers=()),
    "clean ring": partial(_lines, of=("ring",), spoilers=()),
    "clean pair": partial(_lines, of=("pair",), spoilers=()),
    "clean veins": partial(_lines, of=("veins",), spoilers=()),
    "clean crossing": partial(_lines, of=("crossing",), spoilers=()),
    "routes": partial(_lines, of=("tree", "pair"), spoilers=(), style="routes"),
    "gaps": partial(_lines, of=_ARTERIES, spoilers=_GAPS),
    "long gaps": partial(_lines, of=_ARTERIES, spoilers=(partial(spoil_gaps.gaps, strength=10.0, count=4),)),
    "gaps in veins": partial(_lines, of=("veins",), spoilers=(partial(spoil_gaps.gaps, count=3),)),
    "gaps in pairs": partial(_lines, of=("pair",), spoilers=_GAPS),
    "spurs": partial(_lines, of=_ALL, spoilers=(spoil_shape.spurs,)),
    "copies": partial(_lines, of=_ALL, spoilers=(partial(spoil_shape.copies, count=3),)),
    "wide copies": partial(_lines, of=_ALL, spoilers=(partial(spoil_shape.copies, strength=0.4, exact=0.0),)),
    "kissing": partial(_lines, of=("arteries crossing", "like vessels"), spoilers=(spoil_kissing.kissing,)),
    "kissing classes": partial(_lines, of=("crossing", "pair"), spoilers=(spoil_kissing.kissing,)),
    "cliques": partial(_lines, of=_ALL, spoilers=(spoil_shape.cliques,)),
    "holes": partial(_lines, of=_ALL, spoilers=(spoil_shape.holes,)),
    "radius": partial(_lines, of=_ALL, spoilers=(spoil_values.radius_faults, spoil_values.decaying_ends)),
    "radius floor": partial(_lines, of=("tree", "ring"), spoilers=(spoil_values.radius_floor,)),
    "jagged": partial(_lines, of=_ALL, spoilers=(spoil_values.jagged,)),
    "stray": partial(_lines, of=_ALL, spoilers=(spoil_shape.stray_parts,)),
    "all": partial(
        _lines,
        of=_ARTERIES,
        spoilers=(
            *_STRUCTURE,
            partial(spoil_values.jagged, strength=0.05),
            spoil_values.radius_faults,
            spoil_values.shuffled,
        ),
    ),
    "voxel tree": partial(_voxels, of="tree", resolution=4.0),
    "voxel ring": partial(_voxels, of="ring", resolution=4.0),
    "voxel pair": partial(_voxels, of="pair", resolution=4.0),
    "voxel veins": partial(_voxels, of="veins", resolution=4.0),
    "coarse voxel tree": partial(_voxels, of="tree", resolution=2.0),
}
"""Kind of case -> its maker."""
