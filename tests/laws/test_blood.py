"""Velocity profiles against closed forms."""

from __future__ import annotations

import math

import pytest
from scipy.integrate import quad

from geomprep.errors import InputError
from geomprep.laws import blood


@pytest.mark.parametrize(("exponent", "expected"), [(2, 4 / 3), (9, 1.1)])
def test_momentum_factor(exponent: float, expected: float) -> None:
    # 4/3 for Poiseuille and 1.1 for exponent 9 (the latter SEEN in public text)
    assert blood.momentum_factor(exponent) == pytest.approx(expected, rel=1e-15)
    assert blood.profile_exponent(expected) == pytest.approx(exponent, rel=1e-12)


@pytest.mark.parametrize("exponent", [1.0, 2.0, 5.5, 9.0])
def test_factors_follow_from_the_profile(exponent: float) -> None:
    # u/U = (z + 2)/z (1 − y^z) on y = r/R, integrated numerically over the cross-section
    def velocity(y: float) -> float:
        return (exponent + 2) / exponent * (1 - y**exponent)

    assert quad(lambda y: 2 * y * velocity(y), 0, 1)[0] == pytest.approx(1, rel=1e-9)
    momentum = quad(lambda y: 2 * y * velocity(y) ** 2, 0, 1)[0]
    assert blood.momentum_factor(exponent) == pytest.approx(momentum, rel=1e-9)
    # wall shear: force per length = 2πR μ |du/dr| at R = 2π μ U (z + 2)
    slope = (velocity(1 - 1e-7) - velocity(1)) / 1e-7
    assert blood.friction_coefficient(1.0, exponent) == pytest.approx(2 * math.pi * slope, rel=1e-5)


def test_impossible_profiles_are_refused() -> None:
    for call in (blood.momentum_factor, lambda z: blood.friction_coefficient(1.0, z)):
        for exponent in (0.0, -2.0, math.inf, math.nan):
            with pytest.raises(InputError, match="exponent"):
                call(exponent)
    for factor in (1.0, 2.0, 0.5, math.nan):
        with pytest.raises(InputError, match="between 1 and 2"):
            blood.profile_exponent(factor)
