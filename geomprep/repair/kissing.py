"""Kissing vessels: two that only touch or pass, joined by a false link or at a shared point."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.errors import InputError
from geomprep.model import BoolArray, FloatArray, IntArray, PointGraph, Repair, anchor_ids
from geomprep.repair.branches import Branches
from geomprep.repair.contacts import Contacts, link_contacts, shared_contacts
from geomprep.repair.edits import with_doubled_points, without_edges
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.verdicts import Verdict

__all__ = ["KissingSettings", "part_kissing"]

LEAVE, PART, PAIR_A, PAIR_B = "leave", "part", "pairing A", "pairing B"
_ARTERY = 1
_BEYOND = 1.25
"""Links are looked for so much farther than the limit, so that recorded ones are found when it has moved."""


@dataclass(frozen=True)
class KissingSettings:
    """When a contact is false.

    Attributes
    ----------
    use : bool
        False leaves all contacts.
    straight_within : float
        Largest bend, in degrees, of a vessel that goes straight through a shared point; half of it at a link.
    radius_ratio : float
        Largest ratio of the radii on the two sides of a vessel that goes through.
    link_outside : float
        Longest part of a false link outside both tubes, in its own radii. A real communicating vessel is longer.

    Raises
    ------
    InputError
        A value lies outside its range.
    """

    use: bool = True
    straight_within: float = 45.0
    radius_ratio: float = 1.35
    link_outside: float = 1.5

    def __post_init__(self) -> None:
        """Refuse values outside their range."""
        for name, low, high in (("straight_within", 0, 60), ("radius_ratio", 1, 3), ("link_outside", 0, 10)):
            value = getattr(self, name)
            if not low <= value <= high:
                raise InputError(f"repair.kissing.{name} = {value:g}: must be between {low} and {high}")


def part_kissing(graph: PointGraph, settings: KissingSettings, given: Given) -> StepResult:
    """Part vessels that pass straight through a contact with equal calibre on both sides.

    A false link is cut; at a shared point each vessel gets a point of its own. Arteries are parted by the
    rule; in veins, where joins of this shape are common, and in vessels of no known class, a person is asked.

    Parameters
    ----------
    graph : PointGraph
    settings : KissingSettings
    given : Given

    Returns
    -------
    StepResult

    Notes
    -----
    Straight passage and equal calibre along, unequal across, as evidence of a touch are common practice. A
    communicating vessel is told from a false link by its length outside both tubes alone.

    Examples
    --------
    Two vessels that cross through one point:

    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> t = np.linspace(-20e-3, 20e-3, 81)[:, None]
    >>> graph = join(Centrelines.of_lines([t * [0, 0, 1.0], t * [0.8, 0, 0.6]], [1e-3, 1.5e-3])).graph
    >>> part_kissing(graph, KissingSettings(), Given()).repairs[0].choice
    'pairing A'
    """
    if not settings.use:
        return StepResult(graph)
    branches = given.branches(graph)
    repairs: list[Repair] = []
    dropped_by = np.full(graph.n_edges, -1, np.int64)
    doubled: list[tuple[int, IntArray, FloatArray]] = []
    for found in (link_contacts(branches, _BEYOND * settings.link_outside), shared_contacts(branches)):
        ids = anchor_ids("kissing", graph.raw_points, graph.source_point[_anchors(branches, found)])
        proposed = _is_touch(found, settings) & ~_named_link(branches, found)
        for row, key in enumerate(ids.tolist()):
            if not given.verdicts.wanted(key, bool(proposed[row])):
                continue
            options = _options(found, row)
            verdict = given.verdicts.settle(key, options, _proposal(graph, found, row, options))
            if verdict.choice != LEAVE and found.link[row] >= 0:
                dropped_by[branches.chain_edges(found.link[row : row + 1])[0]] = len(repairs)
            elif verdict.choice != LEAVE:
                doubled.append(_second_vessel(branches, found, row, verdict.choice))
            repairs.append(_record(branches, found, row, key, options, verdict))
    if doubled:
        point, edges, radius = (np.array(column) for column in zip(*doubled, strict=True))
        graph = with_doubled_points(graph, point, edges, radius)
    return StepResult(without_edges(graph, dropped_by), tuple(repairs))


def _is_touch(found: Contacts, settings: KissingSettings) -> BoolArray:
    """Whether both vessels go straight on with their calibre, and no other pairing does so as well."""
    # vessels bend to meet in a shared point; beside a false link they do not
    limit = np.radians(settings.straight_within) * np.where(found.link >= 0, 0.5, 1.0)
    straight = (found.bend <= limit[:, None]).all(axis=1)
    alike = (found.ratio <= settings.radius_ratio).all(axis=1)
    clear = (found.other_bend > found.bend.max(axis=1) + np.radians(10.0)) | (
        found.size.max(axis=1) / found.size.min(axis=1) > settings.radius_ratio
    )
    touch: BoolArray = straight & alike & clear & (found.outside <= settings.link_outside)
    return touch


def _named_link(branches: Branches, found: Contacts) -> BoolArray:
    """Whether a link, its ends included, is protected: a vessel that has a name is there."""
    named = np.zeros(len(found.link), np.bool_)
    link = found.link >= 0
    chain = found.link[link]
    named[link] = branches.protected(chain) | branches.graph.protected[branches.ends[chain]].any(axis=1)
    return named


def _options(found: Contacts, row: int) -> tuple[str, ...]:
    """What can be done with a contact."""
    return (LEAVE, PART) if found.link[row] >= 0 else (LEAVE, PAIR_A, PAIR_B)


def _proposal(graph: PointGraph, found: Contacts, row: int, options: tuple[str, ...]) -> str | None:
    """The rule's choice: arteries are parted, for others a person is asked."""
    return options[1] if (graph.vessel_class[found.nodes[row]] == _ARTERY).all() else None


