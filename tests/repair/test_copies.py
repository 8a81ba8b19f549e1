"""Tracks that repeat a trunk: exactly, and each in its own way."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from types import SimpleNamespace

import networkx as nx
import numpy as np
import pytest

from geomprep.model import Centrelines, PointGraph, degrees
from geomprep.repair import JoinSettings, Verdict, Verdicts, join

Lines = Callable[..., Centrelines]
Graphs = Callable[[PointGraph], nx.MultiGraph]


def junction_degrees(graph: PointGraph) -> dict[int, int]:
    """Number of points of each degree other than 2."""
    counts = Counter(degrees(graph.n_points, graph.edges).tolist())
    return {degree: count for degree, count in counts.items() if degree != 2}


@pytest.mark.parametrize("levels", [1, 3, 5])
def test_exact_copies_give_the_tree_to_the_last_digits(trees: SimpleNamespace, lines: Lines, levels: int) -> None:
    tree = trees.binary(levels, seed=levels)
    given = lines(*trees.exact_tracks(tree))
    result = join(given)
    assert junction_degrees(result.graph) == {3: 2**levels - 1, 1: 2**levels + 1}
    assert result.graph.n_points == 1 + 14 * len(tree.parent)
    assert trees.input_resistance(result.graph) == pytest.approx(stepped_resistance(tree), rel=1e-10)
    assert result.repairs == ()
    assert (result.graph.merged_into >= 0).all()


def stepped_resistance(tree: object) -> float:
    """Input resistance when each branch's first of 14 steps leads from its parent's radius to its own.

    A cone frustum has R = 8 µ h (a² + ab + b²) / (3 π a³ b³).
    """

    def own(branch: int) -> float:
        step = tree.length[branch] / 14
        b = tree.radius[branch]
        a = tree.radius[tree.parent[branch]] if tree.parent[branch] >= 0 else b
        return 8 / np.pi * (step * (a * a + a * b + b * b) / (3 * a**3 * b**3) + 13 * step / b**4)

    def below(branch: int) -> float:
        children = np.flatnonzero(tree.parent == branch)
        return own(branch) + (1 / sum(1 / below(child) for child in children) if len(children) else 0.0)

    return below(0)


def test_fifty_exact_copies_of_one_trunk(trees: SimpleNamespace, lines: Lines) -> None:
    tree = trees.binary(1, seed=7)
    tracks, radii = trees.exact_tracks(tree)
    result = join(lines(tracks * 25, radii * 25))
    assert junction_degrees(result.graph) == {3: 1, 1: 3}
    assert trees.input_resistance(result.graph) == pytest.approx(stepped_resistance(tree), rel=1e-10)
    doubled = next(finding for finding in result.findings if finding.kind == "doubled edges")
    assert "up to 50 times" in doubled.message


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize(("levels", "times"), [(1, 25), (3, 2), (5, 1)])
def test_jittered_copies_give_the_tree_within_three_percent(
    trees: SimpleNamespace, lines: Lines, multigraph: Graphs, levels: int, times: int, seed: int
) -> None:
    tree = trees.binary(levels, seed)
    result = join(lines(*trees.sampled_tracks(tree, 0.05, seed + 50, times=times)))
    assert junction_degrees(result.graph) == {3: 2**levels - 1, 1: 2**levels + 1}
    assert nx.is_tree(nx.Graph(multigraph(result.graph)))
    assert trees.input_resistance(result.graph) == pytest.approx(tree.input_resistance(), rel=0.03)
    assert len(result.repairs) >= 2**levels * times - 1
    assert (result.graph.merged_into >= 0).all()


@pytest.mark.parametrize("spacing", [0.3, 1.3])
@pytest.mark.parametrize("jitter", [0.0, 0.05])
def test_finer_and_coarser_samples(trees: SimpleNamespace, lines: Lines, jitter: float, spacing: float) -> None:
    tree = trees.binary(3, 2)
    result = join(lines(*trees.sampled_tracks(tree, jitter, 3, spacing)))
    assert junction_degrees(result.graph) == {3: 7, 1: 9}
    assert trees.input_resistance(result.graph) == pytest.approx(tree.input_resistance(), rel=0.03)


def test_three_branches_that_leave_at_one_place_leave_one_junction(trees: SimpleNamespace, lines: Lines) -> None:
    fork = np.array([0, 0, 60e-3])
    ways = [np.array([np.sin(0.7) * np.cos(turn), np.sin(0.7) * np.sin(turn), np.cos(0.7)]) for turn in (0, 2, 4)]
    tree = trees.Tree(
        start=np.array([np.zeros(3), fork, fork, fork]),
        end=np.array([fork, *[fork + 40e-3 * way for way in ways]]),
        radius=np.array([4e-3, 2.5e-3, 2.7e-3, 3e-3]),
        parent=np.array([-1, 0, 0, 0]),
    )
    result = join(lines(*trees.sampled_tracks(tree, 0.05, 4, times=3)))
    assert junction_degrees(result.graph) == {4: 1, 1: 4}
    assert trees.input_resistance(result.graph) == pytest.approx(tree.input_resistance(), rel=0.03)


def test_repair_states_conductance_of_both_and_of_one(lines: Lines) -> None:
    """A tube of 20 mm and r = 1 mm drawn twice: π r⁴ / (8 L) = 1.9635e-11 m³/(Pa·s) at 1 Pa·s, twice at first."""
    one = np.linspace(0, 20e-3, 21)[:, None] * [0, 0, 1.0]
    other = np.linspace(0, 20e-3, 34)[:, None] * [0, 0, 1.0] + [0.03e-3, 0, 0]
    result = join(lines([one, other], 1e-3))
    (repair,) = result.repairs
    assert repair.kind == "fused copies"
    assert repair.conductance_before == pytest.approx(2 * 1.9634954e-11, rel=1e-6)
    assert repair.conductance_after == pytest.approx(1.9634954e-11, rel=1e-6)
    assert (repair.choice, repair.options, repair.verdict_by) == ("fuse", ("leave", "fuse"), "rule")
    assert "20 radii" in repair.reason
    # the kept line moves half way between both
    inner = result.graph.points[degrees(result.graph.n_points, result.graph.edges) == 2]
    assert inner[:, 0] == pytest.approx(0.015e-3, abs=1e-9)
    assert sorted(repair.raw_points) == list(range(21))


def test_radius_of_the_fused_run_is_the_geometric_mean(lines: Lines) -> None:
    one = np.linspace(0, 20e-3, 21)[:, None] * [0, 0, 1.0]
    other = np.linspace(0, 20e-3, 34)[:, None] * [0, 0, 1.0]
    graph = join(lines([one, other], [1e-3, 1.21e-3])).graph
    inner = degrees(graph.n_points, graph.edges) == 2
    assert graph.radius[inner] == pytest.approx(1.1e-3)
    assert (graph.radius_basis[inner] == 0).all()  # measured


def test_crossing_and_parallel_vessels_stay(lines: Lines) -> None:
    along = np.linspace(-20, 20, 41)[:, None]
    straight = along * [1.0, 0, 0]
    for angle in (10, 20, 45, 90):
        turn = np.radians(angle)
        crossing = along * [np.cos(turn), np.sin(turn), 0] + [0.013, 0.002, 0.05]
        assert join(lines([straight, crossing], 1.0)).repairs == ()
    for apart in (0.5, 1.0, 2.0):
        assert join(lines([straight, straight + np.array([0, apart, 0])], 1.0)).repairs == ()


def test_branches_at_a_small_angle_stay(lines: Lines) -> None:
    along = np.linspace(0, 20, 61)[:, None]
    for angle in (8, 12, 20):
        turn = np.radians(angle)
        pair = [along * [np.cos(turn / 2), sign * np.sin(turn / 2), 0] for sign in (-1, 1)]
        result = join(lines([*pair, along * [-1.0, 0, 0]], 1.0))
        assert result.repairs == ()
        assert junction_degrees(result.graph) == {3: 1, 1: 3}


def test_veins_are_fused_only_within_the_tolerance(lines: Lines) -> None:
    one = np.linspace(0, 20, 21)[:, None] * [0, 0, 1.0]
    other = np.linspace(0, 20, 34)[:, None] * [0, 0, 1.0]
    exact = join(lines([one, other], 1.0, classes=[2, 2]))
    assert [repair.kind for repair in exact.repairs] == ["fused copies"]
    assert junction_degrees(exact.graph) == {1: 2}
    beside = join(lines([one, other + np.array([0.04, 0, 0])], 1.0, classes=[2, 2]))
    (question,) = beside.repairs
    assert (question.kind, question.choice, question.verdict_by) == ("overlapping veins", "leave", "open")
    assert junction_degrees(beside.graph) == {1: 4}
    decided = Verdicts({question.id: Verdict("fuse", "person")})
    fused = join(lines([one, other + np.array([0.04, 0, 0])], 1.0, classes=[2, 2]), verdicts=decided)
    assert junction_degrees(fused.graph) == {1: 2}
    assert [finding.kind for finding in beside.findings] == ["overlapping veins"]


def test_copies_of_different_classes_stay_and_unknown_ones_fuse(lines: Lines) -> None:
    one = np.linspace(0, 20, 21)[:, None] * [0, 0, 1.0]
    other = np.linspace(0, 20, 34)[:, None] * [0, 0, 1.0] + [0.04, 0, 0]
    assert join(lines([one, other], 1.0, classes=[1, 2])).repairs == ()
    mixed = join(lines([one, other], 1.0, classes=[1, 0]))
    assert len(mixed.repairs) == 1
    assert any("between a line without class and one with" in finding.message for finding in mixed.findings)


def test_copies_within_zero_leaves_everything(lines: Lines) -> None:
    one = np.linspace(0, 20, 21)[:, None] * [0, 0, 1.0]
    result = join(lines([one, one[::2] + np.array([0.01, 0, 0])], 1.0), JoinSettings(copies_within=0, joints_within=0))
    assert junction_degrees(result.graph) == {1: 4}


def test_every_second_point_of_the_same_curve_is_a_copy(lines: Lines) -> None:
    turn = np.linspace(0, np.pi, 81)
    arc = 20 * np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    result = join(lines([arc, arc[::2], arc[::4]], 1.0))
    assert junction_degrees(result.graph) == {1: 2}
    assert result.graph.n_edges == 80


def test_copy_that_runs_the_other_way_and_longer_at_both_ends(lines: Lines) -> None:
    one = np.linspace(0, 20, 27)[:, None] * [0, 0, 1.0]
    other = np.linspace(26, -6, 39)[:, None] * [0, 0, 1.0] + [0.03, 0, 0]
    graph = join(lines([one, other], 1.0)).graph
    assert junction_degrees(graph) == {1: 2}
    assert np.ptp(graph.points[:, 2]) == pytest.approx(32.0)


def test_two_tracks_that_share_only_their_middle(lines: Lines) -> None:
    """Two inlets, a trunk of 30 radii, two outlets, drawn as two tracks: one trunk, two junctions."""
    along = np.linspace(0, 15, 16)[:, None]
    trunk = np.linspace(0, 30, 31)[1:-1, None] * [0, 0, 1.0]
    tracks = []
    for sign, shift in ((1, 0.0), (-1, 0.37)):
        before = along[::-1] * [sign * 0.6, 0, -0.8]
        after = np.array([0, 0, 30.0]) + along * [0, sign * 0.6, 0.8]
        tracks.append(np.concatenate((before, trunk + np.array([0.04 * sign, 0, shift]), after)))
    result = join(lines(tracks, 1.0))
    assert junction_degrees(result.graph) == {3: 2, 1: 4}
    (repair,) = result.repairs
    assert "(30 radii)" in repair.reason


def test_doubled_vein_left_to_a_person_is_not_joined_at_its_ends(lines: Lines) -> None:
    """A copy 0.06 radii beside a part of a vein: undecided, so drawn as it came, and said to be cut off."""
    one = np.linspace(0, 40, 41)[:, None] * [0, 0, 1.0]
    copy = np.linspace(10.2, 30.2, 34)[:, None] * [0, 0, 1.0] + np.array([0.06, 0, 0])
    result = join(lines([one, copy], 1.0, classes=[2, 2]))
    assert junction_degrees(result.graph) == {1: 4}
    assert [(repair.kind, repair.verdict_by) for repair in result.repairs] == [("overlapping veins", "open")]
    assert [finding.kind for finding in result.findings] == ["overlapping veins"]
    arteries = join(lines([one, copy], 1.0))
    assert junction_degrees(arteries.graph) == {1: 2}


def test_vein_that_overlaps_its_continuation_by_one_radius_joins_it(lines: Lines) -> None:
    one = np.linspace(0, 20, 21)[:, None] * [0, 0, 1.0]
    other = np.linspace(19.1, 45, 27)[:, None] * [0, 0, 1.0] + np.array([0.05, 0, 0])
    result = join(lines([one, other], 1.0, classes=[2, 2]))
    assert junction_degrees(result.graph) == {1: 2}
    assert [repair.kind for repair in result.repairs] == ["T-joint"]


@pytest.mark.parametrize("apart", [0.25, 0.5, 1.0])
def test_a_short_piece_between_two_forks_is_no_copy_of_itself(lines: Lines, apart: float) -> None:
    """Two branches that leave a trunk close to one another: what lies between them stays, and all hangs together."""
    trunk = np.linspace(0, 30, 121)[:, None] * [0, 0, 1.0]
    forks = ((15.0, 1.0), (15.0 + apart, -1.0))
    branches = [np.array([0, 0, z]) + np.linspace(0, 9, 19)[:, None] * [x, 0, 0.5] for z, x in forks]
    graph = join(lines([trunk, *branches], 1.0)).graph
    assert junction_degrees(graph) == {1: 4, 3: 2}
    assert nx.is_connected(nx.Graph(graph.edges.tolist()))
