"""Exits and common volumes of two tubes against closed forms."""

import numpy as np
import pytest

from geomprep.measure.tube_overlap import Axes, EndPairs, Ends, exit_distances, overlap_volumes
from geomprep.model import Stations


def two(direction, radii: tuple[float, float], passing: bool, length: float = 30.0, n: int = 2):
    """A path along x (from −x too if it passes) and a tube from the same node; exit and common volume of the tube."""
    part = np.linspace(0, 1, n)[:, None] * length
    lines = [part * np.array([1.0, 0, 0]), part * np.array([-1.0, 0, 0]), part * np.asarray(direction, float)]
    radius = np.repeat([radii[0], radii[0], radii[1]], n)
    axes = Axes.of(Stations(np.arange(4) * n, np.tile(part[:, 0], 3), np.concatenate(lines), radius, np.zeros(3 * n)))
    ends = Ends(np.arange(3), np.zeros(3, int), np.full(3, length), np.full(3, max(radii)))
    pairs = EndPairs(*(np.array([value]) for value in (2, 0, 1 if passing else -1, True, True)))
    exits = exit_distances(axes, ends, pairs)
    return exits[2], overlap_volumes(axes, ends, pairs, exits)[2]


@pytest.mark.parametrize("degrees", [20, 30, 60, 90, 130])
def test_exit_through_a_cylinder_and_a_round_end(degrees: float) -> None:
    """R/sin θ from an endless tube; R from one that stops at the node, where the branch leads on or across."""
    turn = np.radians(degrees)
    direction = [np.cos(turn), np.sin(turn), 0]
    assert two(direction, (2, 1), True)[0] == pytest.approx(2 / np.sin(turn), rel=1e-9)
    assert two([-direction[0], direction[1], 0], (2, 1), degrees > 90)[0] == pytest.approx(
        2 if degrees <= 90 else 2 / np.sin(turn), rel=1e-9
    )


def test_exit_far_away_and_none() -> None:
    """At 5° the exit lies at 11.5 R; beside the path for good there is none, and the length stands."""
    turn = np.radians(5)
    assert two([np.cos(turn), np.sin(turn), 0], (2, 1), True)[0] == pytest.approx(2 / np.sin(turn), rel=1e-9)
    assert two([1, 0, 0], (2, 1), True)[0] == 30


@pytest.mark.parametrize(("radius", "tolerance"), [(0.5, 2e-3), (1.0, 2e-3), (1.9, 0.01), (2.0, 0.01)])
def test_common_volume_at_a_right_angle(radius: float, tolerance: float) -> None:
    """∫∫ √(R² − y²) over the disc of radius a; equal radii: 8/3 R³, half of Steinmetz' 16/3 R³."""
    y, step = np.linspace(-radius, radius, 200_001, retstep=True)
    expected = np.sum(2 * np.sqrt(np.maximum((radius**2 - y**2) * (4 - y**2), 0))) * step
    assert two([0, 1, 0], (2, radius), True, 12)[1] == pytest.approx(expected, rel=tolerance)
    if radius == 2.0:
        assert expected == pytest.approx(8 / 3 * 2**3, rel=1e-6)


@pytest.mark.parametrize("degrees", [30, 50])
def test_common_volume_at_a_slant(degrees: float) -> None:
    """Each fibre leaves at √(R² − y²)/sin θ + z cot θ: the mean over the disc is that at a right angle over sin θ."""
    turn = np.radians(degrees)
    upright = two([0, 1, 0], (2, 0.8), True)[1]
    assert two([np.cos(turn), np.sin(turn), 0], (2, 0.8), True)[1] == pytest.approx(upright / np.sin(turn), rel=5e-3)


def test_flat_end_holds_half_of_a_tube_across_it() -> None:
    """A tube across the flat end of a wider one, axis in the end: half of what a passing one would hold."""
    assert two([0, 1, 0], (2, 1), False)[1] == pytest.approx(two([0, 1, 0], (2, 1), True)[1] / 2, rel=5e-3)


def test_tube_that_leads_on_shares_nothing_with_a_flat_end() -> None:
    assert two([-1, 0, 0], (2, 1), False)[1] == pytest.approx(0, abs=1e-12)


def test_places_from_both_ends() -> None:
    """Two stations 4 apart, r 1 → 3: 1 from the far end lies at 3 with r 2.5; beyond the end is the end."""
    axes = Axes.of(
        Stations([0, 2, 4], [0, 1, 0, 4], [[9.0, 0, 0], [10, 0, 0], [0, 0, 0], [4, 0, 0]], [1, 1, 1, 3], [0] * 4)
    )
    found = axes.sampled(np.array([[1]]), np.array([[1]]), np.array([[0.0, 1.0, 9.0]]))
    assert found.tolist() == [[[4, 0, 0, 3], [3, 0, 0, 2.5], [0, 0, 0, 1]]]
