"""Orders on the small trees of the literature, orientation on loops."""

import dataclasses

import numpy as np
import pytest

from geomprep.model import Network
from geomprep.segments import order_segments, orient, split


def tree(make_graph, links: dict[str, str]) -> tuple[Network, dict[str, int]]:
    """Lay a tree {daughter: parent} out so that every named node lies at its own place."""
    names = sorted({*links, *links.values()})
    points = [[index, index**2 % 7, index**3 % 5] for index in range(len(names))]
    edges = [[names.index(parent), names.index(daughter)] for daughter, parent in links.items()]
    network = split(make_graph(points, edges))
    node = {
        name: int(np.flatnonzero((network.nodes.position == points[names.index(name)]).all(axis=1))[0])
        for name in names
    }
    return network, node


def ordered(network: Network, node: dict[str, int], root: str) -> dict[str, tuple[int, int, int]]:
    outlets = np.flatnonzero((network.nodes.role == 2) & (np.arange(len(network.nodes)) != node[root]))
    result = order_segments(network, np.array([node[root]]), outlets).network.segments
    found = {}
    for name, index in node.items():
        for s in range(len(result)):
            ends = {int(result.from_node[s]), int(result.to_node[s])}
            if index in ends:
                found.setdefault(name, []).append(
                    (int(result.strahler_order[s]), int(result.horsfield_order[s]), int(result.generation[s]))
                )
    return found


def test_balanced_tree(make_graph) -> None:
    """root(A(a1,a2), B(b1,C(c1,c2))): A 2/2, C 2/2, B 2/3, root 3/4 (derived from the rules)."""
    links = {"j": "root", "A": "j", "a1": "A", "a2": "A", "B": "j", "b1": "B", "C": "B", "c1": "C", "c2": "C"}
    network, node = tree(make_graph, links)
    found = ordered(network, node, "root")
    assert found["root"] == [(3, 4, 0)]
    assert max(found["C"]) == (2, 2, 2)
    assert sorted(found["A"])[-1] == (2, 2, 1)
    assert sorted(found["B"])[-1] == (2, 3, 1)
    for leaf in ("a1", "a2", "b1", "c1", "c2"):
        assert found[leaf][0][:2] == (1, 1)


def test_side_branch_chain(make_graph) -> None:
    """r(x1,m1(x2,m2(x3,m3(x4,x5)))): m3 2/2, m2 2/3, m1 2/4, r 2/5."""
    links = {"m0": "r", "x1": "m0", "m1": "m0", "x2": "m1", "m2": "m1", "x3": "m2", "m3": "m2", "x4": "m3", "x5": "m3"}
    network, node = tree(make_graph, links)
    found = ordered(network, node, "r")
    assert found["r"] == [(2, 5, 0)]
    assert max(found["m1"]) == (2, 4, 1)
    assert max(found["m2"]) == (2, 3, 2)
    assert max(found["m3"]) == (2, 2, 3)


def test_three_daughters_and_order_rises_only_if_the_largest_occurs_twice(make_graph) -> None:
    links = {"j": "r", "a": "j", "b": "j", "c": "j"}
    network, node = tree(make_graph, links)
    assert ordered(network, node, "r")["r"] == [(2, 2, 0)]


def test_veins_are_rooted_at_the_only_outlet(make_graph) -> None:
    network, node = tree(make_graph, {"j": "out", "a": "j", "b": "j"})
    inlets = np.array([node["a"], node["b"]])
    result = order_segments(network, inlets, np.array([node["out"]]))
    assert sorted(result.network.segments.strahler_order.tolist()) == [1, 1, 2]
    assert result.findings == ()


def test_loops_have_no_orders_and_say_so(make_graph) -> None:
    points = [[0, 0, 0], [1, 0, 0], [2, 1, 0], [2, -1, 0], [3, 0, 0], [4, 0, 0]]
    network = split(make_graph(points, [[0, 1], [1, 2], [2, 4], [1, 3], [3, 4], [4, 5]]))
    open_ends = np.flatnonzero(network.nodes.role == 2)
    result = order_segments(network, open_ends[:1], open_ends[1:])
    assert set(result.network.segments.strahler_order.tolist()) == {-1}
    assert "1 loop" in result.findings[0].message


@pytest.mark.parametrize("swap", [False, True])
def test_orientation_follows_the_flow_round_a_loop(make_graph, swap: bool) -> None:
    points = [[0, 0, 0], [1, 0, 0], [2, 1, 0], [2, -1, 0], [3, 0, 0], [4, 0, 0]]
    network = split(make_graph(points, [[0, 1], [1, 2], [2, 4], [1, 3], [3, 4], [4, 5]], radius=0.1))
    ends = np.flatnonzero(network.nodes.role == 2)
    inlet, outlet = (ends[1:], ends[:1]) if swap else (ends[:1], ends[1:])
    turned = orient(network, inlet, outlet)
    x = turned.nodes.position[:, 0]
    step = x[turned.segments.to_node] - x[turned.segments.from_node]
    assert (np.sign(step) == (-1 if swap else 1)).all()
    assert set(turned.segments.id) == set(network.segments.id)
    # stations were turned with their segments
    first = turned.stations.position[turned.stations.offsets[:-1]]
    assert np.array_equal(first, turned.nodes.position[turned.segments.from_node])
    back = dataclasses.replace(turned)
    assert np.all(np.diff(back.stations.distance)[np.diff(back.stations.segment) == 0] > 0)


def test_no_flow_leaves_the_order_of_nodes(make_graph) -> None:
    network = split(make_graph([[0, 0, 0], [1, 0, 0]], [[1, 0]]))
    assert orient(network, np.array([0]), np.array([], dtype=int)).segments.from_node.tolist() == [0]
