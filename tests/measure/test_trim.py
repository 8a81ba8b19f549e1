"""What lies inside a parent is taken off: length, resistance and volume follow, nodes stay."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from geomprep.measure import Convention, ZoneSettings, junction_zones, measure_segments, trimmed
from geomprep.model import Network, Nodes, Segments, Stations


def fork(angle: float, parent: float = 2e-3, branch: float = 1e-3, length: float = 40e-3, count: int = 81) -> Network:
    """A trunk in two halves along x and a branch at an angle, straight and each of one radius."""
    way = np.array([np.cos(np.radians(angle)), np.sin(np.radians(angle)), 0])
    at = np.array([[-40e-3, 0, 0], [0, 0, 0], [40e-3, 0, 0], length * way])
    ends, radii = np.array([[0, 1], [1, 2], [1, 3]]), (parent, parent, branch)
    part = np.linspace(0, 1, count)
    position = np.concatenate([at[a] + part[:, None] * (at[b] - at[a]) for a, b in ends])
    size = np.linalg.norm(at[ends[:, 1]] - at[ends[:, 0]], axis=1)
    stations = Stations(
        np.arange(0, 3 * count + 1, count),
        np.concatenate([part * one for one in size]),
        position,
        np.repeat(radii, count),
        np.zeros(3 * count),
    )
    zero, names = np.zeros(3, int), ["a", "b", "c"]
    segments = Segments(names, names, ends[:, 0], ends[:, 1], zero, zero, zero, zero, zero)
    return Network(Nodes(list("ijkl"), at, np.zeros(4), np.zeros(4), np.arange(4)), segments, stations)


def cut(network: Network, convention: Convention = Convention.LUMEN_EXIT) -> Network:
    return measure_segments(trimmed(network, junction_zones(network, ZoneSettings(convention))))


@pytest.mark.parametrize("angle", [30.0, 45.0, 60.0, 90.0])
def test_a_branch_starts_where_its_axis_leaves_the_parent(angle: float) -> None:
    """The axis leaves a straight tube of radius R at R / sin(angle); what is left has Poiseuille's ∫ds/r⁴ of its length."""
    network = fork(angle)
    found = cut(network)
    exit_at = 2e-3 / np.sin(np.radians(angle))
    assert found.cuts.at_from == pytest.approx([0, 0, exit_at], rel=1e-9)
    assert found.cuts.at_to.tolist() == [0, 0, 0]
    assert found.measures.length[2] == pytest.approx(40e-3 - exit_at, rel=1e-9)
    assert found.measures.inverse_fourth_power[2] == pytest.approx((40e-3 - exit_at) / 1e-12, rel=1e-9)
    assert found.cuts.share_inside[2] == pytest.approx(exit_at / 40e-3, rel=1e-9)
    first = found.stations.offsets[2]
    assert found.stations.distance[first] == 0.0
    assert np.linalg.norm(found.stations.position[first]) == pytest.approx(exit_at, rel=1e-9)
    assert (found.nodes.position == network.nodes.position).all()


def test_segments_that_lose_nothing_keep_their_stations_to_the_bit() -> None:
    network = fork(60.0)
    found = cut(network)
    for name in ("distance", "position", "radius"):
        one, other = getattr(found.stations, name), getattr(network.stations, name)
        assert one[:162].tobytes() == other[:162].tobytes()
    untouched = cut(network, Convention.NODE)
    assert untouched.stations is network.stations
    assert untouched.cuts.convention == "node"


def test_distances_stay_those_between_stations() -> None:
    found = cut(fork(37.0))
    stations = found.stations
    for row in range(3):
        rows = slice(stations.offsets[row], stations.offsets[row + 1])
        step = np.linalg.norm(np.diff(stations.position[rows], axis=0), axis=1)
        assert np.diff(stations.distance[rows]) == pytest.approx(step, rel=1e-9)
        assert (step > 0).all()


def test_a_short_branch_keeps_half_and_is_a_link() -> None:
    """3 mm of which 2 mm lie inside: half is kept as a resistance."""
    found = cut(fork(90.0, length=3e-3, count=13))
    assert found.measures.length[2] == pytest.approx(1.5e-3, rel=1e-9)
    assert found.cuts.link.tolist() == [0, 0, 1]
    assert found.measures.inverse_fourth_power[2] == pytest.approx(1.5e-3 / 1e-12, rel=1e-9)


def test_turning_a_segment_round_turns_its_cut_round() -> None:
    network = fork(50.0)
    stations, segments = network.stations, network.segments
    rows = np.concatenate((np.arange(162), np.arange(242, 161, -1)))
    distance = np.where(rows >= 162, 40e-3 - stations.distance[rows], stations.distance[rows])
    turned = replace(
        network,
        segments=replace(segments, from_node=np.array([0, 1, 3]), to_node=np.array([1, 2, 1])),
        stations=Stations(
            stations.offsets, distance, stations.position[rows], stations.radius[rows], stations.basis[rows]
        ),
    )
    one, other = cut(network), cut(turned)
    assert other.cuts.at_to[2] == pytest.approx(one.cuts.at_from[2], rel=1e-9)
    assert other.measures.length == pytest.approx(one.measures.length, rel=1e-9)
