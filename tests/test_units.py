"""Units against printed tables."""

import pytest

from geomprep.errors import InputError
from geomprep.units import length_factor, parse_quantity, unit_factor


@pytest.mark.parametrize(
    ("text", "kind", "expected", "source"),
    [
        # NIST Special Publication 811 (2008), appendix B.8 (memory): printed conversion factors
        ("1 mmHg", "pressure", 133.3224, "NIST SP 811"),
        ("1 cmH2O", "pressure", 98.0665, "NIST SP 811"),
        ("1 dyn/cm^2", "pressure", 0.1, "NIST SP 811"),
        ("1 cP", "viscosity", 1e-3, "NIST SP 811"),
        ("1 in", "length", 0.0254, "NIST SP 811"),
        # 1 mmHg·s/mL = 1.33322e8 Pa·s/m³ = 1333.22 dyn·s/cm⁵: arithmetic from the rows above
        ("1 mmHg*s/mL", "resistance", 1.33322e8, "arithmetic"),
        ("1333.22 dyn*s/cm^5", "resistance", 1.33322e8, "arithmetic"),
        ("1 mL/mmHg", "compliance", 7.50062e-9, "arithmetic"),
        ("443 mL/min", "flow", 443e-6 / 60, "arithmetic"),
        ("1060 kg/m^3", "density", 1060.0, "identity"),
        ("3.5 mPa*s", "viscosity", 3.5e-3, "identity"),
        ("1.06 g/cm^3", "density", 1060.0, "arithmetic"),
    ],
)
def test_factors(text: str, kind: str, expected: float, source: str) -> None:
    assert parse_quantity(text, kind) == pytest.approx(expected, rel=5e-6), source


@pytest.mark.parametrize(
    ("text", "kind", "word"),
    [
        ("10", "pressure", "needs its unit"),
        ("ten mmHg", "pressure", "expected a number"),
        ("10 furlong", "length", "no unit known"),
        ("10 mm", "pressure", "no unit of pressure"),
        ("1e999 mm", "length", "expected a number"),
        ("nan mm", "length", "expected a number"),
        ("", "length", "expected a number"),
    ],
)
def test_refusals_name_value_and_way_out(text: str, kind: str, word: str) -> None:
    with pytest.raises(InputError, match=word) as caught:
        parse_quantity(text, kind, "some.key")
    assert "some.key" in str(caught.value) or "unit" in str(caught.value)
    assert "\n" not in str(caught.value)


def test_length_units() -> None:
    assert length_factor("mm") == 1e-3
    with pytest.raises(InputError, match="choose one of"):
        length_factor("parsec")
    assert unit_factor("1/mmHg")[1] == (1, -1, 2)
