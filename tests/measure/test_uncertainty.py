"""Intervals against sampling: phantoms with a stated noise, and limits with closed forms."""

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.measure.uncertainty import NoiseSettings, intervals, log_scatter
from geomprep.model import Stations

N = 2000
Z90 = 1.6448536  # normal quantile of 0.95


def line(radius, length: float = 0.04, bend: float = np.inf, copies: int = 1) -> Stations:
    """A vessel along x, or along an arc of a radius of bend, `copies` times."""
    radius = np.asarray(radius, float)
    s = np.linspace(0, length, len(radius))
    turn = s / bend
    points = np.stack((s, 0 * s, 0 * s), axis=1)
    if np.isfinite(bend):
        points = bend * np.stack((np.cos(turn), np.sin(turn), 0 * s), axis=1)
    return measured(np.tile(points, (copies, 1, 1)), np.tile(radius, (copies, 1)))


def measured(points: np.ndarray, radius: np.ndarray) -> Stations:
    """Stations of (m, k, 3) points and (m, k) radii, with the length of what is measured."""
    m, k = radius.shape
    steps = np.linalg.norm(np.diff(points, axis=1), axis=2)
    distance = np.concatenate((np.zeros((m, 1)), np.cumsum(steps, axis=1)), axis=1)
    return Stations(np.arange(m + 1) * k, distance.ravel(), points.reshape(-1, 3), radius.ravel(), np.zeros(m * k))


def exact(vessel: Stations) -> tuple[float, float, float]:
    """Length, volume and ∫ds/r⁴ of one vessel with a radius linear between stations."""
    a, b, h = vessel.radius[:-1], vessel.radius[1:], np.diff(vessel.distance)
    square = a * a + a * b + b * b
    return h.sum(), np.sum(np.pi * h * square / 3), np.sum(h * square / (3 * a**3 * b**3))


def noisy(vessel: Stations, radial: float, place: float, settings: NoiseSettings, seed: int) -> Stations:
    """N images of a vessel: noise of ln r correlated by exp(−Δs/ℓ), and one part common to each image."""
    rng, s, k = np.random.default_rng(seed), vessel.distance, len(vessel)
    reach = settings.correlation_length * np.median(vessel.radius)
    root = np.linalg.cholesky(np.exp(-np.abs(s[:, None] - s) / reach))
    own, common = rng.standard_normal((N, k)) @ root.T, rng.standard_normal((N, 1))
    q = settings.common_part
    noise = np.sqrt(q) * common + np.sqrt(1 - q) * own
    radius = vessel.radius * np.exp(np.sqrt(np.log1p((radial / vessel.radius) ** 2)) * noise)
    points = vessel.position + place * np.einsum("ij,njc->nic", root, rng.standard_normal((N, k, 3)))
    return measured(points, radius)


def coverage(interval, truth: float) -> float:
    return float(np.mean((interval.low <= truth) & (truth <= interval.high)))


NARROWED = 3e-3 - 1.8e-3 * np.exp(-(((np.linspace(0, 40, 161) - 20) / 3) ** 2))


@pytest.mark.parametrize(
    ("radius", "radial", "correlation_length", "common_part", "seed"),
    [
        (np.full(81, 2e-3), 0.1e-3, 3.0, 0.3, 11),
        (np.full(81, 1e-3), 0.1e-3, 3.0, 0.3, 12),
        (np.linspace(2e-3, 1e-3, 81), 0.1e-3, 3.0, 0.3, 13),
        (NARROWED, 0.15e-3, 3.0, 0.3, 14),
        (np.full(21, 1e-3), 0.1e-3, 1.0, 0.0, 15),
        (np.full(81, 1e-3), 0.1e-3, 3.0, 1.0, 16),
    ],
)
def test_intervals_cover_the_truth(radius, radial, correlation_length, common_part, seed) -> None:
    """90 % intervals of 2000 phantoms hold the truth in 90 ± 3 % of them, and the medians are near it.

    Standard error of a coverage from 2000: √(0.9 · 0.1/2000) = 0.7 %, so that ±3 % is not a matter of the seed.
    """
    settings = NoiseSettings(correlation_length=correlation_length, common_part=common_part)
    vessel, place = line(radius), 0.1e-3
    found = intervals(noisy(vessel, radial, place, settings, seed), None, radial, place, settings)
    for interval, truth in zip((found.length, found.volume, found.inverse_fourth_power), exact(vessel), strict=True):
        assert coverage(interval, truth) == pytest.approx(0.9, abs=0.03)
        error = np.log(interval.median / truth)
        # four standard errors of the mean, and 1 % for what the moments leave out
        assert error.mean() == pytest.approx(0, abs=4 * error.std() / np.sqrt(N) + 0.01)
        # standard error of a standard deviation from 2000: 1.6 %; scatter of the radius in σ adds to it
        assert interval.deviation.mean() == pytest.approx(error.std(), rel=0.12)


