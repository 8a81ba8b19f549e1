"""Ends on the side of another line, and ends beside ends."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable

import networkx as nx
import numpy as np
import pytest

from geomprep.model import Centrelines, PointGraph, degrees
from geomprep.repair import JoinSettings, join

Lines = Callable[..., Centrelines]
Graphs = Callable[[PointGraph], nx.MultiGraph]

TRUNK = [(0, 0, 0), (0, 0, 20), (0, 0, 40)]


def junction_degrees(graph: PointGraph) -> dict[int, int]:
    counts = Counter(degrees(graph.n_points, graph.edges).tolist())
    return {degree: count for degree, count in counts.items() if degree != 2}


@pytest.mark.parametrize(("away", "joined"), [(0.0, True), (0.15, True), (0.25, False)])
def test_end_joins_the_nearest_segment_not_the_nearest_point(lines: Lines, away: float, joined: bool) -> None:
    """The trunk has r = 2, so 0.1 r is 0.2; its points are five radii from the end."""
    result = join(lines([TRUNK, [(away, 0, 9.5), (9, 0, 9.5)]], [2.0, 1.0]))
    if not joined:
        assert junction_degrees(result.graph) == {1: 4}
        assert result.repairs == ()
        return
    assert junction_degrees(result.graph) == {3: 1, 1: 3}
    graph = result.graph
    joint = int(np.flatnonzero(degrees(graph.n_points, graph.edges) == 3)[0])
    assert graph.points[joint] == pytest.approx([0, 0, 9.5])
    assert graph.radius[joint] == pytest.approx(2.0)
    assert graph.radius_basis[joint] == 1  # interpolated
    assert graph.merged_into[3] == joint
    assert graph.source_point[joint] == 3
    # the branch keeps the radius it states at its start
    assert graph.own_radius.tolist() == [1.0]
    assert joint == graph.edges[graph.own_radius_edge[0], graph.own_radius_end[0]]
    (repair,) = result.repairs
    assert repair.kind == "T-joint"
    assert repair.raw_points == (3,)
    assert repair.conductance_before == 0.0
    assert repair.conductance_after == pytest.approx(np.pi / (8 * (9 - away)), rel=1e-9)  # π r⁴ / 8 L with r = 1
    assert f"{away / 2:.2g} of the radius" in repair.reason


def test_radius_at_a_joint_is_linear_so_that_the_profile_stays(lines: Lines) -> None:
    graph = join(lines([[(0, 0, 0), (0, 0, 30)], [(0, 0, 10), (5, 0, 10)]], [[2.0, 1.0], 0.5])).graph
    joint = degrees(graph.n_points, graph.edges) == 3
    assert graph.radius[joint] == pytest.approx(2.0 - 1.0 / 3)


def test_end_near_a_point_of_the_other_line_takes_that_point(lines: Lines) -> None:
    graph = join(lines([TRUNK, [(0.05, 0, 20.0), (9, 0, 25)]], 1.0)).graph
    assert graph.n_points == 4
    assert graph.merged_into[3] == graph.merged_into[1]
    assert graph.points[graph.merged_into[3]].tolist() == [0, 0, 20]


def test_two_ends_on_one_edge_and_two_at_one_place(lines: Lines, multigraph: Graphs) -> None:
    result = join(
        lines([TRUNK, [(0.05, 0, 5), (9, 0, 5)], [(0, 0.05, 15), (0, 9, 15)], [(0, -0.05, 5), (0, -9, 5)]], 1.0)
    )
    assert junction_degrees(result.graph) == {3: 1, 4: 1, 1: 5}
    assert nx.is_tree(nx.Graph(multigraph(result.graph)))
    step = np.diff(result.graph.points[result.graph.edges], axis=1)
    assert np.linalg.norm(step, axis=2).min() > 1.0


def test_line_that_ends_on_its_own_side_closes_a_loop(lines: Lines, multigraph: Graphs) -> None:
    turn = np.linspace(0, 2 * np.pi, 41)[:-1]
    six = np.concatenate(
        ([[0, 30, 0.0], [0, 20, 0], [0, 9, 0]], 8 * np.stack((np.sin(turn), np.cos(turn), 0 * turn), 1))
    )
    six = np.concatenate((six, [[0.03, 8.02, 0.0]]))
    result = join(lines([six], 1.0))
    assert junction_degrees(result.graph) == {3: 1, 1: 1}
    whole = multigraph(result.graph)
    assert whole.number_of_edges() - whole.number_of_nodes() + 1 == 1


def test_ring_whose_ends_nearly_meet_is_closed(lines: Lines) -> None:
    turn = np.linspace(0, 2 * np.pi, 60)
    ring = 20 * np.stack((np.cos(turn), np.sin(turn), 0.0 * turn), axis=1)
    ring[-1] += [0, 0.06, 0.02]
    result = join(lines([ring], 1.0))
    assert junction_degrees(result.graph) == {}
    (repair,) = result.repairs
    assert repair.kind == "joined ends"
    assert sorted(repair.raw_points) == [0, 59]


def test_branch_points_private_and_jittered(lines: Lines) -> None:
    rng = np.random.default_rng(11)
    tips = np.array([(0, 0, -20), (12, 0, 16), (-12, 0, 16), (0, 13, 15)])
    result = join(lines([[rng.uniform(-0.025, 0.025, 3), tip] for tip in tips], 1.0))
    assert junction_degrees(result.graph) == {4: 1, 1: 4}
    assert [repair.kind for repair in result.repairs] == ["joined ends"]


def test_lines_that_run_past_one_another_become_one(lines: Lines) -> None:
    """Two collinear lines overlap by 0.5 radii and lie 0.05 apart: one vessel of 40.5 - 0.5 radii."""
    one = np.linspace(0, 20, 21)[:, None] * [0, 0, 1.0]
    other = np.linspace(19.5, 45, 26)[:, None] * [0, 0, 1.0] + np.array([0.05, 0, 0])
    graph = join(lines([one, other], 1.0)).graph
    assert junction_degrees(graph) == {1: 2}
    length = np.linalg.norm(np.diff(graph.points[graph.edges], axis=1), axis=2).sum()
    assert length == pytest.approx(45.0, abs=0.02)


def test_branch_that_starts_inside_its_parent_leaves_no_small_loop(lines: Lines) -> None:
    """The branch begins one jittered point before its branch point."""
    trunk = np.linspace(0, 20, 41)[:, None] * [0, 0, 1.0]
    branch = [(0.03, 0, 9.5), (-0.02, 0.03, 10.1), (0.9, 0, 10.9), (5, 0, 15)]
    result = join(lines([trunk, branch], 1.0))
    assert junction_degrees(result.graph) == {3: 1, 1: 3}
    assert (result.graph.merged_into >= 0).all()
    place = result.graph.points[degrees(result.graph.n_points, result.graph.edges) == 3]
    assert place[0] == pytest.approx([0, 0, 10.1], abs=0.01)


def test_classes_never_join(lines: Lines) -> None:
    """An artery ends on the side of a vein, and beside the end of another."""
    side = join(lines([TRUNK, [(0, 0, 9.5), (9, 0, 9.5)]], 1.0, classes=[1, 2]))
    assert junction_degrees(side.graph) == {1: 4}
    ends = join(lines([TRUNK, [(0, 0, 40.05), (9, 0, 50)]], 1.0, classes=[1, 2]))
    assert junction_degrees(ends.graph) == {1: 4}
    unknown = join(lines([TRUNK, [(0, 0, 9.5), (9, 0, 9.5)]], 1.0, classes=[0, 2]))
    assert junction_degrees(unknown.graph) == {3: 1, 1: 3}
    assert "unknown class joined" in [finding.kind for finding in unknown.findings]


def test_junction_on_the_side_of_a_line_joins_within_the_tolerance(lines: Lines) -> None:
    fork = [[(0.5e-3, 0, 9.5), (9, 0, 9.5)], [(0.5e-3, 0, 9.5), (0, 9, 9.5)], [(0.5e-3, 0, 9.5), (0, -9, 3)]]
    assert junction_degrees(join(lines([TRUNK, *fork], 1.0)).graph) == {5: 1, 1: 5}
    away = [np.array(line) + np.array([0.02, 0, 0]) for line in fork]
    assert junction_degrees(join(lines([TRUNK, *away], 1.0)).graph) == {3: 1, 1: 5}


def test_joints_within_zero_leaves_ends_alone(lines: Lines) -> None:
    result = join(lines([TRUNK, [(0.05, 0, 9.5), (9, 0, 9.5)]], 1.0), JoinSettings(joints_within=0))
    assert junction_degrees(result.graph) == {1: 4}


def test_many_joints_on_lines_of_very_different_radius(lines: Lines) -> None:
    """Radii over two decades in one file: each end is held against the radius of the line that it meets."""
    rng = np.random.default_rng(5)
    given, radii, expected = [], [], 0
    for number, radius in enumerate(np.geomspace(0.1, 10, 60)):
        base = np.array([0, 0, 400.0 * number])
        given.append(base + np.linspace(-15, 15, 4)[:, None] * [radius, 0, 0])
        part = rng.uniform(0.01, 0.19)
        given.append(base + np.array([[rng.uniform(-4, 4), part, 0], [0, 9, 0]]) * radius)
        radii += [radius, 0.3 * radius]
        expected += part <= 0.1
    graph = join(lines(given, radii)).graph
    assert 20 < expected < 50
    assert np.count_nonzero(degrees(graph.n_points, graph.edges) == 3) == expected
