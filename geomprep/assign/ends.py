"""Which node a case means by ``at``: a vessel, a node id, coordinates, every other open end."""

from __future__ import annotations

import dataclasses
import difflib
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from geomprep.assign.labels import end_segment, node_label, open_ends
from geomprep.errors import CaseError, OpenQuestions, Question
from geomprep.findings import Finding, Severity
from geomprep.model import NODE_ROLES, FloatArray, IntArray, Network

__all__ = ["EVERY_OTHER", "Ends", "Placed", "find_node", "resolve_ends"]

EVERY_OTHER = "every other open end"
"""What ``at`` says for all open ends that no other entry names."""

_NEAR_IN_RADII = 2.0
_ASKED = 12  # open ends shown in a question
_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_COORDINATES = re.compile(rf"\s*({_NUMBER})[\s,]+({_NUMBER})[\s,]+({_NUMBER})\s*")


class Placed(Protocol):
    """Anything that says where it stands, such as an entry of ``[[inlets]]``."""

    @property
    def at(self) -> str:
        """Vessel name, node id, coordinates, or :data:`EVERY_OTHER`."""


@dataclass(frozen=True, eq=False)
class Ends:
    """Nodes where blood enters and leaves, and the entry of the case that names each.

    Attributes
    ----------
    network : Network
        With the roles of these nodes set.
    inlet_nodes, inlet_entries : (i,) int array
        Entry 2 is ``inlets[2]`` of the case; one entry may name several nodes.
    outlet_nodes, outlet_entries : (o,) int array
    left_open : (l,) int array
        Open ends that no entry names: blood stands still there.
    findings : tuple of Finding
    """

    network: Network
    inlet_nodes: IntArray
    inlet_entries: IntArray
    outlet_nodes: IntArray
    outlet_entries: IntArray
    left_open: IntArray
    findings: tuple[Finding, ...] = ()


def find_node(network: Network, at: str, metres_per_unit: float = 1.0, key: str = "at") -> int:
    """Return the node that a text names.

    Parameters
    ----------
    network : Network
    at : str
        Node id, name of a vessel with one open end, beginning of a node id that fits one node
        only, or three coordinates; tried in this order. Names are compared without case. Coordinates
        name the nearest open end, or else the nearest node, within two radii.
    metres_per_unit : float
        Metres per unit of the coordinates.
    key : str
        Key of the case file, for messages.

    Returns
    -------
    int

    Raises
    ------
    CaseError
        Nothing fits, or several do; they are listed.
    """
    exact = np.flatnonzero(network.nodes.id == at)
    if exact.size:
        return int(exact[0])
    named = _named(network, at, key)
    if named is not None:
        return named
    starts = [row for row, name in enumerate(network.nodes.id) if str(name).startswith(at)]
    if len(starts) == 1:
        return starts[0]
    if starts:
        raise CaseError(
            f"{key} = '{at}': {len(starts)} node ids begin like this ({_listed(network, starts)}); write more of one"
        )
    place = coordinates(at, metres_per_unit)
    if place is not None:
        return _nearest(network, place, f"{key} = '{at}'")
    raise CaseError(f"{key} = '{at}': {_nothing_fits(network, at)}")


def coordinates(at: str, metres_per_unit: float = 1.0) -> FloatArray | None:
    """Return the place that a text of three coordinates names, in metres; None where it is no such text.

    Examples
    --------
    >>> coordinates("0 10 -2", 1e-3)
    array([ 0.   ,  0.01 , -0.002])
    """
    match = _COORDINATES.fullmatch(at)
    return None if match is None else np.array([float(number) for number in match.groups()]) * metres_per_unit


