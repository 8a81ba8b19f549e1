"""The same vessels written differently give the same network."""

from __future__ import annotations

from collections.abc import Callable
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from geomprep.model import Centrelines, PointGraph, chains, degrees
from geomprep.repair import JoinResult, join

Lines = Callable[..., Centrelines]
Drawing = tuple[list[np.ndarray], list[np.ndarray]]

few = settings(
    max_examples=30, derandomize=True, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)


def network(result: JoinResult) -> dict[str, np.ndarray]:
    """What must not change: degrees, and length and resistance of every segment, sorted."""
    graph = result.graph
    length = np.linalg.norm(np.diff(graph.points[graph.edges], axis=1)[:, 0], axis=1)
    ends = graph.radius[graph.edges]
    ends[graph.own_radius_edge, graph.own_radius_end] = graph.own_radius
    a, b = ends.T
    resistance = 8 * length * (a * a + a * b + b * b) / (3 * np.pi * a**3 * b**3)
    cut = chains(graph.n_points, graph.edges)
    starts = cut.edge_offsets[:-1]
    return {
        "degrees": np.sort(degrees(graph.n_points, graph.edges)[np.r_[cut.point[cut.offsets[:-1]]]]),
        "points": np.array(graph.n_points),
        "length": np.sort(np.add.reduceat(length[cut.edge], starts)),
        "resistance": np.sort(np.add.reduceat(resistance[cut.edge], starts)),
        "repairs": np.sort([repair.kind for repair in result.repairs]),
    }


def same(one: dict[str, np.ndarray], other: dict[str, np.ndarray], rel: float = 1e-9) -> None:
    assert one["points"] == other["points"]
    assert one["repairs"].tolist() == other["repairs"].tolist()
    assert other["length"] == pytest.approx(one["length"], rel=rel)
    assert other["resistance"] == pytest.approx(one["resistance"], rel=rel)


