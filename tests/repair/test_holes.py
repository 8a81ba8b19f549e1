"""Two arms of one vessel are filled with their conductance kept; loops with room between the arms stay."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.repair import Given, join
from geomprep.repair.branches import Branches, conductance
from geomprep.repair.holes import HoleSettings, fill_holes


def split_vessel(lines, out: float, length: float = 4.0, own: float = 0.7, kind: int = 1):
    """A vessel of radius 1 along z whose middle is two arms, each up to `out` off the axis."""
    z = np.linspace(0, length, 9)
    wave = out * np.sin(np.pi * z / length)
    arms = [np.stack((sign * wave, 0 * z, 10 + z), axis=1) for sign in (1.0, -1.0)]
    ends = [
        np.linspace(0, 10, 21)[:, None] * [0, 0, 1.0],
        (10 + length + np.linspace(0, 10, 21))[:, None] * [0, 0, 1.0],
    ]
    inner = np.full(9, own)
    inner[[0, -1]] = 1.0
    return join(lines([*ends, *arms], [1.0, 1.0, inner, inner], classes=[kind] * 4)).graph


def test_arms_that_overlap_become_one_vessel_of_both_conductances(lines) -> None:
    graph = split_vessel(lines, 0.4)
    branches = Branches.of(graph)
    arms = np.flatnonzero(branches.length < 6)
    both = branches.chain_conductance(arms).sum()
    result = fill_holes(graph, HoleSettings(), Given())
    (repair,) = result.repairs
    assert repair.conductance_before == pytest.approx(both, rel=1e-12)
    assert repair.conductance_after == pytest.approx(both, rel=1e-12)
    after = Branches.of(result.graph)
    assert after.cut.n_chains == 1
    point = after.cut.point[
        (result.graph.points[after.cut.point, 2] >= 10) & (result.graph.points[after.cut.point, 2] <= 14)
    ]
    place = result.graph.points[point]
    assert np.abs(place[:, 0]).max() < 1e-12  # the middle line
    found = conductance(place, result.graph.radius[point], np.array([0, len(point)]))[0]
    assert found == pytest.approx(both, rel=1e-9)


def test_arms_with_room_between_them_stay(lines) -> None:
    graph = split_vessel(lines, 0.8)  # 1.6 apart, tubes of 0.7 each
    assert fill_holes(graph, HoleSettings(), Given()).graph is graph


def test_long_arms_stay(lines) -> None:
    """Arms of 16 are more than 5 times the sum of their radii: a division may be real."""
    graph = split_vessel(lines, 0.4, length=16.0)
    assert fill_holes(graph, HoleSettings(), Given()).repairs == ()


def test_the_corner_of_a_voxel_path_is_one_lumen(lines) -> None:
    """Three points of which each touches each: the direct step and the corner carry the same lumen, not two."""
    before = np.linspace(0, 10, 11)[:, None] * [0, 0, 1.0]
    after = np.array([1.0, 0, 11]) + np.linspace(0, 10, 11)[:, None] * [0, 0, 1.0]
    corner = [[0, 0, 10], [1.0, 0, 10], [1.0, 0, 11]]
    graph = join(lines([before, after, corner, [corner[0], corner[2]]], 3.0)).graph
    result = fill_holes(graph, HoleSettings(), Given())
    assert "one lumen drawn twice" in result.repairs[0].reason
    assert Branches.of(result.graph).cut.n_chains == 1
    assert (result.graph.radius == 3.0).all()


@pytest.mark.parametrize("settings", [{"apart_below": 0.0}, {"apart_below": 1.1}, {"longest": 0.0}])
def test_limits_out_of_range(settings: dict) -> None:
    with pytest.raises(InputError, match=r"repair\.holes\."):
        HoleSettings(**settings)


def test_an_arm_with_a_name_stays(lines) -> None:
    from dataclasses import replace

    graph = split_vessel(lines, 0.4)
    named = [replace(graph, protected=np.arange(graph.n_points) == point) for point in range(graph.n_points)]
    on_arms = np.flatnonzero(np.abs(graph.points[:, 0]) > 0.1)
    kept = [fill_holes(named[point], HoleSettings(), Given()).repairs == () for point in on_arms]
    assert sum(kept) == len(on_arms) // 2  # those of the arm that would go