def test_length_of_a_bent_jagged_line() -> None:
    """Noise of 0.15 mm on places 0.25 mm apart: 3 % too long as measured, and covered when that is known."""
    settings = NoiseSettings()
    vessel = line(np.full(161, 2e-3), bend=15e-3)
    found = intervals(noisy(vessel, 0, 0.15e-3, settings, 21), None, 0.0, 0.15e-3, settings).length
    truth = exact(vessel)[0]
    # v/h² = 2p²(1 − exp(−h/ℓ))/h² = 2 · 0.15² · 0.0408/0.25² = 0.0294
    assert np.mean(found.measured) / truth == pytest.approx(1.0294, abs=0.003)
    assert np.mean(found.median) / truth == pytest.approx(1, abs=0.002)
    assert coverage(found, truth) == pytest.approx(0.9, abs=0.03)


def test_all_noise_in_common_is_a_power_of_the_radius() -> None:
    """One factor on all radii: R moves by its −4th power, V by its square, whatever the shape."""
    vessel, settings = line(np.full(81, 2e-3)), NoiseSettings(common_part=1.0)
    found = intervals(vessel, None, 0.2e-3, 0.0, settings)
    sigma = np.sqrt(np.log(1.01))
    assert log_scatter(2e-3, 0.2e-3) == pytest.approx(sigma, rel=1e-12)
    for interval, power in ((found.volume, 2), (found.inverse_fourth_power, 4)):
        assert interval.deviation[0] == pytest.approx(power * sigma, rel=1e-9)
        assert interval.common[0] == pytest.approx(power * sigma, rel=1e-9)
        assert np.log(interval.high / interval.low) == pytest.approx(2 * Z90 * power * sigma, rel=1e-6)
        assert interval.median == pytest.approx(interval.measured, rel=1e-9)  # E[ln r] is that of the truth


@pytest.mark.parametrize("power", [2, -4])
def test_noise_without_correlation_averages_out(power: int) -> None:
    """A vessel 400 correlation lengths ℓ long: the variance tends to (exp(k²σ²) − 1)-like 2ℓ/L · k²σ² for small σ."""
    vessel = line(np.full(4001, 1e-3), 0.4)
    found = intervals(vessel, None, 0.01e-3, 0.0, NoiseSettings(correlation_length=1.0, common_part=0.0))
    interval = found.volume if power == 2 else found.inverse_fourth_power
    assert interval.deviation[0] == pytest.approx(abs(power) * 0.01 * np.sqrt(2 / 400), rel=0.01)
    assert interval.common[0] == 0


def test_measured_resistance_is_too_high_where_noise_averages() -> None:
    """E[r⁻⁴] is exp(8σ²) times r⁻⁴ for dense stations; 14/3 σ² in the exponent for far ones (linear between)."""
    for stations, exponent in ((4001, 8.0), (81, 14 / 3)):
        vessel = line(np.full(stations, 1e-3), 0.4)
        reach = 10.0 if stations == 4001 else 0.1  # 10 mm on steps of 0.1 mm; 0.1 mm on steps of 5 mm
        settings = NoiseSettings(correlation_length=reach, common_part=0.0)
        found = intervals(vessel, None, 0.05e-3, 0.0, settings).inverse_fourth_power
        # less half of the variance, and to second order in σ
        bias = np.log(found.measured / found.median)[0] + 0.5 * found.deviation[0] ** 2
        assert bias == pytest.approx(exponent * 0.05**2, rel=0.03)


