"""Stiffness relations against check values computed outside the package.

Formulas from MEMORY (high confidence): Formaggia et al. 2003, Moens-Korteweg. ρ = 1060 kg/m³.
"""

from __future__ import annotations

import pytest

from geomprep.errors import InputError
from geomprep.laws import stiffness


def test_artery_from_its_wall() -> None:
    # E = 0.4 MPa, h = 1 mm, r0 = 5 mm, ν = 1/2
    modulus = stiffness.wall_modulus(0.4e6, 1e-3, 5e-3)
    assert stiffness.stiffness_from_modulus(modulus, 0.5) == pytest.approx(106666.667, rel=4e-9)
    assert stiffness.thin_wall_speed(modulus, 1060.0, 0.5) == pytest.approx(7.09327, rel=1e-6)
    assert stiffness.moens_korteweg_speed(modulus, 1060.0) == pytest.approx(6.14295, rel=1e-6)


def test_the_two_wall_formulas_differ_by_the_poisson_factor() -> None:
    # 1/√(1 − 1/4) = 1.1547 for ν = 1/2; the same for ν = 0
    assert stiffness.thin_wall_speed(9e4, 1060.0, 0.5) / stiffness.moens_korteweg_speed(9e4, 1060.0) == pytest.approx(
        1.1547005383792515, rel=1e-12
    )
    assert stiffness.thin_wall_speed(9e4, 1060.0, 0.0) == stiffness.moens_korteweg_speed(9e4, 1060.0)


@pytest.mark.parametrize(
    ("speed", "m", "expected"), [(1.0, 10, 92.1739), (3.0, 10, 829.565), (1.0, 20, 49.3023), (3.0, 20, 443.721)]
)
def test_stiffness_of_a_vein_from_its_wave_speed(speed: float, m: float, expected: float) -> None:
    found = stiffness.stiffness_from_wave_speed(speed, 1060.0, m, -1.5)
    assert found == pytest.approx(expected, rel=1e-6)
    assert stiffness.wave_speed_from_stiffness(found, 1060.0, m, -1.5) == pytest.approx(speed, rel=1e-14)


@pytest.mark.parametrize(
    ("radius", "height", "modulus", "speed"),
    # T1 of the common benchmark, Boileau et al. 2015, doi 10.1002/cnm.2732: r, h, E from MEMORY,
    # confirmed by the relations between its columns; c computed outside the package
    [
        (3e-3, 0.3e-3, 7e5, 6.63515),
        (12e-3, 1.2e-3, 4e5, 5.01570),
        (8.6e-3, 1.032e-3, 5e5, 6.14295),
        (6e-3, 0.72e-3, 7e5, 7.26844),
    ],
)
def test_wave_speeds_of_the_benchmark_vessels(radius: float, height: float, modulus: float, speed: float) -> None:
    found = stiffness.thin_wall_speed(stiffness.wall_modulus(modulus, height, radius), 1060.0, 0.5)
    assert found == pytest.approx(speed, rel=1e-6)


def test_classical_speed_of_the_benchmark_carotid() -> None:
    # 5.7462 m/s: 13.4 % below the thin wall (same source)
    modulus = stiffness.wall_modulus(7e5, 0.3e-3, 3e-3)
    assert stiffness.moens_korteweg_speed(modulus, 1060.0) == pytest.approx(5.7462, rel=1e-5)


@pytest.mark.parametrize("ratio", [-0.1, 0.51, 1.0, float("nan")])
def test_poisson_ratios_out_of_range_are_refused(ratio: float) -> None:
    with pytest.raises(InputError, match=r"between 0 and 0\.5"):
        stiffness.stiffness_from_modulus(1e5, ratio)


def test_impossible_walls_are_refused() -> None:
    with pytest.raises(InputError, match="wall thickness = 0"):
        stiffness.wall_modulus(4e5, 0.0, 1e-3)
    with pytest.raises(InputError, match="wave speed = -1"):
        stiffness.stiffness_from_wave_speed(-1.0, 1060.0, 10, -1.5)
    with pytest.raises(InputError, match="radius = 0"):
        stiffness.power_wave_speed([1e-3, 0.0], 13.3, 1e-3, 0.3)
