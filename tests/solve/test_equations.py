"""The steady network equations against closed forms and against dense numpy algebra."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.errors import ModelError
from geomprep.solve import factorise, flows, heads, heads_and_flows, net_outflow, parts, steady_heads, with_far_nodes

Array = npt.NDArray[Any]
Edges = tuple[Array, Array, Array]
SETTINGS = settings(max_examples=30, derandomize=True, deadline=None)
POSITIVE = st.floats(1e-4, 1e4)


def random_network(seed: int, n_nodes: int = 12, n_edges: int = 30, decades: float = 3.0) -> Edges:
    """A connected multigraph with parallel edges and self-loops, and its conductances."""
    rng = np.random.default_rng(seed)
    spine = np.arange(1, n_nodes)
    tail = np.concatenate((rng.integers(0, spine), rng.integers(0, n_nodes, n_edges)))
    head = np.concatenate((spine, rng.integers(0, n_nodes, n_edges)))
    return tail, head, 10.0 ** rng.uniform(-decades, decades, len(tail))


def dense_laplacian(n_nodes: int, tail: Array, head: Array, conductance: Array) -> Array:
    """The weighted Laplacian, entry by entry, as the definition says."""
    matrix = np.zeros((n_nodes, n_nodes))
    for i, j, g in zip(tail, head, conductance, strict=True):
        matrix[i, i] += g
        matrix[j, j] += g
        matrix[i, j] -= g
        matrix[j, i] -= g
    return matrix


@given(st.lists(POSITIVE, min_size=1, max_size=12))
@SETTINGS
def test_series_adds_resistances(resistance: list[float]) -> None:
    n = len(resistance)
    flow = flows(factorise(n + 1, range(n), range(1, n + 1), 1 / np.array(resistance), [0, n]), [1.0, 0.0])
    np.testing.assert_allclose(flow, 1 / sum(resistance), rtol=1e-12)


@given(st.lists(POSITIVE, min_size=1, max_size=12))
@SETTINGS
def test_parallel_edges_add_conductances(conductance: list[float]) -> None:
    n = len(conductance)
    head = heads(factorise(2, [0] * n, [1] * n, conductance, [1]), [0.0], [1.0, 0.0])
    assert head[0] == pytest.approx(1 / sum(conductance), rel=1e-12)


def test_infinite_ladder_is_the_golden_ratio() -> None:
    """Ladder of unit rungs and rails: R = (1 + √5)/2 (textbook, from MEMORY; solves R = 1 + R/(1 + R))."""
    n = 60
    rails, rungs = np.arange(n), np.arange(1, n + 1)
    tail, head = np.concatenate((rails, rungs)), np.concatenate((rungs, np.full(n, n + 1)))
    network = factorise(n + 2, tail, head, np.ones(2 * n), [n + 1])
    inflow = np.zeros(n + 2)
    inflow[0] = 1.0
    assert heads(network, [0.0], inflow)[0] == pytest.approx(1.6180339887498949, rel=1e-13)


def test_balanced_wheatstone_bridge_has_no_cross_flow() -> None:
    """R1/R2 = R3/R4 balances the bridge (Wheatstone 1843; textbook rule, from MEMORY)."""
    resistance = np.array([2.0, 3.0, 4.0, 6.0, 7.0])  # a-b, b-d, a-c, c-d, bridge b-c
    flow = flows(factorise(4, [0, 1, 0, 2, 1], [1, 3, 2, 3, 2], 1 / resistance, [0, 3]), [10.0, 0.0])
    assert abs(flow[4]) < 1e-14
    np.testing.assert_allclose(flow[:4], [2.0, 2.0, 1.0, 1.0], rtol=1e-14)


def test_unbalanced_bridge_by_hand() -> None:
    """Unit resistances but R(b-d) = 2 at 1 Pa: Kirchhoff by hand gives heads 8/13, 7/13 (DERIVED by elimination).

    b: (1-b) = b/2 + (b-c); c: (1-c) + (b-c) = c  ->  5/2 b - c = 1; 3c - b = 1  ->  b = 8/13, c = 7/13.
    """
    head = heads(factorise(4, [0, 1, 0, 2, 1], [1, 3, 2, 3, 2], [1, 0.5, 1, 1, 1], [0, 3]), [1.0, 0.0])
    np.testing.assert_allclose(head, [1.0, 8 / 13, 7 / 13, 0.0], rtol=1e-14)


@pytest.mark.parametrize("seed", range(5))
def test_agrees_with_dense_pseudo_inverse(seed: int) -> None:
    tail, head, conductance = random_network(seed)
    rng = np.random.default_rng(seed + 100)
    inflow = rng.normal(size=12)
    inflow -= inflow.mean()
    found, flow = heads_and_flows(factorise(12, tail, head, conductance, [], still_parts=True), [], inflow)
    expected = np.linalg.pinv(dense_laplacian(12, tail, head, conductance)) @ inflow
    np.testing.assert_allclose(found - found[0], expected - expected[0], rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(net_outflow(12, tail, head, flow), inflow, atol=1e-12)


@pytest.mark.parametrize("seed", range(5))
def test_agrees_with_dense_solution_for_fixed_heads(seed: int) -> None:
    tail, head, conductance = random_network(seed)
    fixed, given_heads = [3, 7], [5.0, -2.0]
    free = np.setdiff1d(np.arange(12), fixed)
    matrix = dense_laplacian(12, tail, head, conductance)
    expected = np.linalg.solve(matrix[np.ix_(free, free)], -matrix[np.ix_(free, fixed)] @ given_heads)
    found = heads(factorise(12, tail, head, conductance, fixed), given_heads)
    np.testing.assert_allclose(found[free], expected, rtol=1e-9)
    np.testing.assert_array_equal(found[fixed], given_heads)


@pytest.mark.parametrize("decades", [4, 8, 12, 14])
def test_flow_is_balanced_and_exact_over_many_decades(decades: int) -> None:
    """Two wide edges side by side between narrow ones: the narrow ones set the flow, 1/3 and 2/3 of it each way."""
    narrow = 10.0**-decades
    network = factorise(4, [0, 1, 1, 2], [1, 2, 2, 3], [narrow, 1.0, 2.0, narrow], [0, 3])
    total = 1.0 / (2 / narrow + 1 / 3)
    np.testing.assert_allclose(flows(network, [1.0, 0.0]), total * np.array([1, 1 / 3, 2 / 3, 1]), rtol=1e-12)


@pytest.mark.parametrize("narrow", [1e-16, 1e-17, 1e-30])
def test_more_decades_than_double_precision_are_refused(narrow: float) -> None:
    with pytest.raises(ModelError, match="span too many decades"):
        flows(factorise(4, [0, 1, 1, 2], [1, 2, 2, 3], [narrow, 1.0, 2.0, narrow], [0, 3]), [1.0, 0.0])


def test_symmetric_ring_has_no_flow_in_its_communicating_edges() -> None:
    """Mirror-symmetric ring with two feeders and two drains: the links across the mirror carry nothing."""
    tail, head = [0, 1, 2, 3, 2, 4], [2, 3, 4, 5, 3, 5]
    conductance = [3e-9, 3e-9, 1e-9, 1e-9, 7e-9, 2e-9]
    flow = flows(factorise(6, tail, head, conductance, [0, 1, 4, 5]), [12e3, 12e3, 600.0, 600.0])
    assert np.abs(flow[[4, 5]]).max() < 1e-10 * np.abs(flow).max()


def test_self_loops_and_closed_edges_carry_nothing() -> None:
    network = factorise(3, [0, 1, 1, 1], [1, 1, 2, 2], [1.0, 5.0, 0.0, 1.0], [0, 2])
    np.testing.assert_allclose(flows(network, [2.0, 0.0]), [1.0, 0.0, 0.0, 1.0], atol=1e-15)


def test_part_without_fixed_node_is_refused_or_still() -> None:
    tail, head, conductance = [0, 2, 3, 4], [1, 3, 4, 2], [1.0, 1.0, 1.0, 1.0]
    with pytest.raises(ModelError, match="node 2 and 2 more"):
        factorise(5, tail, head, conductance, [0])
    found, flow = heads_and_flows(factorise(5, tail, head, conductance, [0], still_parts=True), [7.0])
    np.testing.assert_array_equal(found, [7.0, 7.0, 0.0, 0.0, 0.0])
    np.testing.assert_array_equal(flow, 0.0)


def test_unbalanced_inflow_of_a_still_part_is_refused() -> None:
    with pytest.raises(ModelError, match="do not add up to zero"):
        steady_heads(2, [0], [1], [1.0], [], [], [1.0, -0.5])


def test_equal_heads_give_exactly_no_flow() -> None:
    tail, head, conductance = random_network(4, decades=6.0)
    found, flow = heads_and_flows(factorise(12, tail, head, conductance, [1, 8]), [1234.567, 1234.567])
    np.testing.assert_array_equal(found, 1234.567)
    np.testing.assert_array_equal(flow, 0.0)


def test_far_nodes_act_as_resistances_to_a_far_head() -> None:
    """Q = (p − p_far)/(R + R_out) with R = 1/2, R_out = 3/2, p = 10, p_far = 2: Q = 4."""
    n_nodes, tail, head, conductance = with_far_nodes(2, ([0], [1], [2.0]), [1], [2 / 3])
    found, flow = heads_and_flows(factorise(n_nodes, tail, head, conductance, [0, 2]), [10.0, 2.0])
    np.testing.assert_allclose(flow, 4.0, rtol=1e-14)
    assert found[1] == pytest.approx(8.0)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((2, [0], [2], [1.0], [0]), "outside 0…1"),
        ((2, [0], [1], [-1.0], [0]), "edge 0 is -1"),
        ((2, [0], [1], [np.nan], [0]), "edge 0 is nan"),
        ((2, [0], [1], [np.inf], [0]), "edge 0 is inf"),
        ((2, [0, 1], [1], [1.0], [0]), "must agree"),
        ((2, [0], [1], [1.0], [0, 0]), "node 0 is fixed twice"),
        ((2, [0], [1], [1.0], [5]), "fixed node lies outside"),
    ],
)
def test_impossible_networks_are_refused(arguments: tuple[Any, ...], message: str) -> None:
    with pytest.raises(ModelError, match=message):
        factorise(*arguments)


@pytest.mark.parametrize(
    ("given_heads", "inflow", "message"),
    [([1.0], None, "must agree"), ([1.0, np.nan], None, "finite"), ([1.0, 0.0], [0.0, np.inf, 0.0], "finite")],
)
def test_impossible_right_sides_are_refused(given_heads: list[float], inflow: list[float] | None, message: str) -> None:
    with pytest.raises(ModelError, match=message):
        heads(factorise(3, [0, 1], [1, 2], [1.0, 1.0], [0, 2]), given_heads, inflow)


def test_parts_are_numbered_by_their_lowest_node() -> None:
    np.testing.assert_array_equal(parts(6, [5, 1, 3], [4, 2, 3], [1.0, 1.0, 1.0]), [0, 1, 1, 2, 3, 3])


def test_parts_agree_with_networkx() -> None:
    networkx = pytest.importorskip("networkx")
    rng = np.random.default_rng(1)
    tail, head = rng.integers(0, 40, 22), rng.integers(0, 40, 22)
    graph = networkx.MultiGraph()
    graph.add_nodes_from(range(40))
    graph.add_edges_from(zip(tail.tolist(), head.tolist(), strict=True))
    label = parts(40, tail, head, np.ones(22))
    expected = {frozenset(group) for group in networkx.connected_components(graph)}
    assert {frozenset(np.flatnonzero(label == part).tolist()) for part in range(label.max() + 1)} == expected


def test_order_of_edges_does_not_move_the_result_beyond_rounding() -> None:
    tail, head, conductance = random_network(6)
    order = np.random.default_rng(0).permutation(len(tail))
    first = flows(factorise(12, tail, head, conductance, [0, 11]), [1.0, 0.0])
    second = flows(factorise(12, tail[order], head[order], conductance[order], [0, 11]), [1.0, 0.0])
    np.testing.assert_allclose(second, first[order], rtol=1e-10, atol=1e-12)
