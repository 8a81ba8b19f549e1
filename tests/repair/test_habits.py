"""What different producers of centrelines do, and what must come out."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable

import networkx as nx
import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import Centrelines, PointGraph, chains, degrees
from geomprep.repair import join
from geomprep.repair.parts import PartSettings, report_parts
from geomprep.repair.steps import Given

Lines = Callable[..., Centrelines]
Graphs = Callable[[PointGraph], nx.MultiGraph]


def junction_degrees(graph: PointGraph) -> dict[int, int]:
    counts = Counter(degrees(graph.n_points, graph.edges).tolist())
    return {degree: count for degree, count in counts.items() if degree != 2}


def radius_at(graph: PointGraph, edge: int, end: int) -> float:
    """Radius that a station at an end of an edge has."""
    own = (graph.own_radius_edge == edge) & (graph.own_radius_end == end)
    return float(graph.own_radius[own][0]) if own.any() else float(graph.radius[graph.edges[edge, end]])


def edge_between(graph: PointGraph, one: int, other: int) -> tuple[int, int]:
    """Edge between two raw points, and which of its ends is the first."""
    a, b = graph.merged_into[[one, other]]
    (edge,) = np.flatnonzero((np.sort(graph.edges, axis=1) == sorted((a, b))).all(axis=1))
    return int(edge), int(graph.edges[edge, 0] != a)


def test_branch_that_repeats_its_branch_point_with_its_own_radius(lines: Lines) -> None:
    given = lines([[(0, 0, 0), (0, 0, 5), (0, 0, 10)], [(0, 0, 5), (4, 0, 8), (8, 0, 9)]], [2.0, 1.0])
    graph = join(given).graph
    assert junction_degrees(graph) == {3: 1, 1: 3}
    assert graph.radius[graph.merged_into[1]] == 2.0
    assert len(graph.own_radius) == 1
    assert radius_at(graph, *edge_between(graph, 3, 4)) == 1.0
    assert radius_at(graph, *edge_between(graph, 1, 2)) == 2.0


def test_branch_that_starts_one_point_before_its_branch_point(lines: Lines) -> None:
    """The doubled first step keeps the parent's radius; the branch keeps its own from the branch point on."""
    given = lines([[(0, 0, k) for k in range(11)], [(0, 0, 4), (0, 0, 5), (4, 0, 8), (8, 0, 9)]], [2.0, 1.0])
    result = join(given)
    graph = result.graph
    assert junction_degrees(graph) == {3: 1, 1: 3}
    assert [finding.kind for finding in result.findings] == ["doubled edges"]
    assert graph.radius[graph.merged_into[:11]].tolist() == [2.0] * 11
    assert radius_at(graph, *edge_between(graph, 12, 13)) == 1.0


def test_radius_on_lines_only(lines: Lines) -> None:
    """Two-point lines with one radius each: a point between two has √(r₁ r₂), a junction keeps each its own."""
    steps = [[(0, 0, 0), (0, 0, 5)], [(0, 0, 5), (0, 0, 10)], [(0, 0, 10), (4, 0, 14)], [(0, 0, 10), (-4, 0, 14)]]
    given = lines(steps, 7.0, line_radius=[4.0, 1.0, 0.5, 0.25])
    graph = join(given).graph
    assert graph.radius[graph.merged_into[0]] == 4.0
    assert graph.radius[graph.merged_into[1]] == pytest.approx(2.0)
    assert graph.radius[graph.merged_into[3]] == 1.0
    assert radius_at(graph, *edge_between(graph, 4, 5)) == 0.5
    assert radius_at(graph, *edge_between(graph, 6, 7)) == 0.25
    assert graph.radius[graph.merged_into[7]] == 0.25


def test_bad_radius_on_a_line_is_refused(lines: Lines) -> None:
    steps = [[(0, 0, 0), (0, 0, 5)], [(0, 0, 5), (0, 0, 10)]]
    with pytest.raises(InputError, match=r"the radius of 1 of 2 lines is not above zero: line 1 \(-0.5 m\)"):
        join(lines(steps, 1.0, line_radius=[1.0, -0.5]))
    with pytest.raises(InputError, match=r"line 0 \(nan m\)"):
        join(lines(steps, 1.0, line_radius=[np.nan, 0.5]))


