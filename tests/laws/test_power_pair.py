"""The power pair against the check values of published constants, scipy and limits done by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from geomprep.errors import InputError, ModelError
from geomprep.laws import power_pair

QUIET = settings(max_examples=150, derandomize=True, deadline=None)
EXPONENTS = [(0.5, 0.0), (10.0, -1.5), (20.0, -1.5), (3.0, -0.25)]


@pytest.mark.parametrize(("m", "n"), EXPONENTS)
@pytest.mark.parametrize("load", [-0.9, -0.3, -1e-6, 1e-6, 0.4, 7.0, 120.0])
def test_inverse_agrees_with_a_bracketing_solver(m: float, n: float, load: float) -> None:
    # reference: scipy's brentq on the law written out here, in ln a
    expected = math.exp(brentq(lambda t: math.exp(m * t) - math.exp(n * t) - load, -35, 35, xtol=1e-15, rtol=1e-14))
    assert power_pair.area_ratio(load, m, n) == pytest.approx(expected, rel=2e-13)


@QUIET
@given(ratio=st.floats(1e-3, 3.0), exponents=st.sampled_from(EXPONENTS))
def test_round_trip_by_area(ratio: float, exponents: tuple[float, float]) -> None:
    assert power_pair.area_ratio(power_pair.load(ratio, *exponents), *exponents) == pytest.approx(ratio, rel=1e-13)


@QUIET
@given(load=st.floats(-1e6, 1e6), exponents=st.sampled_from(EXPONENTS[1:]))
def test_round_trip_by_load(load: float, exponents: tuple[float, float]) -> None:
    back = power_pair.load(power_pair.area_ratio(load, *exponents), *exponents)
    assert back == pytest.approx(load, rel=1e-12, abs=1e-14)


def test_far_ends_follow_one_branch() -> None:
    # by hand: a ≈ f^(1/m) for f → ∞, a ≈ (−f)^(1/n) for f → −∞; the other branch is below 1e-13 of it here
    assert power_pair.area_ratio(1e12, 10, -1.5) == pytest.approx(10**1.2, rel=1e-12)
    assert power_pair.area_ratio(-1e12, 10, -1.5) == pytest.approx(1e-8, rel=1e-12)
    assert power_pair.area_ratio(1e300, 10, -1.5) == pytest.approx(1e30, rel=1e-12)


@pytest.mark.parametrize("load", [1e-18, -1e-18, 3e-12, -3e-12])
def test_near_the_reference_state_no_digit_is_lost(load: float) -> None:
    # by hand: ln a = f/(m − n) − (m + n)/2 · f²/(m − n)² + …; f is small enough for the first term alone
    logarithm = np.log(power_pair.area_ratio(np.array([load]), 10, -1.5))[0]
    assert logarithm == pytest.approx(load / 11.5, abs=2.3e-16)


@pytest.mark.parametrize(("m", "n"), EXPONENTS)
def test_load_slope_is_the_derivative(m: float, n: float) -> None:
    ratio, step = np.array([0.25, 0.8, 1.0, 1.15]), 1e-6
    by_difference = (power_pair.load(ratio * (1 + step), m, n) - power_pair.load(ratio * (1 - step), m, n)) / (2 * step)
    # the central difference is off by step²/6 · |third derivative| ≤ 1e-12/6 · m³ of the power
    assert power_pair.load_slope(ratio, m, n) == pytest.approx(by_difference, rel=2e-8)


def test_the_artery_law_ends_where_the_tube_closes() -> None:
    assert power_pair.area_ratio(np.nextafter(-1.0, 0.0), 0.5, 0.0) > 0
    with pytest.raises(ModelError, match="above -1"):
        power_pair.area_ratio([0.0, -1.0], 0.5, 0.0)
    assert power_pair.area_ratio(-1.0, 10, -1.5) < 1


@pytest.mark.parametrize("load", [math.nan, math.inf, -math.inf])
def test_loads_that_are_no_numbers_are_refused(load: float) -> None:
    with pytest.raises(ModelError, match="finite"):
        power_pair.area_ratio(load, 10, -1.5)


@pytest.mark.parametrize(
    ("m", "n"), [(0.0, 0.0), (-1.0, -1.5), (0.5, 0.1), (10.0, -2.0), (math.nan, 0.0), (1.0, math.nan)]
)
def test_exponents_out_of_range_are_refused(m: float, n: float) -> None:
    for call in (power_pair.load, power_pair.load_slope, power_pair.area_ratio):
        with pytest.raises(InputError, match="exponents"):
            call(1.0, m, n)


@pytest.mark.parametrize("ratio", [0.0, -1.0, math.nan, math.inf])
def test_area_ratios_that_no_tube_has_are_refused(ratio: float) -> None:
    with pytest.raises(InputError, match=r"number 1 of 0…1"):
        power_pair.load([1.0, ratio], 0.5, 0.0)


def test_no_stations_give_no_results() -> None:
    for call in (power_pair.load, power_pair.load_slope, power_pair.area_ratio):
        assert call([], 10, -1.5).shape == (0,)