def _named(network: Network, at: str, key: str) -> int | None:
    """The open end of the vessel of a name; None where no vessel has that name."""
    wanted = " ".join(at.split()).casefold()
    rows = [row for row, name in enumerate(network.segments.name) if name and str(name).casefold() == wanted]
    if not rows:
        return None
    ends = np.unique(np.concatenate((network.segments.from_node[rows], network.segments.to_node[rows])))
    candidates = ends[open_ends(network)[ends]].tolist()
    if len(candidates) == 1:
        return int(candidates[0])
    if candidates:
        raise CaseError(
            f"{key} = '{at}': that vessel has {len(candidates)} open ends ({_listed(network, candidates)}); "
            "write the node id of one"
        )
    raise CaseError(
        f"{key} = '{at}': that vessel has no open end; its nodes are {_listed(network, ends.tolist())}: "
        "write the id of one"
    )


def _listed(network: Network, nodes: list[int], most: int = 6) -> str:
    """Ids and places of nodes, for a person to choose from."""
    shown = [
        f"{network.nodes.id[node]} at ({', '.join(f'{value:.4g}' for value in 1e3 * network.nodes.position[node])}) mm"
        for node in nodes[:most]
    ]
    return ", ".join(shown) + (f" and {len(nodes) - most} more" if len(nodes) > most else "")


def _nearest(network: Network, place: FloatArray, what: str) -> int:
    """The open end nearest to a place, else the nearest node, within two radii."""
    if len(network.nodes) == 0:
        raise CaseError(f"{what}: the network has no node")
    distance = np.linalg.norm(network.nodes.position - place, axis=1)
    segment, station = end_segment(network, np.arange(len(network.nodes)))
    reach = np.where(segment >= 0, _NEAR_IN_RADII * network.stations.radius[station], 0.0)
    is_open = open_ends(network)
    for group in (np.flatnonzero(is_open & (distance <= reach)), np.flatnonzero(distance <= reach)):
        if group.size:
            return int(group[np.argmin(distance[group])])
    near = int(np.argmin(np.where(is_open, distance, np.inf))) if is_open.any() else int(np.argmin(distance))
    raise CaseError(
        f"{what}: no node within two radii; the nearest open end is {node_label(network, near)}, "
        f"{1e3 * distance[near]:.3g} mm away: write its id, or better coordinates in the unit of the file"
    )


def _nothing_fits(network: Network, at: str) -> str:
    """Rule and way out for a text that names nothing."""
    names = sorted({str(name) for name in network.segments.name if name})
    near = difflib.get_close_matches(at, names, n=3, cutoff=0.5)
    rule = "no vessel, node id or coordinates 'x y z' fit"
    if near:
        return f"{rule}; the nearest names are {', '.join(near)}"
    return f"{rule}; open ends are {_listed(network, np.flatnonzero(open_ends(network)).tolist())}"


def resolve_ends(
    network: Network, inlets: Sequence[Placed], outlets: Sequence[Placed], metres_per_unit: float = 1.0
) -> Ends:
    """Find the nodes of all inlets and outlets of a case.

    Parameters
    ----------
    network : Network
    inlets, outlets : sequence of Placed
        Entries in the order of the case; one of all may stand at :data:`EVERY_OTHER`.
    metres_per_unit : float
        Metres per unit of coordinates.

    Returns
    -------
    Ends

    Raises
    ------
    OpenQuestions
        There is no inlet or no outlet: nothing would flow. The open ends are listed.
    CaseError
        An entry names nothing, several nodes, or a node that another entry has; all
        faults are listed at once.
    """
    if not inlets or not outlets:
        raise OpenQuestions(_questions(network, bool(inlets), bool(outlets)))
    entries = [("inlets", row, inlet.at) for row, inlet in enumerate(inlets)]
    entries += [("outlets", row, outlet.at) for row, outlet in enumerate(outlets)]
    taken, faults = _single_nodes(network, entries, metres_per_unit)
    wide = [(kind, row) for kind, row, at in entries if at == EVERY_OTHER]
    if len(wide) > 1:
        faults.append(f"{wide[1][0]}[{wide[1][1]}].at: '{EVERY_OTHER}' stands twice; one entry can take them all")
    if faults:
        raise CaseError("; ".join(faults))
    rest = np.setdiff1d(np.flatnonzero(open_ends(network)), np.array([*taken], np.int64))
    pairs = [(kind, row, node) for node, (kind, row) in taken.items()]
    pairs += [(kind, row, node) for kind, row in wide for node in rest.tolist()]
    left = rest[: 0 if wide else None]
    inlet_nodes, inlet_entries = _of_kind(pairs, "inlets")
    outlet_nodes, outlet_entries = _of_kind(pairs, "outlets")
    findings = (*_none_left(wide, rest), *_left_open(network, left))
    named = _with_roles(network, inlet_nodes, outlet_nodes)
    return Ends(named, inlet_nodes, inlet_entries, outlet_nodes, outlet_entries, left, findings)


