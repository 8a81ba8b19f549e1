"""The rigid fit finds a motion that was made on purpose, also where a part is missing."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from geomprep.errors import InputError
from geomprep.measure.rigid_fit import rigid_fit


def tree() -> np.ndarray:
    """Points of a bowed trunk and four branches without any symmetry, m."""
    part = np.linspace(0, 1, 80)[:, None]
    ends = [
        ((0, 0, 0), (80, 0, 0), (0, 0, 12)),
        ((80, 0, 0), (110, 40, 10), (3, 0, 0)),
        ((80, 0, 0), (120, -20, -5), (0, 2, 4)),
        ((30, 0, 9), (35, -30, 40), (5, 0, 0)),
        ((110, 40, 10), (150, 60, -20), (0, 0, 6)),
    ]
    lines = [np.array(a) * (1 - part) + np.array(b) * part + np.sin(np.pi * part) * np.array(c) for a, b, c in ends]
    return np.concatenate(lines) * 1e-3


@settings(max_examples=15, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_any_motion_is_taken_back(seed: int) -> None:
    random = np.random.default_rng(seed)
    points = tree()
    turn, shift = Rotation.random(random_state=seed % 2**31), random.normal(0, 0.1, 3)
    found = rigid_fit(turn.apply(points) + shift, points)
    np.testing.assert_allclose(found.moved(turn.apply(points) + shift), points, atol=1e-9)
    assert found.angle == pytest.approx(turn.magnitude(), abs=1e-8)
    assert np.linalg.det(found.rotation) == pytest.approx(1)
    assert found.distance < 1e-9


def test_a_missing_branch_does_not_pull_the_rest_aside() -> None:
    """The trunk and three branches are as they were; the fifth line is gone from the moved set."""
    points = tree()
    turn = Rotation.from_rotvec([0.05, -0.1, 0.2])
    moved = turn.apply(points[:320]) + np.array([0.01, -0.02, 0.005])
    found = rigid_fit(moved, points)
    np.testing.assert_allclose(found.moved(moved), points[:320], atol=1e-7)


def test_noise_is_averaged() -> None:
    """400 points that scatter by 0.2 mm fix the motion to about 0.2/√400 = 0.01 mm; five of those are allowed."""
    points = tree()
    moved = Rotation.from_rotvec([0.02, 0.03, -0.01]).apply(points) + np.array([1e-3, 0, 0])
    found = rigid_fit(moved + np.random.default_rng(3).normal(0, 2e-4, moved.shape), points)
    assert np.sqrt(np.mean((found.moved(moved) - points) ** 2)) < 5e-5


def test_both_ways_are_inverse() -> None:
    points = tree()
    moved = Rotation.from_rotvec([0.3, 0.0, 0.4]).apply(points) + np.array([0.02, 0, 0])
    there, back = rigid_fit(moved, points), rigid_fit(points, moved)
    np.testing.assert_allclose(there.rotation @ back.rotation, np.eye(3), atol=1e-8)


def test_too_few_points_and_a_bad_part_are_refused() -> None:
    with pytest.raises(InputError, match=r"2 point\(s\)"):
        rigid_fit(tree()[:2], tree())
    with pytest.raises(InputError, match="counted = 0"):
        rigid_fit(tree(), tree(), counted=0.0)
