"""Ends that two networks share, the resistance between them, and what each vessel's change does to it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from geomprep.case.network_reading import ReadNetwork
from geomprep.measure.comparison import Change, Comparison
from geomprep.measure.route_resistance import Routes, effect_of_factor
from geomprep.model import FloatArray, IntArray
from geomprep.solve import effective_resistance

__all__ = ["MOST_EFFECTS", "MOST_ROUTES", "EndPair", "RouteChange", "effects", "matched_ends", "route_changes"]

MOST_EFFECTS: Final = 500
"""Vessels of which the effect is computed: each costs two solutions."""
MOST_ROUTES: Final = 200
"""Pairs of an inlet and an outlet that are listed."""


@dataclass(frozen=True)
class EndPair:
    """An inlet or outlet of one or both networks.

    Attributes
    ----------
    role : str
        ``inlet`` or ``outlet``.
    name : str
        Name of the vessel that ends there, or the id of the node.
    nodes : tuple of int
        Rows of the node in both networks; None where a network has no such end.
    """

    role: str
    name: str
    nodes: tuple[int | None, int | None]


@dataclass(frozen=True)
class RouteChange:
    """Resistance between an inlet and an outlet in both networks, all other ends closed.

    Attributes
    ----------
    inlet, outlet : str
    resistance : tuple of float
        Pa·s/m³; None where nothing joins them.
    """

    inlet: str
    outlet: str
    resistance: tuple[float | None, float | None]


def matched_ends(one: ReadNetwork, two: ReadNetwork, found: Comparison) -> tuple[EndPair, ...]:
    """Return inlets, then outlets: those that lie on one vessel in both networks as pairs, the nearest to one another.

    Parameters
    ----------
    one, two : ReadNetwork
    found : Comparison
    """
    ends = []
    for role in ("inlet", "outlet"):
        nodes = [getattr(each.routes, f"{role}s") for each in (one, two)]
        pairs = _pairs(one, two, found, (nodes[0], nodes[1]))
        met = [{pair[side] for pair in pairs} for side in (0, 1)]
        ends += [EndPair(role, _end_name(one, a), (a, b)) for a, b in pairs]
        ends += [EndPair(role, _end_name(one, a), (a, None)) for a in nodes[0].tolist() if a not in met[0]]
        ends += [EndPair(role, _end_name(two, b), (None, b)) for b in nodes[1].tolist() if b not in met[1]]
    return tuple(ends)


def _pairs(
    one: ReadNetwork, two: ReadNetwork, found: Comparison, nodes: tuple[IntArray, IntArray]
) -> list[tuple[int, int]]:
    """Ends of both that lie on one vessel, each with the other as its nearest."""
    if not (len(nodes[0]) and len(nodes[1])):
        return []
    place = [_end_places(each, own) for each, own in zip((one, two), nodes, strict=True)]
    groups = [_end_groups(each, own, label) for each, own, label in zip((one, two), nodes, found.group, strict=True)]
    common = np.array([[bool(a & b) for b in groups[1]] for a in groups[0]])
    apart = np.where(common, np.linalg.norm(place[0][:, None] - place[1], axis=2), np.inf)
    near, back = apart.argmin(axis=1), apart.argmin(axis=0)
    rows = [row for row in range(len(near)) if common[row, near[row]] and back[near[row]] == row]
    return [(int(nodes[0][row]), int(nodes[1][near[row]])) for row in rows]


def _end_groups(network: ReadNetwork, nodes: IntArray, label: IntArray) -> list[set[int]]:
    """Groups of the segments at each end."""
    vessels = network.vessels
    return [set(label[(vessels.from_node == node) | (vessels.to_node == node)].tolist()) for node in nodes]


def _end_places(network: ReadNetwork, nodes: IntArray) -> FloatArray:
    """Place of each end: that of the first or last station there, which a rigid fit has moved too."""
    vessels = network.vessels
    row = np.array([np.flatnonzero((vessels.from_node == node) | (vessels.to_node == node))[0] for node in nodes])
    offsets = vessels.stations.offsets
    at = np.where(vessels.from_node[row] == nodes, offsets[row], offsets[row + 1] - 1)
    place: FloatArray = vessels.stations.position[at]
    return place


def _end_name(network: ReadNetwork, node: int) -> str:
    """Name of the vessel at an end, or the id of the node."""
    vessels = network.vessels
    names = vessels.name[(vessels.from_node == node) | (vessels.to_node == node)]
    return next((str(name) for name in names if name), str(network.tables["nodes"]["id"][node]))


def route_changes(routes: tuple[Routes, Routes], ends: tuple[EndPair, ...]) -> tuple[tuple[RouteChange, ...], int]:
    """Return the resistance between every inlet and outlet that both networks have, and how many were left out.

    Parameters
    ----------
    routes : tuple of two Routes
    ends : tuple of EndPair
    """
    both = [end for end in ends if None not in end.nodes]
    pairs = [(a, b) for a in both if a.role == "inlet" for b in both if b.role == "outlet"]
    shown = pairs[:MOST_ROUTES]
    found = [
        effective_resistance(
            each.n_nodes,
            each.from_node,
            each.to_node,
            1.0 / each.resistance,
            np.array([(a.nodes[side], b.nodes[side]) for a, b in shown], dtype=np.int64),
        )
        for side, each in enumerate(routes)
    ]
    rows = [
        RouteChange(a.name, b.name, (_finite(first), _finite(second)))
        for (a, b), first, second in zip(shown, *found, strict=True)
    ]
    return tuple(rows), len(pairs) - len(shown)


def _finite(value: float) -> float | None:
    """The number, or None where it is infinite."""
    return float(value) if np.isfinite(value) else None


def effects(
    routes: tuple[Routes, Routes], whole: tuple[float, float], found: Comparison, resistance: FloatArray
) -> tuple[FloatArray, int]:
    """Return what each vessel's change alone does to the resistance from inlets to outlets.

    Parameters
    ----------
    routes : tuple of two Routes
    whole : tuple of float
        Resistance from inlets to outlets of both, Pa·s/m³.
    found : Comparison
    resistance : (g, 2) float array
        Resistance of each group from end to end; NaN where there is none.

    Returns
    -------
    effect : (g,) float array
        Pa·s/m³: the mean of making the change in the first network and of taking it back in the second, so that it
        does not depend on which network is called the first; that of the one network that has the vessel where it
        is new or gone. NaN where no number says it.
    left_out : int
        Vessels that were not looked at, those of the smallest change of resistance.
    """
    one_only = found.changes[:, [Change.NEW, Change.GONE]].any(axis=1)
    size = np.where(one_only, np.inf, np.abs(np.log(resistance[:, 1] / resistance[:, 0])))
    known = np.flatnonzero(size > 0)  # not those of no one resistance, which are not a number
    looked_at = known[np.argsort(-size[known], kind="stable")][:MOST_EFFECTS]
    effect = np.where(size == 0, 0.0, np.nan)
    for group in looked_at.tolist():
        rows = [np.flatnonzero(label == group) for label in found.group]
        if len(rows[0]) and len(rows[1]):
            ratio = float(resistance[group, 1] / resistance[group, 0])
            there = effect_of_factor(routes[0], whole[0], rows[0], ratio)
            back = effect_of_factor(routes[1], whole[1], rows[1], 1.0 / ratio)
            effect[group] = 0.5 * (there - back)
        elif len(rows[0]):
            effect[group] = effect_of_factor(routes[0], whole[0], rows[0], np.inf)
        else:
            effect[group] = -effect_of_factor(routes[1], whole[1], rows[1], np.inf)
    return effect, len(known) - len(looked_at)