def _questions(network: Network, has_inlets: bool, has_outlets: bool) -> list[Question]:
    """Ask where blood enters or leaves, the widest open ends first."""
    nodes = np.flatnonzero(open_ends(network))
    radius = network.stations.radius[end_segment(network, nodes)[1]]
    order = np.argsort(-radius, kind="stable")[:_ASKED].tolist()
    candidates = tuple(node_label(network, int(nodes[row])) for row in order)
    evidence = tuple(f"radius {1e3 * radius[row]:.3g} mm" for row in order)
    asked = [("inlets", "enter"), ("outlets", "leave")]
    return [
        Question(f"{kind}[0].at", f"where does blood {verb}? The case has no [[{kind}]].", candidates, evidence)
        for (kind, verb), has in zip(asked, (has_inlets, has_outlets), strict=True)
        if not has
    ]


def _of_kind(pairs: list[tuple[str, int, int]], kind: str) -> tuple[IntArray, IntArray]:
    """Nodes and entries of one kind, in the order of the case."""
    found = sorted((row, node) for key, row, node in pairs if key == kind)
    table = np.array(found, np.int64).reshape(-1, 2)
    return table[:, 1], table[:, 0]


def _single_nodes(
    network: Network, entries: list[tuple[str, int, str]], metres_per_unit: float
) -> tuple[dict[int, tuple[str, int]], list[str]]:
    """Node of every entry that names one, and what is wrong with the others."""
    taken: dict[int, tuple[str, int]] = {}
    faults: list[str] = []
    for kind, row, at in entries:
        if at == EVERY_OTHER:
            continue
        key = f"{kind}[{row}].at"
        try:
            node = find_node(network, at, metres_per_unit, key)
        except CaseError as fault:
            faults.append(str(fault))
            continue
        if node in taken:
            other = "{}[{}]".format(*taken[node])
            faults.append(f"{key} = '{at}': {other} already stands at {node_label(network, node)}; keep one of them")
        else:
            taken[node] = (kind, row)
    return taken, faults


def _none_left(wide: list[tuple[str, int]], rest: IntArray) -> tuple[Finding, ...]:
    """A finding where ``every other open end`` names none."""
    if not wide or rest.size:
        return ()
    message = f"{wide[0][0]}[{wide[0][1]}] stands for every other open end, but no open end is left."
    return (Finding("no open end left", Severity.WARNING, message),)


def _left_open(network: Network, nodes: IntArray) -> tuple[Finding, ...]:
    """A finding for every open end that is neither inlet nor outlet."""
    return tuple(
        Finding(
            "open end without inlet or outlet",
            Severity.WARNING,
            f"The open end {node_label(network, node)} is neither inlet nor outlet: no blood passes it.",
            where=str(network.nodes.id[node]),
            position=tuple(network.nodes.position[node].tolist()),
        )
        for node in nodes.tolist()
    )


def _with_roles(network: Network, inlet_nodes: IntArray, outlet_nodes: IntArray) -> Network:
    """The network with the roles of inlet and outlet nodes set."""
    role = np.array(network.nodes.role)
    role[inlet_nodes] = NODE_ROLES.index("inlet")
    role[outlet_nodes] = NODE_ROLES.index("outlet")
    return dataclasses.replace(network, nodes=dataclasses.replace(network.nodes, role=role))
