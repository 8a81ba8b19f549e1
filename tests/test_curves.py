"""Kernels against closed forms."""

import numpy as np
import pytest

from geomprep.curves import arc_length, interpolate, line_sums, piece_integrals, pieces, weighted_median


def helix(n_per_turn: int, turns: int = 2) -> np.ndarray:
    t = np.linspace(0, 2 * np.pi * turns, n_per_turn * turns + 1)
    return np.stack((np.cos(t), np.sin(t), 0.5 * t), axis=1)


@pytest.mark.parametrize(
    ("n", "relative_error"),
    # helix a = 1, b = 0.5: length per turn 2π√(a² + b²) = 7.024814731; inscribed polygon, order 2
    [(12, -9.10e-3), (24, -2.28e-3), (48, -5.71e-4), (96, -1.43e-4), (192, -3.57e-5)],
)
def test_helix_length_converges_at_second_order(n: int, relative_error: float) -> None:
    points = helix(n)
    length = arc_length(points, np.array([0, len(points)]))[-1]
    assert length / (2 * 7.024814731) - 1 == pytest.approx(relative_error, rel=5e-3)


def test_half_circle_and_ring() -> None:
    t = np.linspace(0, np.pi, 20001)
    arc = 10 * np.stack((np.cos(t), np.sin(t), 0 * t), axis=1)
    # half circle of radius 10: length 10π, distance of the ends 20, ratio π/2 = 1.570796
    assert arc_length(arc, np.array([0, len(arc)]))[-1] / 20 == pytest.approx(1.570796, abs=1e-6)


def test_cone_integrals_are_exact() -> None:
    # cone 2 → 1 mm, 100 mm: volume 7.330383e-7 m³, side 9.425249e-4 m² (πh/3 (a²+ab+b²), π(a+b)√(h²+(a−b)²))
    volume, side, inverse_area, inverse_fourth, cube = piece_integrals(
        np.array([0.1]), np.array([2e-3]), np.array([1e-3])
    )[0]
    assert volume == pytest.approx(7.330383e-7, rel=1e-7)
    assert side == pytest.approx(9.425249e-4, rel=1e-7)
    # 8 μ/π ∫ds/r⁴ = 2.970892e8 Pa·s/m³ at 4 mPa·s; ρ∫ds/A = 1.687042e7 kg/m⁴ at 1060 kg/m³
    assert 8 * 4e-3 / np.pi * inverse_fourth == pytest.approx(2.970892e8, rel=2e-7)
    assert 1060 * inverse_area == pytest.approx(1.687042e7, rel=3e-7)  # half of the last printed digit
    assert cube == pytest.approx(3.75e-10, rel=1e-12)


def test_cone_integrals_do_not_depend_on_cutting() -> None:
    whole = piece_integrals(np.array([0.1]), np.array([2e-3]), np.array([1e-3]))[0]
    r = np.linspace(2e-3, 1e-3, 38)
    parts = piece_integrals(np.full(37, 0.1 / 37), r[:-1], r[1:]).sum(axis=0)
    np.testing.assert_allclose(parts, whole, rtol=1e-12)


def test_lines_do_not_mix() -> None:
    points = np.array([[0.0, 0, 0], [1, 0, 0], [50, 0, 0], [50, 2, 0], [50, 2, 5]])
    offsets = np.array([0, 2, 5])
    assert arc_length(points, offsets).tolist() == [0, 1, 0, 2, 7]
    piece = pieces(offsets)
    assert piece.first.tolist() == [0, 2, 3]
    assert line_sums(np.array([1.0, 2.0, 5.0]), piece.starts).tolist() == [1, 7]


def test_arc_length_of_a_short_line_after_a_long_one_keeps_its_digits() -> None:
    long = np.stack((np.linspace(0, 1e3, 100_001), np.zeros(100_001), np.zeros(100_001)), axis=1)
    short = np.array([[0.0, 0, 0], [1e-6, 0, 0], [3e-6, 0, 0]])
    points = np.concatenate((long, short))
    assert arc_length(points, np.array([0, len(long), len(points)]))[-1] == pytest.approx(3e-6, rel=1e-12)


def test_weighted_median_per_line() -> None:
    values = np.array([5.0, 1.0, 3.0, 7.0, 7.0])
    weights = np.array([1.0, 1.0, 8.0, 1.0, 1.0])
    assert weighted_median(values, weights, np.array([0, 3])).tolist() == [3, 7]


def test_interpolation_clips_to_the_line() -> None:
    distance = np.array([0.0, 1.0, 0.0, 2.0, 4.0])
    values = np.array([10.0, 20.0, 0.0, 2.0, 8.0])
    line = np.array([0, 1, 1, 1])
    at = np.array([-1.0, 3.0, 9.0, 2.0])
    assert interpolate(distance, values, np.array([0, 2, 5]), line, at).tolist() == [10, 5, 8, 2]
