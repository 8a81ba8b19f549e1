"""Narrowings and widenings: exact degrees, seeded phantoms with noise, nothing found where nothing is."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.errors import InputError
from geomprep.measure.narrowings import Narrowings, NarrowingSettings, narrowings

S = np.linspace(0, 80e-3, 161)
ONE = np.array([0, 161])


def bump(depth: float, centre: float, half: float, s: np.ndarray = S) -> np.ndarray:
    """1 far away, 1 − depth at the centre, a squared cosine of bounded support between."""
    x = np.clip((s - centre) / half, -1, 1)
    return 1 - depth * np.cos(0.5 * np.pi * x) ** 2


def found_in(radius: np.ndarray, s: np.ndarray = S, **options) -> Narrowings:
    return narrowings(s, radius, np.array([0, len(s)]), **options)


def test_12_in_40_mm_is_70_percent() -> None:
    """1 − 1.2/4.0 = 0.70 by diameter, 1 − 0.09 = 0.91 by area; both carotid conventions agree in a level artery."""
    found = found_in(2e-3 * bump(0.7, 40e-3, 6e-3), arterial=np.array([True]))
    assert len(found.segment) == 1
    assert found.degree_by_diameter[0] == pytest.approx(0.70, abs=1e-12)
    assert found.degree_by_area[0] == pytest.approx(0.91, abs=1e-12)
    assert found.against_distal[0] == pytest.approx(0.70, abs=1e-12)
    assert found.against_original[0] == pytest.approx(0.70, abs=1e-12)
    assert (found.radius[0], found.reference_radius[0]) == pytest.approx((0.6e-3, 2e-3), rel=1e-12)
    assert found.area[0] == pytest.approx(np.pi * 0.36e-6, rel=1e-12)
    assert (found.place[0], found.station[0], found.sides[0]) == (pytest.approx(40e-3), 80, 2)
    assert found.focal[0]
    assert not found.widening[0]
    # 5 % off where cos² = 0.05/0.7: 0.8276 of the half width of 6 mm; linear between stations of 0.5 mm
    reach = 6e-3 * np.arccos(np.sqrt(0.05 / 0.7)) / (0.5 * np.pi)
    assert found.start[0] == pytest.approx(40e-3 - reach, abs=0.02e-3)
    assert found.end[0] == pytest.approx(40e-3 + reach, abs=0.02e-3)
    assert found.length[0] == pytest.approx(found.end[0] - found.start[0], rel=1e-12)


def test_a_throat_of_constant_radius_is_placed_in_its_middle() -> None:
    found = found_in(np.where(np.abs(S - 40e-3) < 4.1e-3, 0.6e-3, 2e-3))
    assert found.place[0] == pytest.approx(40e-3)
    assert found.degree_by_diameter[0] == pytest.approx(0.7, abs=1e-12)


@pytest.mark.parametrize("form", ["linear", "exponential"])
def test_conventions_differ_in_a_tapering_artery(form: str) -> None:
    """Taper 3 → 2 mm over 80 mm, loss 60 % at the middle: the original lumen gives 0.6, the vessel beyond less."""
    vessel = 3e-3 - 1e-3 * S / 80e-3 if form == "linear" else 3e-3 * (2 / 3) ** (S / 80e-3)
    found = found_in(vessel * bump(0.6, 40e-3, 5e-3), arterial=np.array([True]))
    middle = vessel[80]
    assert found.against_original[0] == pytest.approx(0.6, abs=1e-9)
    assert found.degree_by_diameter[0] == pytest.approx(0.6, abs=1e-9)
    assert found.radius[0] == pytest.approx(0.4 * middle, rel=1e-9)
    # the vessel beyond is at most that at the place and at least that at the end
    assert 1 - 0.4 * middle / 2e-3 < found.against_distal[0] < 0.6
    veins = found_in(vessel * bump(0.6, 40e-3, 5e-3))
    assert np.isnan(veins.against_original[0])
    assert np.isnan(veins.against_distal[0])


def phantoms(noise: float, smooth: int = 0) -> tuple[np.ndarray, np.ndarray, Narrowings]:
    """100 tapering vessels with a Gaussian narrowing; smooth noise is averaged over so many stations."""
    rng = np.random.default_rng(20)
    depth, width, place = rng.uniform([[0.3], [2e-3], [24e-3]], [[0.8], [5e-3], [56e-3]], (3, 100))
    wide, taper = rng.uniform([[1.5e-3], [0.6]], [[3e-3], [1.0]], (2, 100))
    vessel = wide[:, None] * (1 + (taper[:, None] - 1) * S / S[-1])
    scatter = rng.standard_normal((100, 161 + smooth))
    if smooth:
        kernel = np.full(smooth + 1, (smooth + 1) ** -0.5)  # keeps the variance
        scatter = np.stack([np.convolve(row, kernel, "valid") for row in scatter])
    gauss = np.exp(-(((S - place[:, None]) / width[:, None]) ** 2))
    radius = vessel * (1 - depth[:, None] * gauss) * np.exp(noise * scatter)
    return depth, place, narrowings(np.tile(S, 100), radius.ravel(), np.arange(101) * 161)


@pytest.mark.parametrize(("noise", "smooth"), [(0.0, 0), (0.02, 0), (0.02, 5), (0.05, 0)])
def test_phantoms(noise: float, smooth: int) -> None:
    """All found, none beside; median error of the degree within 3 points, every place within 1 mm at 2 %."""
    depth, place, found = phantoms(noise, smooth)
    assert found.segment.tolist() == list(range(100))
    assert not found.widening.any()
    error = np.abs(found.degree_by_diameter - depth)
    off = np.abs(found.place - place)
    assert np.median(error) < (0.01 if noise < 0.05 else 0.015)
    # at worst one station of at most 0.7 of the reference stands for the throat, 3 standard deviations off
    assert error.max() < 0.03 + 3 * noise * 0.7
    assert np.median(off) < 0.15e-3
    assert off.max() < (1e-3 if noise < 0.05 else 2e-3)


def test_lesion_that_fills_half_of_a_short_segment() -> None:
    """Level for 10 mm, narrow from 10 to 33 mm with the throat at 26 mm, in 34 mm: still seen from both sides."""
    s = np.linspace(0, 34e-3, 35)
    dip = np.interp(s, [10e-3, 18e-3, 26e-3, 33e-3], [0, 0.4, 0.55, 0.0])
    found = found_in(3.4e-3 * (1 - dip), s)
    assert len(found.segment) == 1
    assert found.place[0] == pytest.approx(26e-3)
    assert found.degree_by_diameter[0] == pytest.approx(0.55, abs=0.02)
    assert (found.sides[0], found.widening[0], found.focal[0]) == (2, False, True)
    rng = np.random.default_rng(6)
    noisy = 3.4e-3 * (1 - dip) * np.exp(0.02 * rng.standard_normal((100, 35)))
    many = narrowings(np.tile(s, 100), noisy.ravel(), np.arange(101) * 35)
    assert many.segment.tolist() == list(range(100))
    assert np.median(np.abs(many.degree_by_diameter - 0.55)) < 0.03
    # a throat with unlike sides: no parabola's vertex, but the station itself
    assert np.median(np.abs(many.place - 26e-3)) < 0.25e-3
    assert np.abs(many.place - 26e-3).max() < 2e-3


def test_without_noise_place_and_degree_are_those_of_the_nearest_station() -> None:
    """Half a step of 0.5 mm off at most; the faint feet of a Gaussian lower the reference by less than a point."""
    depth, place, found = phantoms(0.0)
    assert np.abs(found.place - place).max() <= 0.25e-3 * (1 + 1e-9)
    assert np.abs(found.degree_by_diameter - depth).max() < 0.015


@pytest.mark.parametrize("noise", [0.0, 0.02, 0.05])
@pytest.mark.parametrize("taper", [1.0, 0.5, 0.25])
@pytest.mark.parametrize("form", ["linear", "exponential"])
def test_clean_tapers_and_noise_alone_give_none(noise: float, taper: float, form: str) -> None:
    rng = np.random.default_rng(8)
    vessel = 1 + (taper - 1) * S / S[-1] if form == "linear" else taper ** (S / S[-1])
    radius = 2e-3 * vessel * np.exp(noise * rng.standard_normal((60, 161)))
    found = narrowings(np.tile(S, 60), radius.ravel(), np.arange(61) * 161)
    assert len(found.segment) == 0
    assert found.against_distal.shape == found.focal.shape == (0,)


def test_half_a_lesion_beside_a_widening_end() -> None:
    """A drawn sinus: 3.6 mm, a throat of 1.5 mm at 25.73 mm, 3.2 mm at its end, stations 1.35 mm apart.

    The line between both shoulders is 3.2 to 3.3 mm at the throat: 1 − 1.5/3.2 = 0.53, 1 − 1.5/3.3 = 0.55.
    """
    radius = [3.6, 3.59, 3.58, 3.55, 3.52, 3.48, 3.43, 3.36, 3.24, 3.05, 2.83, 2.61, 2.40]
    radius += [2.16, 1.91, 1.71, 1.6, 1.55, 1.52, 1.5, 1.58, 1.89, 2.28, 2.62, 2.96, 3.2]
    s = np.arange(26) * 1.3544e-3
    found = found_in(np.array(radius) * 1e-3, s)
    assert found.widening.tolist() == [False]
    assert found.place[0] == pytest.approx(25.73e-3, abs=1e-5)
    assert 0.52 < found.degree_by_diameter[0] < 0.55
    assert (found.sides[0], found.focal[0]) == (2, True)


def test_scatter_decides_what_can_be_told() -> None:
    """10 % noise: none at five times the scatter; at twice, noise of 2.3 % of 9660 stations a side is listed."""
    rng = np.random.default_rng(8)
    radius = (2e-3 * np.exp(0.1 * rng.standard_normal((60, 161)))).ravel()
    lines = (np.tile(S, 60), radius, np.arange(61) * 161)
    assert len(narrowings(*lines).segment) <= 1
    assert len(narrowings(*lines, settings=NarrowingSettings(scatter_multiple=2.0)).segment) > 20


def test_one_side_takes_the_level_beside_the_lesion() -> None:
    """Half of the lumen is lost at the end of a vessel that widens from 2.0 to 2.3 mm over its last half."""
    vessel = np.interp(S, [0, 50e-3, 58e-3, 80e-3], [2.0e-3, 2.0e-3, 2.3e-3, 2.3e-3])
    found = found_in(vessel * bump(0.5, 80e-3, 10e-3))
    assert found.sides.tolist() == [1]
    assert not found.focal[0]  # short, yet at the end
    assert found.length[0] < 10 * found.reference_radius[0]
    # the reference window begins at most 10 radii before the lesion: between the mean there and the end value
    assert 2.1e-3 < found.reference_radius[0] < 2.35e-3


def test_widening() -> None:
    """Radius doubled at 30 mm: gain 1 by diameter, 3 by area."""
    found = found_in(2e-3 * bump(-1.0, 30e-3, 6e-3), arterial=np.array([True]))
    assert found.widening.tolist() == [True]
    assert found.degree_by_diameter[0] == pytest.approx(1.0, abs=1e-12)
    assert found.degree_by_area[0] == pytest.approx(3.0, abs=1e-12)
    assert np.isnan(found.against_original[0])


def test_several_in_several_segments() -> None:
    """Two narrowings in the first of three segments, none in the second, both kinds in the third, by place."""
    one = 2e-3 * bump(0.5, 20e-3, 5e-3) * bump(0.4, 55e-3, 5e-3)
    three = 1e-3 * bump(-0.8, 25e-3, 4e-3) * bump(0.6, 60e-3, 4e-3)
    radius = np.concatenate((one, np.full(161, 1e-3), three))
    found = narrowings(np.tile(S, 3), radius, np.arange(4) * 161)
    assert found.segment.tolist() == [0, 0, 2, 2]
    assert found.widening.tolist() == [False, False, True, False]
    assert found.degree_by_diameter == pytest.approx([0.5, 0.4, 0.8, 0.6], abs=1e-9)
    assert found.place == pytest.approx([20e-3, 55e-3, 25e-3, 60e-3])
    assert found.station.tolist() == [40, 110, 322 + 50, 322 + 120]


def test_focal_is_told_from_a_long_small_stretch_and_from_a_small_vessel() -> None:
    long_stretch = found_in(np.where(np.abs(S - 40e-3) < 15e-3, 1e-3, 2e-3))
    assert (long_stretch.focal.tolist(), long_stretch.sides.tolist()) == ([False], [2])
    assert long_stretch.degree_by_diameter[0] == pytest.approx(0.5, abs=1e-12)
    # 29 mm between the last wide stations, less a tenth of a step at either end
    assert long_stretch.length[0] == pytest.approx(30e-3, abs=0.5e-3)
    small_to_the_end = found_in(np.where(S > 50e-3, 1e-3, 2e-3))
    assert (small_to_the_end.focal.tolist(), small_to_the_end.sides.tolist()) == ([False], [1])
    assert small_to_the_end.end[0] == 80e-3
    small = found_in(np.full(161, 0.5e-3))
    assert len(small.segment) == 0


def test_stations_passed_over() -> None:
    """A wide mouth at the start (a junction) is no widening once its stations are passed over."""
    radius = 2e-3 * bump(-1.0, 0.0, 8e-3) * bump(0.5, 40e-3, 5e-3)
    assert found_in(radius).widening.tolist() == [True, False]
    found = found_in(radius, usable=S > 8e-3)
    assert found.widening.tolist() == [False]
    assert found.degree_by_diameter[0] == pytest.approx(0.5, abs=1e-12)
    assert len(found_in(radius, usable=np.zeros(161, np.bool_)).segment) == 0


def test_settings_move_what_is_listed() -> None:
    radius = 2e-3 * bump(0.30, 40e-3, 5e-3)
    assert len(found_in(radius, settings=NarrowingSettings(least_narrowing=0.31)).segment) == 0
    assert len(found_in(radius, settings=NarrowingSettings(least_narrowing=0.29)).segment) == 1
    wide = 2e-3 * bump(-0.30, 40e-3, 5e-3)
    assert len(found_in(wide, settings=NarrowingSettings(least_widening=0.31)).segment) == 0
    assert len(found_in(wide, settings=NarrowingSettings(least_widening=0.29)).segment) == 1


@settings(max_examples=20, deadline=None)
@given(depth=st.floats(0.25, 0.9), centre=st.floats(25, 55), scale=st.floats(0.01, 100), seed=st.integers(0, 99))
def test_scale_and_reversal(depth: float, centre: float, scale: float, seed: int) -> None:
    noise = np.exp(0.01 * np.random.default_rng(seed).standard_normal(161))
    radius = (2e-3 - 5e-3 * S) * bump(depth, centre * 1e-3, 5e-3) * noise
    found, scaled = found_in(radius), found_in(scale * radius, scale * S)
    back = found_in(radius[::-1].copy(), 80e-3 - S[::-1])
    assert len(found.segment) == 1
    for other, place in ((scaled, scaled.place / scale), (back, 80e-3 - back.place)):
        np.testing.assert_allclose(other.degree_by_diameter, found.degree_by_diameter, atol=1e-9)
        np.testing.assert_allclose(place, found.place, rtol=1e-7)


def test_short_segments_and_none() -> None:
    s = np.array([0, 1e-2, 0, 1e-2, 2e-2])
    found = narrowings(s, np.array([2e-3, 1e-3, 2e-3, 0.2e-3, 2e-3]), np.array([0, 2, 5]))
    assert len(found.segment) == 0
    empty = narrowings(np.zeros(0), np.zeros(0), np.zeros(1, np.int64))
    assert len(empty.segment) == 0


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"usable": np.ones(3, np.bool_)}, "usable: 3 values for 161 stations"),
        ({"arterial": np.ones(2, np.bool_)}, "arterial: 2 values for 1 segments"),
    ],
)
def test_refused_input(options: dict, words: str) -> None:
    with pytest.raises(InputError, match=words):
        found_in(np.full(161, 1e-3), **options)
    with pytest.raises(InputError, match="radius = 0"):
        found_in(np.zeros(161))


@pytest.mark.parametrize(
    "bad", [{"edge": 0.3}, {"least_narrowing": 1.0}, {"least_widening": 0.05}, {"reach": 0.0}, {"gap": np.inf}]
)
def test_refused_settings(bad: dict) -> None:
    with pytest.raises(InputError, match=next(iter(bad))):
        NarrowingSettings(**bad)
