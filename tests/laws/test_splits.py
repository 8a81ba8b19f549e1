"""Flow split by size: check values computed outside the package from Q_i/Q = r_i^k/Σ r_j^k."""

from __future__ import annotations

import math

import pytest

from geomprep.errors import InputError
from geomprep.laws.splits import parent_radius, radius_power_shares

CHECK = [
    # exponent, share of 1.5 mm beside 1.0 mm, radius of their parent in mm, symmetric daughter/parent
    (2.0, 0.692308, 1.802776, 0.707107),
    (7 / 3, 0.720327, 1.726434, 0.742997),
    (2.5, 0.733736, 1.697756, 0.757858),
    (2.7, 0.749276, 1.669245, 0.773584),
    (2.76, 0.753819, 1.661727, 0.777913),
    (3.0, 0.771429, 1.635533, 0.793701),
]


@pytest.mark.parametrize(("exponent", "share", "parent", "symmetric"), CHECK)
def test_check_values(exponent: float, share: float, parent: float, symmetric: float) -> None:
    # the exponents 3, 2.7 and 7/3 are SEEN (Nakamura & Awa 2014, doi 10.1002/phy2.236); the rest from MEMORY
    assert radius_power_shares([1.5e-3, 1.0e-3], exponent) == pytest.approx([share, 1 - share], abs=6e-7)
    assert parent_radius([1.5, 1.0], exponent) == pytest.approx(parent, rel=4e-7)
    assert 1 / parent_radius([1.0, 1.0], exponent) == pytest.approx(symmetric, rel=7e-7)


def test_shares_do_not_depend_on_the_unit_and_survive_small_radii() -> None:
    assert radius_power_shares([3e-200, 4e-200], 2.0) == pytest.approx([9 / 25, 16 / 25], rel=1e-14)
    assert parent_radius([3e-200, 4e-200], 2.0) == pytest.approx(5e-200, rel=1e-14)
    assert radius_power_shares([0.7], 3.0).tolist() == [1.0]


def test_impossible_splits_are_refused() -> None:
    with pytest.raises(InputError, match="at least one vessel"):
        radius_power_shares([], 3.0)
    with pytest.raises(InputError, match="radius = 0"):
        radius_power_shares([1.0, 0.0], 3.0)
    for exponent in (0.0, -1.0, math.nan, math.inf):
        with pytest.raises(InputError, match="radius exponent"):
            radius_power_shares([1.0, 2.0], exponent)