def _anchors(branches: Branches, found: Contacts) -> IntArray:
    """Points whose raw coordinates name a contact."""
    if (found.link < 0).all():
        return found.nodes[:, :1]
    offsets, point = branches.cut.offsets, branches.cut.point
    middle = point[(offsets[found.link] + offsets[found.link + 1] - 1) // 2]
    return np.concatenate((found.nodes, middle[:, None]), axis=1)


def _second_vessel(branches: Branches, found: Contacts, row: int, choice: str) -> tuple[int, IntArray, FloatArray]:
    """The shared point, the edges of the vessel that gets a copy of it, and the radius of each vessel there."""
    order = np.arange(4) if choice == PAIR_A else found.other[row]
    chain, side = found.arms[row][order], found.sides[row][order]
    offsets = branches.cut.edge_offsets
    edges = branches.cut.edge[np.where(side == 0, offsets[chain], offsets[chain + 1] - 1)]
    neighbour = branches.cut.point[
        np.where(side == 0, branches.cut.offsets[chain] + 1, branches.cut.offsets[chain + 1] - 2)
    ]
    size = branches.graph.radius[neighbour].reshape(2, 2)
    return int(found.nodes[row, 0]), edges[2:], np.sqrt(size[:, 0] * size[:, 1])


def _record(
    branches: Branches, found: Contacts, row: int, key: str, options: tuple[str, ...], verdict: Verdict
) -> Repair:
    """The repair of one contact."""
    graph, link = branches.graph, int(found.link[row])
    what = f"a link of {1e3 * branches.length[link]:.3g} mm joins" if link >= 0 else "one point joins"
    bends = " and ".join(f"{value:.0f}°" for value in np.degrees(found.bend[row]))
    sizes = " and ".join(f"{1e3 * value:.3g}" for value in found.size[row])
    carried = float(branches.chain_conductance(found.link[row : row + 1])[0]) if link >= 0 else 0.0
    return recorded(
        "kissing vessels",
        key,
        options,
        verdict,
        Change(
            reason=f"{what} two vessels of radius {sizes} mm that go straight on there (they turn by {bends})",
            place=graph.points[found.nodes[row]].mean(axis=0),
            conductance=(carried, 0.0) if link >= 0 else None,
        ),
    )
