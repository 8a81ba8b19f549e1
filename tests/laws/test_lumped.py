"""Lumped values against closed forms and a textbook's worked example.

The closed forms of tapered vessels are derived (linear radius, integrated by hand and by quadrature
outside the package); μ = 3.5 mPa·s and ρ = 1060 kg/m³ unless said otherwise.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import quad

from geomprep.errors import InputError
from geomprep.laws import lumped


def test_straight_vessel() -> None:
    # l = 50 mm, r = 2 mm, c = 13.3/4^0.3 = 8.774728 m/s
    length, radius, speed = 0.05, 2e-3, 8.774728
    area = math.pi * radius**2
    assert lumped.resistance(length / radius**4, 3.5e-3, 2.0) == pytest.approx(2.7852115e7, rel=2e-8)
    assert lumped.resistance_from_area(length / area**2, 3.5e-3, 2.0) == pytest.approx(2.7852115e7, rel=2e-8)
    assert lumped.inertance(length / area, 1060.0) == pytest.approx(4.217606e6, rel=2e-7)
    distensibility = float(lumped.distensibility(speed, 1060.0))
    compliance = lumped.compliance([0, length], [radius, radius], [distensibility] * 2, [0, 2])
    assert compliance == pytest.approx([7.698511e-12], rel=2e-7)
    assert lumped.characteristic_impedance(area, speed, 1060.0) == pytest.approx(7.401669e8, rel=2e-7)


def test_blunt_profile_has_more_friction() -> None:
    # exponent 9 against 2: (9 + 2)/(2 + 2) = 2.75
    assert lumped.resistance(1e9, 3.5e-3, 9.0) / lumped.resistance(1e9, 3.5e-3, 2.0) == pytest.approx(2.75, rel=1e-14)


def test_textbook_needle() -> None:
    # OpenStax College Physics 2e, example 12.8 (SEEN): r 0.150 mm, l 2.50 cm, η 1.00e-3 Pa·s, Q 0.120 cm³/s,
    # from 8.00 mmHg = 1.066e3 Pa to 1.62e4 Pa as printed
    resistance = float(lumped.resistance(2.5e-2 / 0.150e-3**4, 1e-3, 2.0))
    assert resistance == pytest.approx(1.257521e11, rel=1e-6)
    assert 1.066e3 + resistance * 0.120e-6 == pytest.approx(1.62e4, rel=0.005)


def test_taper_with_constant_wave_speed() -> None:
    # 2.5 → 1.5 mm over 50 mm, c = 8.774728: C = V/(ρc²), exact with two stations only
    distensibility = 1 / (1060 * 8.774728**2)
    found = lumped.compliance([0, 0.05], [2.5e-3, 1.5e-3], [distensibility] * 2, [0, 2])
    assert found == pytest.approx([7.858896e-12], rel=2e-7)


def test_taper_with_constant_wall() -> None:
    # C = (3π/2Eh) ∫r³ds with ∫r³ds = 4.25e-10 m⁴ for the same vessel; distensibility 3r/(2Eh) with E h = 320 N/m
    radius = np.array([2.5e-3, 1.5e-3])
    found = lumped.compliance([0, 0.05], radius, 1.5 * radius / 320.0, [0, 2])
    assert found == pytest.approx([1.5 * math.pi / 320.0 * 4.25e-10], rel=1e-12)


def test_compliance_converges_with_the_square_of_the_spacing() -> None:
    # distensibility growing as r³, which no straight line follows; exact value by quadrature
    def taper(s: float) -> float:
        return 2e-3 - 1e-2 * s

    exact = quad(lambda s: math.pi * taper(s) ** 2 * 1e3 * taper(s) ** 3, 0, 0.1, epsabs=0, epsrel=1e-12)[0]
    errors = []
    for count in (8, 16, 32):
        s = np.linspace(0, 0.1, count + 1)
        errors.append(lumped.compliance(s, taper(s), 1e3 * taper(s) ** 3, [0, count + 1])[0] / exact - 1)
    assert errors[0] > 1e-4
    assert [errors[0] / errors[1], errors[1] / errors[2]] == pytest.approx([4, 4], rel=0.02)


def test_vessels_do_not_leak_into_each_other() -> None:
    # by hand: unit distensibility gives volumes; π·1²·2, then π·2²·3 with the distance starting anew
    found = lumped.compliance([0, 1, 2, 0, 3], [1, 1, 1, 2, 2], [1.0] * 5, [0, 3, 5])
    assert found == pytest.approx([2 * math.pi, 12 * math.pi], rel=1e-14)


def test_characteristic_impedance_of_the_benchmark_vessels() -> None:
    # Boileau et al. 2015, doi 10.1002/cnm.2732: first windkessel resistance = ρc/A of the vessel. MEMORY; the
    # relation reproduces all five printed digits
    for radius, height, modulus, printed in [
        (3e-3, 0.3e-3, 7e5, 2.4875e8),
        (12e-3, 1.2e-3, 4e5, 1.1752e7),
        (6e-3, 0.72e-3, 7e5, 6.8123e7),
    ]:
        speed = math.sqrt(2 / 3 * modulus * height / (1060 * radius))
        found = lumped.characteristic_impedance(math.pi * radius**2, speed, 1060.0)
        assert found == pytest.approx(printed, rel=5e-5)


def test_impossible_numbers_are_refused() -> None:
    with pytest.raises(InputError, match="viscosity = 0"):
        lumped.resistance(1.0, 0.0, 2.0)
    with pytest.raises(InputError, match="density = -1"):
        lumped.inertance(1.0, -1.0)
    with pytest.raises(InputError, match="radius = 0"):
        lumped.compliance([0, 1], [1, 0], [1, 1], [0, 2])
