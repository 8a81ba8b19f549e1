"""Gaps: what is bridged, asked and left, and what a bridge is made of."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import Basis, degrees
from geomprep.repair import Given, Verdict, Verdicts, join
from geomprep.repair.gaps import GapSettings, close_gaps
from geomprep.repair.matching import best_matching
from geomprep.repair.open_ends import Links

Z = np.array([0, 0, 1.0])


def straight(start: float, stop: float, x: float = 0.0) -> np.ndarray:
    count = int(2 * abs(stop - start)) + 1
    return np.linspace(start, stop, count)[:, None] * Z + [x, 0, 0]


def closed(graph, given: Given | None = None, **settings: float):
    return close_gaps(graph, GapSettings(**settings), given or Given())


def two_pieces(lines, gap: float = 4.0, radii=(1.0, 1.0), shift: float = 0.0, kind: int = 1):
    pieces = [straight(0, 20), straight(20 + gap, 40, shift)]
    return join(lines(pieces, list(radii), classes=[kind, kind])).graph


def test_a_straight_gap_is_bridged_with_the_stated_score(lines) -> None:
    result = closed(two_pieces(lines))
    (repair,) = result.repairs
    assert repair.score == pytest.approx(np.exp(-0.5 * (4 / 8) ** 2), rel=1e-9)  # d = 4 radii, no angle, equal radii
    assert (repair.choice, repair.options, repair.verdict_by) == ("bridge", ("leave", "bridge"), "rule")
    assert repair.conductance_before == 0.0
    assert repair.conductance_after == pytest.approx(np.pi / (8 * 4), rel=1e-9)
    assert (degrees(result.graph.n_points, result.graph.edges) == 1).sum() == 2
    added = result.graph.source_point < 0
    assert added.sum() == 7  # steps of half a radius
    assert (result.graph.radius_basis[added] == Basis.INTERPOLATED).all()
    assert (result.graph.edge_basis == Basis.INTERPOLATED).sum() == 8


def test_radius_of_a_bridge_is_linear_in_its_logarithm(lines) -> None:
    result = closed(two_pieces(lines, radii=(1.0, 0.8)))
    added = np.flatnonzero(result.graph.source_point < 0)
    place = result.graph.points[added, 2]
    assert result.graph.radius[added] == pytest.approx(0.8 ** ((place - 20) / 4), rel=1e-9)


@pytest.mark.parametrize(
    ("change", "why"),
    [
        ({"gap": 12.0}, "too long"),
        ({"radii": (1.0, 0.4)}, "too unlike"),
        ({"shift": 4.0}, "too far to the side"),
    ],
)
def test_what_is_left(lines, change: dict, why: str) -> None:
    result = closed(two_pieces(lines, **change))
    assert result.repairs == (), why
    assert result.graph.n_edges == two_pieces(lines, **change).n_edges


def test_a_gap_in_a_vein_is_asked_with_three_options(lines) -> None:
    graph = two_pieces(lines, kind=2)
    (repair,) = closed(graph, Given(voxel=0.6)).repairs
    assert repair.options == ("leave", "thread of one voxel", "interpolate")
    assert (repair.choice, repair.verdict_by, repair.conductance_after) == ("leave", "open", 0.0)
    thread = closed(graph, Given(Verdicts({repair.id: Verdict("thread of one voxel", "person")}), voxel=0.6))
    added = thread.graph.source_point < 0
    assert (thread.graph.radius[added] == 0.3).all()  # half of a voxel
    # the vessel on both sides keeps its radius: the thread has its own at its ends
    assert sorted(thread.graph.own_radius.tolist()) == [0.3, 0.3]
    assert thread.repairs[0].conductance_after == pytest.approx(np.pi * 0.3**4 / (8 * 4), rel=1e-9)
    assert [finding.kind for finding in thread.findings] == ["bridged by assumption"]


def test_arteries_are_never_joined_with_veins(lines) -> None:
    graph = join(lines([straight(0, 20), straight(23, 40)], 1.0, classes=[1, 2])).graph
    assert closed(graph).repairs == ()


def test_an_end_meets_the_side_of_its_parent(lines) -> None:
    """A branch of radius 1 at a right angle, from 5 off the axis of a vessel of radius 2: 3 radii outside its tube."""
    branch = np.linspace(5, 25, 41)[:, None] * [1.0, 0, 0] + 20 * Z
    graph = join(lines([straight(0, 40), branch], [2.0, 1.0])).graph
    result = closed(graph)
    (repair,) = result.repairs
    assert repair.score == pytest.approx(np.exp(-0.5 * (3 / 8) ** 2), rel=1e-6)
    count = degrees(result.graph.n_points, result.graph.edges)
    assert ((count == 1).sum(), (count == 3).sum()) == (3, 1)
    junction = result.graph.points[count == 3]
    assert junction == pytest.approx(np.array([[0, 0, 20.0]]))
    assert result.graph.own_radius.tolist() == [1.0]  # the branch does not widen to its parent


def test_the_thin_end_of_a_part_meets_no_side(lines) -> None:
    """The same branch drawn tapering towards the vessel: its root is at its other end."""
    branch = np.linspace(5, 25, 41)[:, None] * [1.0, 0, 0] + 20 * Z
    graph = join(lines([straight(0, 40), branch], [2.0, np.linspace(0.5, 1.5, 41)])).graph
    assert closed(graph).repairs == ()


def test_the_best_set_of_bridges_is_not_the_nearest_pair(lines) -> None:
    """Two vessels side by side lose the same slab; the nearest ends belong to different vessels."""
    pieces = [straight(0, 20), straight(24, 44, 0.4), straight(0, 20.8, 2.6), straight(24.8, 44, 3.0)]
    graph = join(lines(pieces, 1.0)).graph
    result = closed(graph)
    assert len(result.repairs) == 2
    count = degrees(result.graph.n_points, result.graph.edges)
    assert (count == 1).sum() == 4
    added = result.graph.points[result.graph.source_point < 0]
    assert ((added[:, 0] < 0.5) | (added[:, 0] > 2.5)).all()


def test_matching_takes_the_largest_total() -> None:
    """0–1 scores 0.9 alone; 0–2 and 1–3 score 0.8 each: together more."""
    q = 3
    zero = np.zeros(q)
    links = Links(
        np.array([0, 0, 1]), np.array([1, 2, 3]), np.array([1, 2, 3]), zero, zero, zero, zero, zero, zero, zero > 0
    )
    assert best_matching(links, np.array([0.9, 0.8, 0.8])).tolist() == [1, 2]
    assert best_matching(links, np.array([0.9, 0.4, 0.4])).tolist() == [0]


def test_a_bridge_that_closes_a_loop_needs_more(lines) -> None:
    turn = np.linspace(0.12, 2 * np.pi - 0.12, 120)
    ring = 12 * np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    graph = join(lines([ring], 1.0)).graph
    (repair,) = closed(graph).repairs
    assert "closes a loop" in repair.reason
    assert closed(graph, loop_above=1.0).repairs == ()


@pytest.mark.parametrize(
    ("settings", "rule"),
    [({"accept_above": 0.2}, "ask_above"), ({"loop_above": 1.5}, "loop_above"), ({"longest": 0.0}, "longest")],
)
def test_settings_out_of_range(settings: dict, rule: str) -> None:
    with pytest.raises(InputError, match=rule):
        GapSettings(**settings)
