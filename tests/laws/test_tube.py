"""Tube laws in SI.

Check values: computed outside the package from the published formulas of Formaggia et al. 2003
(artery, doi 10.1023/B:ENGI.0000007980.01347.29) and Brook et al. 1999 (vein, m = 10; m = 20 after
Shapiro 1977, doi 10.1115/1.3426281). Formulas and exponents come from MEMORY (high confidence).
ρ = 1060 kg/m³ throughout.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from geomprep.errors import InputError, ModelError
from geomprep.laws import tube

ARTERY, VEIN, SHAPIRO = (0.5, 0.0), (10.0, -1.5), (20.0, -1.5)
A0 = 7.85398163397448e-5  # r0 = 5 mm
K_ARTERY, K_VEIN = 106666.6666666667, 111.1111111111111


@pytest.mark.parametrize(
    ("shape", "stiffness", "ratio", "pressure", "speed"),
    [
        (ARTERY, K_ARTERY, 1.2, 10180.81, 7.42406),
        (ARTERY, K_ARTERY, 0.8, -11261.10, 6.70840),
        (VEIN, K_VEIN, 1.2, 603.446, 2.57097),
        (VEIN, K_VEIN, 1.1, 191.884, 1.68970),
        (VEIN, K_VEIN, 0.8, -143.352, 0.57645),
        (VEIN, K_VEIN, 0.5, -314.161, 0.66764),
        (VEIN, K_VEIN, 0.3, -676.200, 0.97821),
        (SHAPIRO, K_VEIN, 1.2, 4175.208, 8.97173),
        (SHAPIRO, K_VEIN, 0.5, -314.270, 0.66688),
    ],
)
def test_check_values(
    shape: tuple[float, float], stiffness: float, ratio: float, pressure: float, speed: float
) -> None:
    area = ratio * A0
    assert tube.pressure(area, A0, stiffness, 0.0, shape) == pytest.approx(pressure, rel=2e-6)
    assert tube.area(pressure, A0, stiffness, 0.0, shape) == pytest.approx(area, rel=2e-6)
    # printed to five decimals
    assert tube.wave_speed(area, A0, stiffness, 1060.0, shape) == pytest.approx(speed, abs=5.01e-6)


def test_artery_at_its_reference_state() -> None:
    # E = 0.4 MPa, h = 1 mm, r0 = 5 mm, ν = 1/2
    assert tube.wave_speed(A0, A0, K_ARTERY, 1060.0, ARTERY) == pytest.approx(7.09327, rel=1e-6)
    assert 1 / tube.slope(A0, A0, K_ARTERY, ARTERY) == pytest.approx(1.47262e-9, rel=2e-6)
    assert tube.pressure(A0, A0, K_ARTERY, 1234.5, ARTERY) == 1234.5


def test_vein_at_its_reference_state() -> None:
    assert tube.wave_speed(A0, A0, K_VEIN, 1060.0, VEIN) == pytest.approx(1.09793, rel=4e-6)
    assert tube.wave_speed(A0, A0, K_VEIN, 1060.0, SHAPIRO) == pytest.approx(1.50122, rel=4e-6)


@pytest.mark.parametrize("shape", [ARTERY, VEIN, SHAPIRO])
def test_wave_speed_is_that_of_the_pressure_gradient(shape: tuple[float, float]) -> None:
    # Bramwell & Hill 1922: c² = (A/ρ) dp/dA, the gradient by central differences of the pressure
    area = A0 * np.array([0.3, 0.7, 1.0, 1.1])
    step = 1e-6 * area
    rise = tube.pressure(area + step, A0, 500.0, 80.0, shape) - tube.pressure(area - step, A0, 500.0, 80.0, shape)
    squared = area / 1060.0 * rise / (2 * step)
    assert tube.wave_speed(area, A0, 500.0, 1060.0, shape) ** 2 == pytest.approx(squared, rel=1e-8)


def test_arrays_broadcast_per_station() -> None:
    # by hand: √a − 1 at a = 4, 9 with K = 10, 100 and p0 = 1, 2
    pressure = tube.pressure([4e-6, 9e-6], [1e-6, 1e-6], [10.0, 100.0], [1.0, 2.0], ARTERY)
    assert pressure.tolist() == pytest.approx([11.0, 202.0], rel=1e-14)
    assert tube.area(pressure, 1e-6, [10.0, 100.0], [1.0, 2.0], ARTERY) == pytest.approx([4e-6, 9e-6], rel=1e-13)


def test_no_area_below_the_closing_pressure_of_an_artery() -> None:
    with pytest.raises(ModelError, match=r"transmural pressure -950 Pa: .* only above -950 Pa"):
        tube.area([0.0, -950.0], 1e-6, [1000.0, 1000.0], 50.0, ARTERY)
    assert tube.area(-1e6, 1e-6, 1000.0, 50.0, VEIN) > 0


@pytest.mark.parametrize("pressure", [math.nan, math.inf, -math.inf])
def test_pressures_that_are_no_numbers_are_refused(pressure: float) -> None:
    for shape in (ARTERY, VEIN):
        with pytest.raises(ModelError, match="only above"):
            tube.area(pressure, 1e-6, 1000.0, 0.0, shape)


def test_impossible_tubes_are_refused() -> None:
    with pytest.raises(InputError, match="area = 0"):
        tube.pressure(0.0, 1e-6, 1.0, 0.0, ARTERY)
    with pytest.raises(InputError, match="reference area = -1"):
        tube.pressure(1e-6, -1.0, 1.0, 0.0, ARTERY)
    with pytest.raises(InputError, match="stiffness = nan"):
        tube.area(1.0, 1e-6, math.nan, 0.0, ARTERY)
    with pytest.raises(InputError, match="'logarithm' is unknown"):
        tube.pressure(1e-6, 1e-6, 1.0, 0.0, ARTERY, "logarithm")


@pytest.mark.parametrize("name", tube.FORMS)
def test_every_law_says_its_parameters_in_its_equation(name: str) -> None:
    form = tube.FORMS[name]
    assert form.parameters and all(parameter in form.equation for parameter in form.parameters)
