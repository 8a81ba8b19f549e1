"""Splitting: topology, order, ends and stations."""

import numpy as np
import pytest

from geomprep.segments import leave_out_unreached, resample, split

Y_POINTS = [[0, 0, 0], [1, 0, 0], [2, 0, 0], [3, 1, 0], [3, -1, 0]]
Y_EDGES = [[0, 1], [1, 2], [2, 3], [4, 2]]


def test_y_has_three_segments_four_nodes(make_graph) -> None:
    network = split(make_graph(Y_POINTS, Y_EDGES))
    assert len(network.nodes) == 4
    assert len(network.segments) == 3
    assert network.nodes.role.tolist() == [2, 1, 2, 2]  # raw order: x = 0, the fork at x = 2, then y = −1, +1
    lengths = network.stations.distance[network.stations.offsets[1:] - 1]
    assert sorted(lengths.tolist()) == pytest.approx([2**0.5, 2**0.5, 2])


def test_ring_parallel_and_self_loop(make_graph) -> None:
    ring = split(make_graph([[0, 0, 0], [1, 0, 0], [0, 1, 0]], [[0, 1], [1, 2], [2, 0]]))
    assert (len(ring.nodes), len(ring.segments)) == (1, 1)
    assert ring.stations.distance[-1] == pytest.approx(2 + 2**0.5)
    pair = split(
        make_graph(
            [[0, 0, 0], [1, 0, 0], [2, 1, 0], [2, -1, 0], [3, 0, 0], [4, 0, 0]],
            [[0, 1], [1, 2], [2, 4], [1, 3], [3, 4], [4, 5]],
        )
    )
    assert len(pair.segments) == 4
    assert len(set(pair.segments.id)) == 4
    tadpole = split(make_graph([[0, 0, 0], [1, 0, 0], [2, 1, 0], [2, 0, 0]], [[0, 1], [1, 2], [2, 3], [3, 1]]))
    assert (tadpole.segments.from_node == tadpole.segments.to_node).sum() == 1


def test_order_of_points_and_edges_leaves_no_trace(make_graph) -> None:
    random = np.random.default_rng(5)
    reference = split(make_graph(Y_POINTS, Y_EDGES, radius=[3, 2, 2, 1, 1.5]))
    for _ in range(20):
        shuffle = random.permutation(5)
        edges = np.argsort(shuffle)[np.array(Y_EDGES)][random.permutation(4)]
        flip = random.random(4) < 0.5
        edges[flip] = edges[flip][:, ::-1]
        other = split(make_graph(np.array(Y_POINTS)[shuffle], edges, radius=np.array([3, 2, 2, 1, 1.5])[shuffle]))
        assert other.segments.id.tolist() == reference.segments.id.tolist()
        assert other.nodes.id.tolist() == reference.nodes.id.tolist()
        assert np.array_equal(other.stations.position, reference.stations.position)
        assert np.array_equal(other.stations.radius, reference.stations.radius)


def test_own_radius_at_an_end_is_kept(make_graph) -> None:
    # the branch 2→3 says radius 0.4 where the trunk says 1.0
    network = split(make_graph(Y_POINTS, Y_EDGES, radius=[1, 1, 1, 0.4, 1], own=[(2, 0, 0.4)]))
    stations = network.stations
    ends = stations.radius[np.concatenate((stations.offsets[:-1], stations.offsets[1:] - 1))]
    assert sorted(ends.tolist()) == pytest.approx([0.4, 0.4, 1, 1, 1, 1])


def test_resampling_keeps_ends_and_marks_what_is_new(make_graph) -> None:
    network = split(make_graph([[0, 0, 0], [1, 0, 0], [4, 0, 0]], [[0, 1], [1, 2]], radius=[2, 1, 1]))
    fine = resample(network, 0.5).stations
    assert fine.distance.tolist() == pytest.approx(np.linspace(0, 4, 9).tolist())
    assert fine.radius.tolist() == pytest.approx([2, 1.5, 1, 1, 1, 1, 1, 1, 1])
    assert fine.basis.tolist() == [0, 1, 0, 1, 1, 1, 1, 1, 0]
    # the median of the three radii is 1, so half a radius is the same spacing
    assert np.array_equal(resample(network, 0.5, in_radii=True).stations.distance, fine.distance)


def test_a_part_without_inlet_is_left_out_on_record(make_graph) -> None:
    points = [[0, 0, 0], [1, 0, 0], [0, 5, 0], [1, 5, 0], [0, 6, 0]]
    network = split(make_graph(points, [[0, 1], [2, 3], [3, 4], [4, 2]], radius=0.1))
    inlet = np.flatnonzero(network.nodes.position[:, 1] == 0)[:1]
    left = leave_out_unreached(network, inlet, np.array(points, dtype=float))
    assert len(left.network.segments) == 1
    assert left.network.nodes.position[:, 1].tolist() == [0, 0]
    (record,) = left.repairs
    assert record.kind == "unreached part"
    # a triangle of sides 1, √2, 1
    assert f"{1e3 * (2 + 2**0.5):.1f} mm" in record.reason
    assert leave_out_unreached(left.network, np.array([0]), np.array(points, dtype=float)).repairs == ()
