"""Blood: what is stated, what is published, what cannot be."""

from __future__ import annotations

import math

import pytest

from geomprep.assign import BloodSettings, assign_blood
from geomprep.errors import InputError
from geomprep.model import Basis


def test_published_values_where_nothing_is_stated() -> None:
    # 1060 kg/m³ and 3.5 mPa·s (Hund et al. 2017, doi 10.3390/fluids2010010), both SEEN; parabolic by common practice
    blood, origins = assign_blood()
    assert (blood.density, blood.viscosity, blood.velocity_profile) == (1060.0, 3.5e-3, 2.0)
    assert {origin.basis for origin in origins} == {Basis.PUBLISHED}
    assert [origin.detail for origin in origins] == ["blood-density", "blood-viscosity", "velocity-profile-parabolic"]


def test_stated_values_are_the_persons() -> None:
    blood, origins = assign_blood(BloodSettings(viscosity=4e-3, velocity_profile=9.0))
    assert (blood.density, blood.viscosity, blood.velocity_profile) == (1060.0, 4e-3, 9.0)
    assert [(origin.field, origin.basis) for origin in origins] == [
        ("blood.density", Basis.PUBLISHED),
        ("blood.viscosity", Basis.USER),
        ("blood.velocity_profile", Basis.USER),
    ]


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("density", 1.06),  # g/cm³ taken for SI
        ("density", -1060.0),
        ("viscosity", 3.5),  # mPa·s taken for SI
        ("viscosity", 0.0),
        ("velocity_profile", 0.0),
        ("velocity_profile", math.nan),
        ("density", math.inf),
    ],
)
def test_impossible_values_are_refused(name: str, value: float) -> None:
    with pytest.raises(InputError, match=rf"blood\.{name} = .* between"):
        assign_blood(BloodSettings(**{name: value}))
