"""The buckling reference state: the two conditions, its bound, and a published zero-pressure area."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.errors import ModelError
from geomprep.laws.reference_state import buckling_reference, slowest_wave_speed

QUIET = settings(max_examples=150, derandomize=True, deadline=None)
MMHG = 133.322


@pytest.mark.parametrize(
    ("radius", "height", "modulus", "pressure", "expected"),
    # Boileau et al. 2015, doi 10.1002/cnm.2732: areas at zero pressure, cm². All numbers from MEMORY; the table's
    # own relation √A0 = √A_d − P_d A_d/β confirms them to 2.4e-5 with P_d = 82 mmHg (carotid) and 71 mmHg (the rest;
    # the printed 9.46 kPa is a rounding)
    [
        (3e-3, 0.3e-3, 7e5, 82 * MMHG, 0.22038),
        (12e-3, 1.2e-3, 4e5, 71 * MMHG, 3.0605),
        (8.6e-3, 1.032e-3, 5e5, 71 * MMHG, 1.8062),
        (6e-3, 0.72e-3, 7e5, 71 * MMHG, 0.94787),
    ],
)
def test_zero_pressure_areas_of_the_benchmark_vessels(
    radius: float, height: float, modulus: float, pressure: float, expected: float
) -> None:
    speed = math.sqrt(2 / 3 * modulus * height / (1060 * radius))
    found, _ = buckling_reference(math.pi * radius**2, pressure, speed, 1060.0, 0.5, 0.0)
    assert found * 1e4 == pytest.approx(expected, rel=5e-5)


@QUIET
@given(
    transmural=st.floats(-4000, 4000),
    excess=st.floats(1e-4, 10.0),
    exponents=st.sampled_from([(10.0, -1.5), (20.0, -1.5), (0.5, 0.0)]),
)
def test_the_law_passes_through_the_imaged_state(
    transmural: float, excess: float, exponents: tuple[float, float]
) -> None:
    m, n = exponents
    area, density = 4e-5, 1060.0
    speed = math.sqrt(max(m * transmural, n * transmural) / density) + excess
    reference, stiffness = buckling_reference(area, transmural, speed, density, m, n)
    # the law and its slope, written out here
    ratio = area / float(reference)
    powers = np.array([ratio**m, ratio**n])
    scale = float(stiffness) * powers.sum()
    assert float(stiffness) * (powers[0] - powers[1]) == pytest.approx(transmural, abs=1e-12 * scale)
    assert float(stiffness) * (m * powers[0] - n * powers[1]) == pytest.approx(density * speed**2, rel=1e-12)
    assert (ratio > 1) == (transmural > 0) or abs(ratio - 1) < 1e-12


def test_at_zero_pressure_both_reference_states_agree() -> None:
    # K = ρc²/(m − n) = 1060 · 16/11.5
    reference, stiffness = buckling_reference(4e-5, 0.0, 4.0, 1060.0, 10, -1.5)
    assert reference == 4e-5
    assert stiffness == pytest.approx(1474.782608695652, rel=1e-14)


def test_bound_at_nine_mmhg() -> None:
    # √(10 · 9 · 133.322/1060) = √11.319792 = 3.364490 by hand
    assert slowest_wave_speed(9 * MMHG, 1060.0, 10, -1.5) == pytest.approx(3.364490, rel=1e-6)


def test_bounds_of_both_signs() -> None:
    # c² = 10 · 1000/1000 = 10 when distended, 1.5 · 1000/1000 = 1.5 when collapsed, none for the artery law below 0
    assert slowest_wave_speed([1000.0, -1000.0], 1000.0, 10, -1.5) == pytest.approx([3.16227766, 1.22474487], rel=1e-8)
    assert slowest_wave_speed(-1000.0, 1000.0, 0.5, 0.0) == 0.0


@pytest.mark.parametrize(("transmural", "bound"), [(900.0, 3.0), (-6000.0, 3.0)])
def test_refused_exactly_at_the_bound(transmural: float, bound: float) -> None:
    # ρ = 1000: 10 · 900 = 1.5 · 6000 = 1000 · 3², all exact in binary
    reference, stiffness = buckling_reference(4e-5, transmural, np.nextafter(bound, 4), 1000.0, 10, -1.5)
    assert reference > 0 and stiffness > 0
    for speed in (bound, bound - 1e-9, 0.5 * bound):
        with pytest.raises(ModelError, match="faster than 3 m/s"):
            buckling_reference([4e-5, 4e-5], [0.0, transmural], [4.0, speed], 1000.0, 10, -1.5)
