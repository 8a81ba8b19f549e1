"""Radius profiles: the right form, closed forms of resistance ratios, the bias of noise."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.errors import InputError
from geomprep.measure.profiles import ProfileKind, ProfileSettings, noise_bias, radius_profiles

S = np.linspace(0, 40e-3, 81)
ONE = np.array([0, 81])


def noise(scatter: float, n: int = 81, seed: int = 5) -> np.ndarray:
    return np.exp(scatter * np.random.default_rng(seed).standard_normal(n))


@pytest.mark.parametrize("scatter", [0.0, 0.02])
def test_constant_and_exponential_taper_are_told(scatter: float) -> None:
    level = radius_profiles(S, 2e-3 * noise(scatter), ONE)
    taper = radius_profiles(S, 2e-3 * np.exp(-10 * S) * noise(scatter), ONE)
    assert (level.kind[0], taper.kind[0]) == (ProfileKind.CONSTANT, ProfileKind.LINEAR)
    assert level.knot_distance.tolist() == taper.knot_distance.tolist() == [0, 40e-3]
    # a line through 81 values with scatter σ has a standard error of 2σ/√81 = 0.44 % at its ends; 4 of them
    near = pytest.approx(1, abs=4 * 0.0045 * scatter / 0.02 + 1e-12)
    assert taper.knot_radius[0] / 2e-3 == near
    assert taper.knot_radius[1] / (2e-3 * np.exp(-0.4)) == near
    # standard error of a standard deviation from 81 values: σ/√162 = 8 %; 3 of them
    assert taper.scatter[0] == pytest.approx(scatter, rel=0.24, abs=1e-12)


def test_change_point_is_found_where_it_lies() -> None:
    """ln r level to 20 mm, then falling by ln 2 to the end: one knot at 20 mm, exact without noise."""
    r = 3e-3 * np.exp(-np.log(2) * np.maximum(S - 20e-3, 0) / 20e-3)
    clean = radius_profiles(S, r, ONE, ProfileSettings(finest_scatter=1e-6))
    assert (clean.kind[0], clean.n_pieces[0]) == (ProfileKind.PIECEWISE, 2)
    # 81 stations are averaged in 64 places, so that a knot lies within one station of the kink
    assert clean.knot_distance[1] == pytest.approx(20e-3, abs=0.5e-3)
    coarse = radius_profiles(S[::2], r[::2], np.array([0, 41]), ProfileSettings(finest_scatter=1e-6))
    assert coarse.knot_distance == pytest.approx([0, 20e-3, 40e-3], abs=1e-12)
    assert coarse.knot_radius == pytest.approx([3e-3, 3e-3, 1.5e-3], rel=1e-9)
    noisy = radius_profiles(S, r * noise(0.02), ONE)
    assert (noisy.kind[0], noisy.n_pieces[0]) == (ProfileKind.PIECEWISE, 2)
    assert noisy.knot_distance[1] == pytest.approx(20e-3, abs=3e-3)


def test_narrowing_needs_pieces_and_one_radius_erases_it() -> None:
    """r = 3 − 1.8 exp(−((s − 20)/3)²) mm over 40 mm: exact R over R(mean r) 2.45, over R(median r) 3.41.

    By quadrature: mean r 2.76 mm, radius of equal resistance 2.21 mm; the two ratios invert these.
    """
    s = np.linspace(0, 40e-3, 2001)
    r = 3e-3 - 1.8e-3 * np.exp(-(((s - 20e-3) / 3e-3) ** 2))
    found = radius_profiles(s, r, np.array([0, 2001]))
    assert 1 / found.ratio_mean[0] == pytest.approx(2.45, abs=0.005)
    assert 1 / found.ratio_median[0] == pytest.approx(3.41, abs=0.005)
    assert found.ratio_for_resistance[0] == pytest.approx(1, rel=1e-12)
    assert found.n_pieces[0] >= 4
    assert found.ratio_profile[0] == pytest.approx(1, abs=0.03)
    assert found.knot_radius.min() == pytest.approx(1.2e-3, rel=0.1)


@pytest.mark.parametrize(("far", "exact"), [(0.9, 1.01), (0.7, 1.11), (0.5, 1.48)])
def test_linear_taper(far: float, exact: float) -> None:
    """R = 8μL/(3π)(a² + ab + b²)/(a³b³) against 8μL/(π((a + b)/2)⁴): their ratio at b/a = 0.9, 0.7, 0.5."""
    closed = (1 + far + far**2) / (3 * far**3) * ((1 + far) / 2) ** 4
    assert closed == pytest.approx(exact, abs=0.005)
    found = radius_profiles(S, np.interp(S, [0, 40e-3], [2e-3, 2e-3 * far]), ONE)
    assert 1 / found.ratio_mean[0] == pytest.approx(closed, rel=1e-9)
    # mean of r² = a²(1 + q + q²)/3, so the ratio is (3/(1 + q + q²))²·(3q³/(1 + q + q²))
    third = (1 + far + far**2) / 3
    assert found.ratio_for_volume[0] == pytest.approx(far**3 / third**3, rel=1e-9)


def test_bias_of_noise_in_numbers() -> None:
    """Scatter σ of 5, 10, 15, 20 %: +2.5, 10.5, 25, 49 % about the arithmetic mean, exp(10σ²) − 1.

    About the geometric mean, exp(8σ²) − 1: 2.0, 8.3, 19.7, 37.7 %.
    """
    scatter = np.array([0.05, 0.10, 0.15, 0.20])
    assert 100 * (noise_bias(scatter, about_mean=True) - 1) == pytest.approx([2.5, 10.5, 25, 49], abs=0.3)
    assert 100 * (noise_bias(scatter) - 1) == pytest.approx([2.0, 8.3, 19.7, 37.7], abs=0.05)


@pytest.mark.parametrize("scatter", [0.05, 0.15])
def test_bias_of_noise_by_quadrature(scatter: float) -> None:
    """Gauss–Hermite quadrature over e of exp(−4e), and of r⁻⁴ of a radius linear between two noisy stations."""
    x, w = np.polynomial.hermite_e.hermegauss(40)
    w = w / w.sum()
    e = scatter * x
    assert w @ np.exp(-4 * e) == pytest.approx(float(noise_bias(scatter)), rel=1e-9)
    mean = w @ np.exp(e)
    assert w @ np.exp(-4 * e) * mean**4 == pytest.approx(float(noise_bias(scatter, about_mean=True)), rel=1e-9)
    a, b = np.exp(e)[:, None], np.exp(e)[None, :]
    linear = w @ ((a * a + a * b + b * b) / (3 * a**3 * b**3)) @ w  # ∫r⁻⁴ over a piece of length 1
    # 14/3 σ² to second order; the next order is a few times σ⁴·10
    assert np.log(linear) == pytest.approx(14 / 3 * scatter**2, rel=10 * scatter**2)


def test_scatter_that_is_found_gives_the_bias() -> None:
    """2000 stations with 10 % noise: standard error of the scatter 0.1/√4000 = 0.0016; 4 of them."""
    s = np.linspace(0, 1, 2000)
    found = radius_profiles(s, 2e-3 * noise(0.1, 2000), np.array([0, 2000]))
    assert found.scatter[0] == pytest.approx(0.1, abs=0.0064)
    assert found.noise_bias[0] == noise_bias(found.scatter[0])


def test_three_change_points_are_found_exactly() -> None:
    """A narrowing drawn with straight flanks in ln r at stations: each knot only shows once the others are there."""
    s = np.linspace(0, 60e-3, 61)
    at, log = [0, 15e-3, 20e-3, 28e-3, 60e-3], [0, 0.1, -0.6, 0.05, -0.1]
    found = radius_profiles(s, 2e-3 * np.exp(np.interp(s, at, log)), np.array([0, 61]))
    assert found.knot_distance == pytest.approx(at, abs=1e-12)
    assert np.log(found.knot_radius / 2e-3) == pytest.approx(log, abs=1e-9)
    assert found.scatter[0] == pytest.approx(0, abs=1e-9)


def test_ripples_below_the_finest_scatter_make_no_pieces() -> None:
    r = 2e-3 * (1 + 5e-4 * np.sin(S / 40e-3 * 6))
    assert radius_profiles(S, r, ONE).kind[0] == ProfileKind.CONSTANT
    assert radius_profiles(S, r, ONE, ProfileSettings(finest_scatter=1e-6)).kind[0] == ProfileKind.PIECEWISE


def test_scatter_of_short_segments_counts_the_fitted_values_off() -> None:
    """20 stations: mean square within 3 % of the truth, where 5 % would be lost with one value fitted."""
    n = 4000
    noisy = np.exp(0.05 * np.random.default_rng(1).standard_normal(n * 20))
    plain = ProfileSettings(most_change_points=0, correlation_length=0)
    found = radius_profiles(np.tile(np.arange(20.0), n), noisy, np.arange(n + 1) * 20, plain)
    # the choice of the better of two forms takes up to 2 %; standard error √(2/(20 n)) = 0.5 %
    assert np.mean(found.scatter**2) / 0.05**2 == pytest.approx(1, abs=0.03)


def test_noise_alone_seldom_makes_a_change_point() -> None:
    rng = np.random.default_rng(11)
    n = 200
    r = 2e-3 * np.exp(0.05 * rng.standard_normal(n * 81))
    found = radius_profiles(np.tile(S, n), r, np.arange(n + 1) * 81)
    assert np.mean(found.kind == ProfileKind.CONSTANT) >= 0.97
    # scatter without bias: mean of 200 estimates, each with a standard error of 0.05/√162; 4 of theirs
    assert found.scatter.mean() == pytest.approx(0.05, abs=4 * 0.05 / np.sqrt(162 * n))


def test_two_and_three_stations() -> None:
    s = np.array([0, 1e-2, 0, 1e-2, 2e-2])
    found = radius_profiles(s, np.array([2e-3, 1e-3, 1e-3, 1e-3, 1e-3]), np.array([0, 2, 5]))
    assert found.kind.tolist() == [ProfileKind.LINEAR, ProfileKind.CONSTANT]
    assert found.knot_radius == pytest.approx([2e-3, 1e-3, 1e-3, 1e-3])
    assert found.knot_offsets.tolist() == [0, 2, 4]
    # from 2 to 1 over h: exact ∫r⁻⁴ = 7h/24, of the exponential profile h(1 − 1/16)/(4 ln 2): ratio 1.159307
    assert found.ratio_profile[0] == pytest.approx(15 / (64 * np.log(2)) * 16 / (7 / 24 * 16), rel=1e-9)


def test_no_segments() -> None:
    found = radius_profiles(np.zeros(0), np.zeros(0), np.zeros(1, np.int64))
    assert len(found.kind) == len(found.knot_radius) == len(found.ratio_mean) == 0


@settings(max_examples=20, deadline=None)
@given(seed=st.integers(0, 999), stretch=st.floats(0.1, 10), swell=st.floats(0.1, 10))
def test_alone_or_beside_others_reversed_or_scaled(seed: int, stretch: float, swell: float) -> None:
    """Lines do not mix; lengths and radii scale together with what counts as independent."""
    rng = np.random.default_rng(seed)
    counts = rng.integers(2, 90, 5)
    offsets = np.concatenate(([0], np.cumsum(counts)))
    s = np.concatenate([np.concatenate(([0], np.cumsum(rng.uniform(0.5, 1.5, n - 1)))) for n in counts])
    r = np.exp(0.3 * rng.standard_normal(len(s)))
    plain = ProfileSettings(correlation_length=0)
    together = radius_profiles(s, r, offsets, plain)
    for i in range(5):
        rows = slice(offsets[i], offsets[i + 1])
        alone = radius_profiles(stretch * s[rows], swell * r[rows], np.array([0, counts[i]]), plain)
        knots = slice(together.knot_offsets[i], together.knot_offsets[i + 1])
        assert alone.kind[0] == together.kind[i]
        np.testing.assert_allclose(alone.knot_distance, stretch * together.knot_distance[knots], rtol=1e-9)
        np.testing.assert_allclose(alone.knot_radius, swell * together.knot_radius[knots], rtol=1e-6)
        np.testing.assert_allclose(alone.ratio_mean, together.ratio_mean[i], rtol=1e-9)


def test_more_pieces_never_fit_worse() -> None:
    """With every change point allowed the misfit falls; a smaller limit keeps fewer pieces."""
    r = 2e-3 * (1 + 0.4 * np.sin(S / 40e-3 * 6))
    found = [radius_profiles(S, r, ONE, ProfileSettings(most_change_points=n)) for n in range(5)]
    assert [int(profile.n_pieces[0]) for profile in found] == [1, 2, 3, 4, 5]
    scatter = [float(profile.scatter[0]) for profile in found]
    assert scatter == sorted(scatter, reverse=True)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"radius": np.array([1e-3, 0, 1e-3])}, "radius = 0"),
        ({"radius": np.ones(2)}, "radius: 2 values for 3 stations"),
        ({"distance": np.array([0, 1.0, 1.0])}, "it must rise along a segment"),
        ({"distance": np.array([1.0, 2.0, 3.0])}, "does not start at 0"),
        ({"offsets": np.array([0, 1, 3])}, "in steps of at least 2"),
        ({"offsets": np.array([0, 2])}, "must run from 0 to 3"),
    ],
)
def test_refused_input(change: dict, words: str) -> None:
    lines = {"distance": np.array([0, 1.0, 2.0]), "radius": np.ones(3), "offsets": np.array([0, 3])} | change
    with pytest.raises(InputError, match=words):
        radius_profiles(**lines)


@pytest.mark.parametrize(
    "bad",
    [{"most_change_points": -1}, {"stations_per_piece": 3}, {"finest_scatter": 0.0}, {"correlation_length": np.inf}],
)
def test_refused_settings(bad: dict) -> None:
    with pytest.raises(InputError, match=next(iter(bad))):
        ProfileSettings(**bad)


def test_refused_scatter() -> None:
    with pytest.raises(InputError, match=r"scatter = -0\.1"):
        noise_bias([0.1, -0.1])