def test_root_of_degree_two_with_two_radii(lines: Lines) -> None:
    result = join(lines([[(0, 0, 0), (0, 0, 9)], [(0, 0, 0), (0, 0, -9)]], [4.0, 1.0]))
    assert junction_degrees(result.graph) == {1: 2}
    assert result.graph.radius[result.graph.merged_into[0]] == pytest.approx(2.0)
    (finding,) = result.findings
    assert finding.kind == "radius step"
    assert finding.value == pytest.approx(4.0)


def test_junction_of_degree_ten(lines: Lines) -> None:
    turn = np.arange(10) * 2 * np.pi / 10
    graph = join(lines([[(0, 0, 0), (9 * np.cos(t), 9 * np.sin(t), 3)] for t in turn], 1.0)).graph
    assert junction_degrees(graph) == {10: 1, 1: 10}


def test_closed_rings_self_loops_and_parallel_segments(lines: Lines, multigraph: Graphs) -> None:
    turn = np.linspace(0, 2 * np.pi, 33)
    ring = 10 * np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    ring[-1] = ring[0]
    loop = ring + np.array([40.0, 0, 0])
    stem = [(50, 0, 0), (70, 0, 0)]
    arms = [[(100, 0, 0), (110, y, 0), (120, 0, 0)] for y in (-6, 0, 6)]
    ends = [[(90, 0, 0), (100, 0, 0)], [(120, 0, 0), (130, 0, 0)]]
    graph = join(lines([ring, loop, stem, *arms, *ends], 1.0)).graph
    cut = chains(graph.n_points, graph.edges)
    assert np.count_nonzero(cut.ring) == 1
    assert junction_degrees(graph) == {3: 1, 4: 2, 1: 3}
    whole = multigraph(graph)
    loops = whole.number_of_edges() - whole.number_of_nodes() + nx.number_connected_components(whole)
    assert loops == 1 + 1 + 2


def test_line_that_turns_back_on_itself_counts_once(lines: Lines) -> None:
    result = join(lines([[(0, 0, 0), (0, 0, 5), (0, 0, 9), (0, 0, 5), (4, 0, 5)]], 1.0))
    assert junction_degrees(result.graph) == {3: 1, 1: 3}
    assert "doubled edges" in [finding.kind for finding in result.findings]


def test_shuffled_two_point_lines_give_the_same_network_as_poly_lines(lines: Lines, multigraph: Graphs) -> None:
    rng = np.random.default_rng(3)
    turn = np.linspace(0, 1.5 * np.pi, 40)
    arc = 15 * np.stack((np.cos(turn), np.sin(turn), 0.1 * turn), axis=1)
    whole = [arc, [arc[10], arc[10] + [9, 0, 9]], [arc[25], arc[25] + [0, 0, 5], arc[25] + [3, 0, 12]]]
    steps = [(line[k], line[k + 1]) for line in whole for k in range(len(line) - 1)]
    soup = [steps[k][:: rng.choice([-1, 1])] for k in rng.permutation(len(steps))]
    one, other = join(lines(whole, 1.0)).graph, join(lines(soup, 1.0)).graph
    assert nx.is_isomorphic(nx.Graph(multigraph(one)), nx.Graph(multigraph(other)))
    # the edges of the soup come out head to tail
    follows = other.edges[:-1, 1] == other.edges[1:, 0]
    assert np.count_nonzero(follows) >= other.n_edges - 5


def test_second_small_component_is_named(lines: Lines) -> None:
    graph = join(lines([[(0, 0, 0), (0, 0, 90)], [(30, 0, 0), (30, 0, 6)], [(60, 0, 0), (60, 0, 2)]], 1.0)).graph
    assert [part.value for part in report_parts(graph, PartSettings(), Given()).findings] == [6.0, 2.0]


def test_arteries_and_veins_are_both_main_parts(lines: Lines) -> None:
    graph = join(lines([[(0, 0, 0), (0, 0, 90)], [(30, 0, 0), (30, 0, 6)]], 1.0, classes=[1, 2])).graph
    assert report_parts(graph, PartSettings(), Given()).findings == ()


def test_many_parts_are_summed_up(lines: Lines) -> None:
    graph = join(lines([[(9 * k, 0, 0), (9 * k, 0, 5)] for k in range(150)], 1.0)).graph
    findings = report_parts(graph, PartSettings(), Given()).findings
    assert len(findings) == 101
    assert "49 smaller parts more: length 2.45e+05 mm" in findings[-1].message
