"""Chains against networkx on random multigraphs."""

import itertools

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.model import chains, degrees


@st.composite
def multigraphs(draw: st.DrawFn) -> tuple[int, np.ndarray]:
    """Junctions linked by runs of points, edges shuffled and flipped; loops, parallels and rings included."""
    n_junctions = draw(st.integers(1, 5))
    edges, used = [], n_junctions
    for _ in range(draw(st.integers(1, 8))):
        a, b = draw(st.integers(0, n_junctions - 1)), draw(st.integers(0, n_junctions - 1))
        inner = draw(st.integers(0, 4))
        run = [a, *range(used, used + inner), b]
        used += inner
        edges += list(itertools.pairwise(run))
    order = draw(st.permutations(range(len(edges))))
    flips = draw(st.lists(st.booleans(), min_size=len(edges), max_size=len(edges)))
    mixed = [edges[i][::-1] if flip else edges[i] for i, flip in zip(order, flips, strict=True)]
    return used, np.array(mixed)


@given(multigraphs())
@settings(max_examples=150, derandomize=True, deadline=None)
def test_chains_cover_every_edge_once_and_stop_where_they_must(graph: tuple[int, np.ndarray]) -> None:
    n, edges = graph
    found = chains(n, edges)
    assert sorted(found.edge.tolist()) == list(range(len(edges)))
    degree = degrees(n, edges)
    loops = set(edges[edges[:, 0] == edges[:, 1], 0].tolist())
    for chain in range(found.n_chains):
        run = found.point[found.offsets[chain] : found.offsets[chain + 1]]
        used = found.edge[found.edge_offsets[chain] : found.edge_offsets[chain + 1]]
        for step, edge in enumerate(used):
            assert sorted(edges[edge]) == sorted(run[step : step + 2])
        assert (degree[run[1:-1]] == 2).all()
        for end in (run[0], run[-1]):
            assert degree[end] != 2 or end in loops or found.ring[chain]


@given(multigraphs())
@settings(max_examples=60, derandomize=True, deadline=None)
def test_number_of_loops_agrees_with_networkx(graph: tuple[int, np.ndarray]) -> None:
    n, edges = graph
    found = chains(n, edges)
    whole = nx.MultiGraph(edges.tolist())
    ends = zip(found.point[found.offsets[:-1]].tolist(), found.point[found.offsets[1:] - 1].tolist(), strict=True)
    cut = nx.MultiGraph(list(ends))

    def loops(g: nx.MultiGraph) -> int:
        return g.number_of_edges() - g.number_of_nodes() + nx.number_connected_components(g)

    assert loops(cut) == loops(whole)


def test_ring_begins_at_its_smallest_point() -> None:
    found = chains(4, np.array([[3, 1], [1, 2], [2, 3]]))
    assert found.n_chains == 1
    assert found.ring.tolist() == [True]
    assert found.point[0] == found.point[-1] == 1


def test_two_parallel_edges_form_a_ring_and_a_self_loop_is_one_chain() -> None:
    assert chains(2, np.array([[0, 1], [1, 0]])).point.tolist() == [0, 1, 0]
    assert chains(1, np.array([[0, 0]])).point.tolist() == [0, 0]


def test_stop_cuts_where_asked() -> None:
    stop = np.array([False, True, False, False])
    assert chains(4, np.array([[0, 1], [1, 2], [2, 3]]), stop).offsets.tolist() == [0, 2, 5]


@pytest.mark.parametrize("n", [10, 1000, 100_000])
def test_one_long_shuffled_line_is_one_chain(n: int) -> None:
    random = np.random.default_rng(3)
    number = random.permutation(n)
    edges = np.stack((number[:-1], number[1:]), axis=1)[random.permutation(n - 1)]
    found = chains(n, edges)
    assert found.n_chains == 1
    run = found.point if found.point[0] == number[0] else found.point[::-1]
    assert np.array_equal(run, number)