def test_sum_of_length_noise_at_the_ends() -> None:
    """A straight line of 40 mm, ℓ ≪ L: ends move freely, so the variance is 2p²."""
    vessel = line(np.full(5, 1e-3))
    found = intervals(vessel, None, 0.0, 0.1e-3, NoiseSettings(correlation_length=0.5)).length
    # jaggedness adds (2p²/h)² for each of four pieces: 2.5 % of p²·1e-4: nothing
    assert found.deviation[0] == pytest.approx(np.sqrt(2) * 0.1 / 40, rel=1e-3)


def test_voxel_sets_what_is_not_given() -> None:
    vessel = line(np.full(21, 2e-3))
    by_voxel = intervals(vessel, [0.4e-3, 0.4e-3, 0.8e-3])
    by_value = intervals(vessel, None, 0.2e-3, 0.2e-3)
    for name in ("length", "volume", "inverse_fourth_power"):
        for one, other in zip(getattr(by_voxel, name), getattr(by_value, name), strict=True):
            assert one.tolist() == other.tolist()


def test_published_size_of_the_uncertainty() -> None:
    """Voxel 0.5 mm, deviation of ¼ voxel: 5–95 % factors of R 0.68–1.5 at r = 2 mm, 0.82–1.24 at 4 mm.

    Those were computed for a normal radius without averaging, all noise in common; a log-normal one gives
    exp(±4 · 1.645 · 0.0624) and exp(±4 · 1.645 · 0.0312), 0.663–1.508 and 0.814–1.228.
    """
    for radius, low, high in ((2e-3, 0.68, 1.5), (4e-3, 0.82, 1.24)):
        found = intervals(line(np.full(21, radius)), 0.5e-3, None, 0.0, NoiseSettings(common_part=1.0))
        r = found.inverse_fourth_power
        assert (r.low / r.measured)[0] == pytest.approx(low, abs=0.03)
        assert (r.high / r.measured)[0] == pytest.approx(high, abs=0.03)


def test_segments_do_not_touch_one_another() -> None:
    thin, wide = line(np.linspace(0.5e-3, 0.8e-3, 31), 0.02), line(np.full(12, 4e-3), 0.03)
    both = Stations(
        np.array([0, 31, 43]),
        *(
            np.concatenate((getattr(thin, name), getattr(wide, name)))
            for name in ("distance", "position", "radius", "basis")
        ),
    )
    together = intervals(both, 0.5e-3).inverse_fourth_power
    for row, single in enumerate((thin, wide)):
        for a, b in zip(together, intervals(single, 0.5e-3).inverse_fourth_power, strict=True):
            assert a[row] == pytest.approx(b[0], rel=1e-9)


def test_no_noise_and_no_segments() -> None:
    vessel = line(np.linspace(2e-3, 1e-3, 9))
    sure = intervals(vessel, None, 0.0, 0.0)
    for interval, truth in zip((sure.length, sure.volume, sure.inverse_fourth_power), exact(vessel), strict=True):
        assert [interval.low[0], interval.median[0], interval.high[0]] == pytest.approx([truth] * 3, rel=1e-12)
    none = Stations(np.array([0]), np.zeros(0), np.zeros((0, 3)), np.zeros(0), np.zeros(0))
    assert len(intervals(none, 0.5e-3).volume.low) == 0


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({}, "radius_deviation is not given"),
        ({"radius_deviation": 1e-4}, "position_deviation is not given"),
        ({"voxel": 0.0}, "voxel = 0"),
        ({"voxel": 1e-3, "radius_deviation": -1e-4}, "radius_deviation = -0.0001"),
    ],
)
def test_bad_input_is_named(arguments: dict[str, float], message: str) -> None:
    with pytest.raises(InputError, match=message):
        intervals(line(np.full(5, 1e-3)), **arguments)


@pytest.mark.parametrize(
    "wrong", [{"level": 1.0}, {"voxel_fraction": 0.0}, {"correlation_length": 0.0}, {"common_part": 1.5}]
)
def test_settings_out_of_range(wrong: dict[str, float]) -> None:
    with pytest.raises(InputError, match=next(iter(wrong))):
        NoiseSettings(**wrong)
