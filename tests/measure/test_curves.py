"""Curvature, torsion and tortuosity against closed forms."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.errors import InputError
from geomprep.measure.curves import curvature, masked_median, repeated_medians, station_scatter, tortuosity


def helix(n_per_turn: int, a: float = 1.0, b: float = 0.5, turns: int = 2) -> np.ndarray:
    t = np.linspace(0, 2 * np.pi * turns, n_per_turn * turns + 1)
    return np.stack((a * np.cos(t), a * np.sin(t), b * t), axis=1)


def whole(points: np.ndarray) -> np.ndarray:
    return np.array([0, len(points)])


@pytest.mark.parametrize(
    ("n", "ratio", "angles", "bend", "twist"),
    # a = 1, b = 0.5: κ = a/(a² + b²) = 0.8, τ = b/(a² + b²) = 0.4, length over distance √(a² + b²)/b = 2.236068,
    # sum of angles per length √(κ² + τ²) = 0.894427; values at finite steps derived with the same definitions
    [
        (12, 2.21573, 0.82901, 0.79631, 0.41493),
        (24, 2.23097, 0.85952, 0.79908, 0.40367),
        (48, 2.23479, 0.87639, 0.79977, 0.40092),
        (96, 2.23575, 0.88526, 0.79994, 0.40023),
        (192, 2.23599, 0.88981, 0.79999, 0.40006),
    ],
)
def test_helix(n: int, ratio: float, angles: float, bend: float, twist: float) -> None:
    points = helix(n)
    whole_line, local = tortuosity(points, whole(points)), curvature(points, whole(points))
    assert whole_line.distance_metric[0] == pytest.approx(ratio, abs=6e-6)
    assert whole_line.sum_of_angles_metric[0] == pytest.approx(angles, abs=6e-6)
    np.testing.assert_allclose(local.curvature, bend, atol=6e-6)
    np.testing.assert_allclose(local.torsion, twist, atol=6e-6)
    assert whole_line.inflections[0] == 0


def test_convergence_to_the_closed_forms_is_of_second_order() -> None:
    """κ = a/(a² + b²), τ = b/(a² + b²): halving the step divides both errors by 4."""
    a, b = 3e-3, 2e-3
    errors = []
    for n in (40, 80, 160):
        local = curvature(helix(n, a, b), whole(helix(n)))
        errors.append(
            [abs(local.curvature[n] * (a * a + b * b) / a - 1), abs(local.torsion[n] * (a * a + b * b) / b - 1)]
        )
    ratios = np.array(errors[:-1]) / np.array(errors[1:])
    np.testing.assert_allclose(ratios, 4, rtol=0.02)


def test_mirror_image_changes_the_sign_of_torsion_only() -> None:
    points = helix(48)
    right, left = (curvature(p, whole(points)) for p in (points, points * [1, 1, -1]))
    np.testing.assert_allclose(left.torsion, -right.torsion, rtol=1e-9)
    np.testing.assert_allclose(left.curvature, right.curvature, rtol=1e-9)


@pytest.mark.parametrize(("angle", "ratio"), [(np.pi, 1.570796), (np.pi / 2, 1.110721)])
def test_arc(angle: float, ratio: float) -> None:
    """Arc of radius 10: π/2 and π/(2√2) times the chord, curvature and sum of angles 1/10, no torsion."""
    t = np.linspace(0, angle, 2001)
    points = 10 * np.stack((np.cos(t), np.sin(t), 0 * t), axis=1)
    line, local = tortuosity(points, whole(points)), curvature(points, whole(points))
    assert line.distance_metric[0] == pytest.approx(ratio, abs=1e-6)
    assert line.sum_of_angles_metric[0] == pytest.approx(0.1, rel=2e-3)
    assert line.total_curvature[0] == pytest.approx(angle, rel=1e-3)
    np.testing.assert_allclose(local.curvature, 0.1, rtol=1e-6)
    np.testing.assert_allclose(local.torsion, 0, atol=1e-12)


@pytest.mark.parametrize(("periods", "inflections", "metric"), [(1, 1, 2.432013), (2, 3, 4.864027)])
@pytest.mark.parametrize("n_per_period", [1000, 1001])  # with and without a point on the inflection
def test_sine(periods: int, inflections: int, metric: float, n_per_period: int) -> None:
    """y = sin x: length per period 7.640396, ratio 1.216007; total curvature 4 atan 1 = π per period."""
    x = np.linspace(0, 2 * np.pi * periods, n_per_period * periods + 1)
    points = np.stack((x, np.sin(x), 0 * x), axis=1)
    line = tortuosity(points, whole(points))
    assert line.inflections[0] == inflections
    assert line.inflection_count_metric[0] == pytest.approx(metric, abs=2e-5)
    assert line.total_curvature[0] == pytest.approx(np.pi * periods, rel=1e-4)
    # planar: all of the sum is curvature; the last turn, next to nothing here, is not in it
    assert line.sum_of_angles_metric[0] == pytest.approx(1 / 7.640396 * np.pi, rel=1e-4)


def test_an_inflection_between_points_is_no_torsion() -> None:
    """40 points on one period of sin x, none on the inflection: planar, so all angles are turns of the line."""
    x = np.linspace(0, 2 * np.pi, 40)
    points = np.stack((x, np.sin(x), 0 * x), axis=1)
    line, local = tortuosity(points, whole(points)), curvature(points, whole(points))
    assert line.inflections[0] == 1
    np.testing.assert_allclose(local.torsion, 0, atol=1e-12)
    length = np.linalg.norm(np.diff(points, axis=0), axis=1).sum()
    # the last turn, at 2π − h, is left out: y'' ≈ h over 1 + y'² = 2, times the step h = 0.161: h²/2 = 0.0130 rad
    assert line.sum_of_angles_metric[0] * length == pytest.approx(line.total_curvature[0] - 0.0130, abs=2e-4)


def test_straight_and_short_lines() -> None:
    straight = np.stack((np.linspace(0, 1, 11), np.zeros(11), np.zeros(11)), axis=1)
    points = np.vstack((straight, [[0, 0, 0], [0, 0, 1]], [[0, 0, 0], [1, 0, 0], [1, 1, 0]]))
    offsets = np.array([0, 11, 13, 16])
    line, local = tortuosity(points, offsets), curvature(points, offsets)
    assert line.distance_metric == pytest.approx([1, 1, 2**0.5])
    assert line.inflections.tolist() == [0, 0, 0]
    assert line.sum_of_angles_metric.tolist() == [0, 0, 0]
    assert line.total_curvature == pytest.approx([0, 0, np.pi / 2])
    assert line.step == pytest.approx([0.1, 1, 1])
    assert local.curvature[:11].tolist() == [0] * 11
    assert np.isnan(local.curvature[11:13]).all()
    # the circle through the corners of a right angle with sides 1 has the diameter √2
    assert local.curvature[13:] == pytest.approx([2**0.5] * 3)
    assert np.isnan(local.torsion).all()


def test_ring_has_no_distance_metric_and_steps_are_reported() -> None:
    t = np.linspace(0, 2 * np.pi, 401)
    t[200] += 0.002
    points = 20 * np.stack((np.cos(t), np.sin(t), 0 * t), axis=1)
    line, local = tortuosity(points, whole(points)), curvature(points, whole(points))
    assert np.isnan(line.distance_metric[0])
    # regular turn 2π/400 = 0.015708; the moved point makes one of 0.017708, chord 40 sin(turn/2)
    assert local.longest_step[0] == pytest.approx(40 * np.sin((2 * np.pi / 400 + 0.002) / 2), rel=1e-9)
    assert local.step[0] == pytest.approx(40 * np.pi / 400, rel=1e-4)
    np.testing.assert_allclose(local.curvature, 0.05, rtol=1e-9)


@settings(max_examples=25, deadline=None)
@given(seed=st.integers(0, 999), scale=st.floats(1e-3, 1e3))
def test_invariance_under_motion_scale_and_reversal(seed: int, scale: float) -> None:
    rng = np.random.default_rng(seed)
    points = np.cumsum(rng.normal([3, 0, 0], 1, (30, 3)), axis=0)
    turn = np.linalg.qr(rng.standard_normal((3, 3)))[0]
    turn *= np.sign(np.linalg.det(turn))
    moved = scale * (points @ turn.T + rng.standard_normal(3))[::-1]
    offsets = np.array([0, 14, 30])
    line, other = tortuosity(points, offsets), tortuosity(moved, np.array([0, 16, 30]))
    local, bent = curvature(points, offsets), curvature(moved, np.array([0, 16, 30]))
    np.testing.assert_allclose(other.distance_metric[::-1], line.distance_metric, rtol=1e-9)
    np.testing.assert_array_equal(other.inflections[::-1], line.inflections)
    np.testing.assert_allclose(other.total_curvature[::-1], line.total_curvature, rtol=1e-9)
    np.testing.assert_allclose(bent.curvature[::-1] * scale, local.curvature, rtol=1e-7)
    np.testing.assert_allclose(bent.torsion[::-1] * scale, local.torsion, rtol=1e-6, atol=1e-9)


@pytest.mark.parametrize(
    ("points", "offsets", "words"),
    [
        (np.zeros((3, 2)), [0, 3], r"shape \(3, 2\)"),
        (np.full((2, 3), np.nan), [0, 2], "finite coordinates"),
        (np.zeros((3, 3)), [0, 3], "drop the repeated station"),
        (np.eye(3), [0, 1, 3], "in steps of at least 2"),
    ],
)
def test_refused_input(points: np.ndarray, offsets: list, words: str) -> None:
    with pytest.raises(InputError, match=words):
        tortuosity(points, np.array(offsets))


def test_half_of_the_values_cannot_mislead_repeated_medians() -> None:
    """y = 2 − 3x with 30 of 65 values lifted by any amount: the line of the others, exactly."""
    x = np.linspace(0, 1, 65)
    y = np.stack([2 - 3 * x, 2 - 3 * x])
    y[0, 10:40] += 1e3
    y[1, 35:] += np.linspace(5, 50, 30)
    known = np.ones((2, 65), np.bool_)
    found = repeated_medians(x, y, known)
    np.testing.assert_allclose(found[0], [2, -3], atol=1e-9)
    known[1, 35:] = False  # a lesion that fills one end does pull, unless it is left out
    np.testing.assert_allclose(repeated_medians(x, y, known)[1], [2, -3], atol=1e-9)


def test_median_of_known_values() -> None:
    values = np.random.default_rng(2).standard_normal((20, 9))
    known = np.random.default_rng(3).random((20, 9)) < 0.6
    expected = [np.median(row[mask]) if mask.any() else 0.0 for row, mask in zip(values, known, strict=True)]
    np.testing.assert_allclose(masked_median(values, known), expected)


def test_scatter_from_station_to_station() -> None:
    """5 % scatter on a cone with a step: standard error of a median of 3998 absolute values about 1.2 %; 5 of them."""
    rng = np.random.default_rng(4)
    s = np.concatenate(([0], np.cumsum(rng.uniform(0.2, 1.0, 3999))))
    r = (2 + s / s[-1]) * np.where(s > 0.5 * s[-1], 0.3, 1.0) * np.exp(0.05 * rng.standard_normal(4000))
    usable = np.ones(4000, np.bool_)
    assert station_scatter(s, r, usable, np.array([0, 4000]))[0] == pytest.approx(0.05, rel=0.06)
    both = station_scatter(
        np.append(s, [0, 1]), np.append(r, [1, 9]), np.ones(4002, np.bool_), np.array([0, 4000, 4002])
    )
    assert both[1] == 0
    usable[:2000] = False
    usable[2000::3] = False  # no three usable neighbours are left
    assert station_scatter(s, r, usable, np.array([0, 4000]))[0] == 0
