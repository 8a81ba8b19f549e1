"""The kernels of geometry scored on phantoms with known truth: a tenth of tests/benchmarks/geometry_scores.py.

The marks are those the project set itself; the phantoms are invented, and seeds are those of the full size.
"""

from __future__ import annotations

import numpy as np
import pytest
from phantoms import geometry

FIRST = 10_000


@pytest.mark.parametrize("across", [6, 8, 12])
def test_resistance_from_the_voxels_of_a_mask(across: int) -> None:
    """∫ds/r⁴ within 5 % in the median, 10 % at the 95th percentile, on the true axis and half a voxel beside it."""
    made = geometry.from_voxels(across, FIRST, 20)
    readings = {name: np.abs([each.error(name) for each in made]) for name in geometry.READINGS}
    for name in ("areas", "areas, weighted", "areas on an axis beside"):
        assert np.median(readings[name]) <= 0.05
        assert np.percentile(readings[name], 95) <= 0.10
    # the distance to the wall must fail on the same set, else it is too easy
    assert np.median(readings["distance map"]) > 0.15


def test_four_voxels_across_are_harder_than_twelve() -> None:
    few, many = (np.abs([each.error("areas") for each in geometry.from_voxels(n, FIRST, 20)]) for n in (4, 12))
    assert np.median(few) > np.median(many)


@pytest.mark.parametrize("reach", [0.0, 1.0])
@pytest.mark.parametrize("form", geometry.FORMS)
def test_narrowings_in_noise_of_two_percent(form: str, reach: float) -> None:
    """All found and none beside; the degree within 3 points and the place within 1 mm in the median."""
    found = geometry.noisy_narrowings(form, FIRST, 100, reach=reach)
    assert (found.missed, found.beside) == (0, 0)
    assert np.median(np.abs(found.degree)) <= 0.03
    assert np.median(np.abs(found.place)) <= 1e-3
    if form in ("Gaussian", "cosine"):  # a throat's place is a matter of its form elsewhere
        assert np.abs(found.place).max() <= 1e-3


def test_narrowings_in_masks_twenty_voxels_across() -> None:
    found = geometry.voxel_narrowings(20, FIRST, 10)
    for name in ("areas", "areas, weighted", "areas on an axis beside"):
        assert (found[name].missed, found[name].beside) == (0, 0)
        assert np.median(np.abs(found[name].degree)) <= 0.03
        assert np.abs(found[name].place).max() <= 1e-3


def test_intervals_hold_the_truth_in_ninety_percent() -> None:
    """Vessels of all kinds with the stated noise; the standard error of a coverage from 2000 is 0.7 %."""
    found, truth = geometry.noisy_intervals("all", FIRST, 2000)
    for interval, true in zip((found.length, found.volume, found.inverse_fourth_power), truth, strict=True):
        assert geometry.covered(interval, true) == pytest.approx(0.90, abs=0.03)


def test_intervals_of_a_voxel_are_too_wide_for_areas_and_too_high_for_the_distance_map() -> None:
    made = geometry.from_voxels(8, FIRST, 20)
    assert geometry.voxel_intervals(made, "areas")["inverse_fourth_power"][0] >= 0.9
    assert geometry.voxel_intervals(made, "distance map")["inverse_fourth_power"][0] < 0.5


def test_cones_are_exact() -> None:
    assert geometry.closed_form_error("cone", 5) == pytest.approx(0, abs=1e-12)


@pytest.mark.parametrize(("form", "stations"), [("exponential", 21), ("cosine", 161)])
def test_other_profiles_are_exact_to_second_order(form: str, stations: int) -> None:
    """Half the step is a quarter of the error, which is below 0.1 % here."""
    coarse, fine = (geometry.closed_form_error(form, n) for n in (stations, 2 * stations - 1))
    assert abs(coarse) <= 1e-3
    assert coarse / fine == pytest.approx(4, rel=0.02)


@pytest.mark.parametrize("degrees", [30, 45, 60, 90])
@pytest.mark.parametrize(("trunk", "branch", "parts"), [(2, 1, False), (1.5, 1.5, False), (2, 1, True), (1, 0.8, True)])
def test_junctions_of_straight_tubes(degrees: float, trunk: float, branch: float, parts: bool) -> None:
    """Resistance beyond the junction within 3 %, volume of the union within 1 %."""
    resistance, volume = geometry.y_tube(degrees, trunk, branch, parts)
    assert abs(resistance) <= 0.03
    assert abs(volume) <= 0.01