@st.composite
def drawings(draw: st.DrawFn) -> Drawing:
    """A curved trunk with branches from points and from sides, copies of it, a ring and a stray line."""
    seed = draw(st.integers(0, 10**6))
    rng = np.random.default_rng(seed)
    along = np.linspace(0, 30, draw(st.integers(20, 60)))
    trunk = np.stack((along, 3 * np.sin(along / 9), 0.1 * along), axis=1)
    lines, radii = [trunk], [np.linspace(1.2, 0.8, len(trunk))]
    for number in range(draw(st.integers(1, 4))):
        place = 4 + 6 * number
        row = int(np.searchsorted(along, place))
        side = draw(st.sampled_from(["at a point", "near a point", "on the side", "one point early"]))
        base = trunk[row]
        if side == "on the side":
            base = 0.4 * trunk[row] + 0.6 * trunk[row - 1] + [0, 0, 0.05]
        elif side == "near a point":
            base = base + rng.normal(size=3) * 2e-4
        way = np.array([0.3, (-1) ** number, 0.4]) * (1 + 0.2 * rng.random())
        branch = base + np.linspace(0, 8, draw(st.integers(2, 12)))[:, None] * way
        if side == "one point early":
            branch = np.concatenate((trunk[row - 1 : row], branch))
        lines.append(branch)
        radii.append(np.full(len(branch), 0.5 + 0.1 * number))
    if draw(st.booleans()):
        lines.append(trunk[: len(trunk) // 2])
        radii.append(radii[0][: len(trunk) // 2])
    if draw(st.booleans()):
        turn = np.linspace(0, 2 * np.pi, 20)
        ring = np.stack((4 * np.cos(turn), 40 + 4 * np.sin(turn), 0 * turn), axis=1)
        ring[-1] = ring[0]
        lines.append(ring)
        radii.append(np.full(20, 0.7))
    if draw(st.booleans()):
        lines.append(np.array([(60.0, 0, 0), (60, 5, 0), (61, 9, 0)]))
        radii.append(np.array([0.3, 0.4, 0.3]))
    return lines, radii


@given(drawings(), st.randoms(use_true_random=False))
@few
def test_order_and_direction_of_lines_do_not_matter(lines: Lines, drawing: Drawing, random: object) -> None:
    places, radii = drawing
    rows = list(range(len(places)))
    random.shuffle(rows)
    turn = [random.choice([1, -1]) for _ in rows]
    one = join(lines(places, radii))
    other = join(lines([places[k][:: turn[k]] for k in rows], [radii[k][:: turn[k]] for k in rows]))
    same(network(one), network(other))
    # ids hang on raw coordinates, which have not changed
    assert [repair.id for repair in one.repairs] == [repair.id for repair in other.repairs]
    assert anchors(one.graph) == anchors(other.graph)


def anchors(graph: PointGraph) -> list[tuple[float, ...]]:
    """Raw coordinates that the points of the graph stand for, sorted."""
    return sorted(map(tuple, graph.raw_points[graph.source_point[graph.source_point >= 0]].tolist()))


@given(drawings(), st.integers(0, 10**6))
@few
def test_numbers_of_points_do_not_matter(lines: Lines, drawing: Drawing, seed: int) -> None:
    first = lines(*drawing)
    order = np.random.default_rng(seed).permutation(first.n_points)
    number = np.argsort(order)
    other = Centrelines(
        first.points[order],
        first.radius[order],
        first.raw_points[order],
        number[first.connectivity],
        first.offsets,
        first.vessel_class,
        first.input_id,
        first.radius_basis[order],
    )
    one, two = join(first), join(other)
    same(network(one), network(two))
    assert anchors(one.graph) == anchors(two.graph)


@given(drawings(), st.integers(0, 10**6))
@few
def test_splitting_lines_in_two_does_not_matter(lines: Lines, drawing: Drawing, seed: int) -> None:
    rng = np.random.default_rng(seed)
    places, radii = [], []
    for line, size in zip(*drawing, strict=True):
        cut = int(rng.integers(1, len(line) - 1)) if len(line) > 2 else 0
        places += [line[: cut + 1], line[cut:]] if cut else [line]
        radii += [size[: cut + 1], size[cut:]] if cut else [size]
    same(network(join(lines(*drawing))), network(join(lines(places, radii))))


@given(drawings(), st.integers(0, 10**6), st.sampled_from([1e-3, 1.0, 25.4]))
@few
def test_rotation_shift_and_unit_do_not_matter(lines: Lines, drawing: Drawing, seed: int, unit: float) -> None:
    rng = np.random.default_rng(seed)
    turn, shift = Rotation.random(rng=rng).as_matrix(), rng.normal(size=3) * 50
    places, radii = drawing
    one = network(join(lines(places, radii)))
    moved = join(lines([unit * (line @ turn.T + shift) for line in places], [unit * size for size in radii]))
    other = network(moved)
    other["length"], other["resistance"] = other["length"] / unit, other["resistance"] * unit**3
    same(one, other, rel=1e-7)


@pytest.mark.parametrize("seed", range(3))
def test_jittered_copies_do_not_depend_on_order_or_direction(trees: SimpleNamespace, lines: Lines, seed: int) -> None:
    places, radii = trees.sampled_tracks(trees.binary(3, seed), 0.05, seed)
    rng = np.random.default_rng(seed)
    rows, turn = rng.permutation(len(places)), rng.choice([-1, 1], len(places))
    one = join(lines(places, radii))
    other = join(lines([places[k][:: turn[k]] for k in rows], [radii[k][:: turn[k]] for k in rows]))
    same(network(one), network(other))
    assert [repair.id for repair in one.repairs] == [repair.id for repair in other.repairs]


@pytest.mark.parametrize("seed", range(3))
def test_jittered_copies_do_not_depend_on_place_or_on_splits(trees: SimpleNamespace, lines: Lines, seed: int) -> None:
    places, radii = trees.sampled_tracks(trees.binary(3, seed), 0.05, seed)
    one = network(join(lines(places, radii)))
    turn = Rotation.random(rng=np.random.default_rng(seed)).as_matrix()
    same(one, network(join(lines([line @ turn.T + [1.0, -2.0, 3.0] for line in places], radii))), rel=1e-7)
    halves = [half for line in places for half in (line[: len(line) // 3 + 1], line[len(line) // 3 :])]
    sizes = [half for size in radii for half in (size[: len(size) // 3 + 1], size[len(size) // 3 :])]
    same(one, network(join(lines(halves, sizes))))


@pytest.mark.parametrize("seed", range(3))
def test_joining_what_is_joined_changes_nothing(trees: SimpleNamespace, lines: Lines, seed: int) -> None:
    """The graph of fused tracks, written out edge by edge and joined again, needs no repair."""
    graph = join(lines(*trees.sampled_tracks(trees.binary(3, seed), 0.05, seed))).graph
    ends = graph.radius[graph.edges]
    ends[graph.own_radius_edge, graph.own_radius_end] = graph.own_radius
    again = join(lines(list(graph.points[graph.edges]), list(ends)))
    assert again.repairs == ()
    assert again.graph.n_points == graph.n_points
    assert trees.input_resistance(again.graph) == pytest.approx(trees.input_resistance(graph), rel=1e-12)


@given(drawings())
@few
def test_every_raw_point_is_accounted_for(lines: Lines, drawing: Drawing) -> None:
    result = join(lines(*drawing))
    graph = result.graph
    assert ((graph.merged_into >= 0) & (graph.merged_into < graph.n_points)).all()
    known = graph.source_point >= 0
    assert (graph.merged_into[graph.source_point[known]] == np.flatnonzero(known)).all()
    for point in np.flatnonzero(known):  # the raw point whose coordinates come first stands for all that merged
        members = graph.raw_points[graph.merged_into == point]
        assert tuple(graph.raw_points[graph.source_point[point]]) == min(map(tuple, members))
    step = np.linalg.norm(np.diff(graph.points[graph.edges], axis=1)[:, 0], axis=1)
    assert step.min() > 1e-4
    assert (degrees(graph.n_points, graph.edges) > 0).all()
