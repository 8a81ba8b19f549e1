"""The published rows: values in SI, how each was checked, and what the loader refuses."""

from __future__ import annotations

import dataclasses
import math
import re

import pytest

from geomprep.errors import InputError
from geomprep.laws.stiffness import RELATIONS
from geomprep.literature import parse_rows, row, rows

MMHG = 133.322387415


@pytest.mark.parametrize(
    ("key", "value", "checked"),
    [
        ("blood-density", 1060.0, "seen"),
        ("blood-viscosity", 3.5e-3, "seen"),  # Hund et al. 2017, doi 10.3390/fluids2010010
        ("velocity-profile-parabolic", 2.0, "common practice"),
        ("wall-poisson-ratio", 0.5, "common practice"),
        ("wave-speed-dog-limb-veins-1971", 1.3, "seen"),  # doi 10.1001/archsurg.1971.01350010055014
        ("radius-power-murray-1926", 3.0, "seen"),
        ("radius-power-nakamura-awa-2014-small", 3.0, "seen"),  # doi 10.1002/phy2.236
        ("radius-power-nakamura-awa-2014-medium", 2.7, "seen"),
        ("radius-power-nakamura-awa-2014-large", 2.33, "seen"),
    ],
)
def test_values(key: str, value: float, checked: str) -> None:
    assert row(key).value == pytest.approx(value, rel=1e-15)
    assert row(key).checked == checked


@pytest.mark.parametrize(
    ("key", "coefficients", "confidence"),
    # all from MEMORY; CGS constants converted by hand: 1 g/(s² cm) = 0.1 Pa, 1/cm = 100/m
    [
        ("wave-speed-reymond-2009", {"speed": 13.3, "diameter": 1e-3, "exponent": 0.3}, "high"),
        ("wall-modulus-olufsen-1999", {"k1": 2.00e6, "k2": -2253.0, "k3": 8.65e4}, "high"),
        ("wall-modulus-mynard-smolich-2015", {"k1": 3.0e5, "k2": -900.0, "k3": 3.37e4}, "medium"),
        ("wall-thickness-blanco-2015", {"a": 0.2802, "b": -505.3, "c": 0.1324, "d": -11.14}, "high"),
        ("artery-exponents-formaggia-2003", {"m": 0.5, "n": 0.0}, "high"),
        ("vein-exponents-brook-1999", {"m": 10.0, "n": -1.5}, "high"),
    ],
)
def test_coefficients(key: str, coefficients: dict[str, float], confidence: str) -> None:
    assert dict(row(key).coefficients) == pytest.approx(coefficients, rel=1e-14)
    assert (row(key).checked, row(key).confidence) == ("memory", confidence)


@pytest.mark.parametrize(
    ("radius", "modulus", "ratio"),
    # E h/r0 in Pa (Olufsen 1999) and h/r0 (Blanco et al. 2015), computed outside the package from the constants
    [
        (0.1e-3, 1683053.4, 0.398646),
        (1.0e-3, 296667.00, 0.299985),
        (2.0e-3, 108585.08, 0.231476),
        (5.0e-3, 86525.63, 0.147626),
        (12.5e-3, 86500.00, 0.115696),
    ],
)
def test_relations_at_check_radii(radius: float, modulus: float, ratio: float) -> None:
    for key, expected, tolerance in [
        ("wall-modulus-olufsen-1999", modulus, 1e-7),
        ("wall-thickness-blanco-2015", ratio, 5e-6),
    ]:
        one = row(key)
        found = RELATIONS[one.function].function(radius, **dict(one.coefficients))
        assert found == pytest.approx(expected, rel=tolerance)


def test_where_a_stiffness_holds() -> None:
    assert row("wave-speed-reymond-2009").transmural_pressure == pytest.approx(100 * MMHG)
    assert row("wall-modulus-olufsen-1999").transmural_pressure is None
    assert (row("wall-modulus-olufsen-1999").radius_low, row("wall-modulus-olufsen-1999").radius_high) == (1e-4, 1e-2)


def test_every_row_has_a_source_and_is_honest_about_it() -> None:
    keys = [one.key for one in rows()]
    assert len(keys) == len(set(keys)) > 30
    for one in rows():
        assert re.fullmatch(r"[a-z0-9-]+", one.key)
        assert one.citation and one.of
        assert not one.doi or re.fullmatch(r"10\.\d{4,9}/\S+", one.doi)
        # what was seen says where; what was not seen says how sure the memory is
        assert one.place or one.checked != "seen"
        assert (one.confidence in ("high", "medium")) == (one.checked == "memory")
        for number in (one.value, one.low, one.high, *dict(one.coefficients).values()):
            assert number is None or math.isfinite(number)


def test_rows_cannot_be_changed() -> None:
    with pytest.raises(dataclasses.FrozenInstanceError):
        row("blood-density").value = 1.0  # type: ignore[misc]


def test_unknown_keys_name_the_nearest() -> None:
    with pytest.raises(InputError, match=r"'blood-viscosty' is unknown; the nearest are blood-viscosity"):
        row("blood-viscosty")
    with pytest.raises(InputError, match="the nearest are"):
        row("")


SOUND = {
    "key": '"k"',
    "kind": '"value"',
    "of": '"a thing"',
    "quantity": '"speed"',
    "value": '"2 m/s"',
    "citation": '"A 2000"',
    "checked": '"seen"',
}
RELATION = {
    "kind": '"relation"',
    "function": '"power_wave_speed"',
    "coefficients": '{ speed = "1 m/s", diameter = "1 mm", exponent = "0.3" }',
    "quantity": None,
    "value": None,
}
SIZE = {"kind": '"size"', "size_means": '"diameter"', "mean": '"4 mm"', "quantity": None, "value": None}


def written(**changes: str | None) -> str:
    fields = {**SOUND, **changes}
    return "[[row]]\n" + "\n".join(f"{key} = {value}" for key, value in fields.items() if value is not None) + "\n"


def test_sound_rows_are_read() -> None:
    (value,) = parse_rows(written(range='["1 m/s", "300 cm/s"]', checked='"memory"', confidence='"medium"'))
    assert (value.value, value.low, value.high, value.vessel_class) == (2.0, 1.0, 3.0, "any")
    (relation,) = parse_rows(written(**RELATION))
    assert dict(relation.coefficients) == {"speed": 1.0, "diameter": 1e-3, "exponent": 0.3}
    (size,) = parse_rows(written(**SIZE, spread='"0.5 mm"'))
    assert (size.value, size.low, size.high) == pytest.approx((2e-3, 1.5e-3, 2.5e-3))


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"checked": '"memory"', "confidence": '"low"'}, "a low one must be read in its source first"),
        ({"checked": '"memory"'}, "a memory needs high or medium"),
        ({"confidence": '"high"'}, "anything else has none"),
        ({"checked": '"guessed"'}, "checked = 'guessed'; choose one of seen, memory, common practice"),
        ({"kind": '"rumour"'}, "kind = 'rumour'; choose one of"),
        ({"citation": None}, "'citation' is missing"),
        ({"citation": '""'}, "'citation' is missing"),
        ({"key": None}, r"literature row '\?': 'key' is missing"),
        ({"year": "2000"}, "a row of kind value has no field 'year'"),
        ({"coefficients": "{}"}, "a row of kind value has no field 'coefficients'"),
        ({"vessel_class": '"nerve"'}, "vessel_class = 'nerve'"),
        ({"value": '"2"'}, "a speed needs its unit"),
        ({"value": '"2 kg"'}, "no unit of speed"),
        ({"value": None}, "'value' is missing"),
        ({"quantity": None}, "'quantity' is missing"),
        ({"quantity": '"haste"'}, "quantity = 'haste'"),
        ({"range": '["3 m/s", "1 m/s"]'}, "interval 3 m/s to 1 m/s is empty"),
        ({"range": '["3 m/s"]'}, "an interval is two quantities"),
        ({"value": "2"}, "value = 2: it must be text"),
        ({"m": "1.0"}, "has no field 'm'"),
        ({**RELATION, "coefficients": "{ speed = 1, diameter = 1, exponent = 0.3 }"}, "coefficients = .* must be text"),
        ({"radius": '["1 m/s", "2 m/s"]'}, "no unit of length"),
        ({"transmural_pressure": '"100"'}, "a pressure needs its unit"),
        ({**RELATION, "function": '"power_of_love"'}, "function 'power_of_love' is unknown"),
        ({**RELATION, "function": None}, "'function' is missing"),
        ({**RELATION, "coefficients": '{ speed = "1 m/s" }'}, "takes speed, diameter, exponent"),
        ({**RELATION, "coefficients": '{ speed = "1 m", diameter = "1 mm", exponent = "0.3" }'}, "dimension of 'm/s'"),
        ({**RELATION, "coefficients": '{ speed = "fast", diameter = "1 mm", exponent = "0.3" }'}, "'fast'"),
        ({**SIZE, "size_means": '"girth"'}, "size_means = 'girth'"),
        ({**SIZE, "mean": None}, "needs a mean or an interval above zero"),
        ({**SIZE, "spread": '"2 mm"'}, "above zero"),
        ({"kind": '"exponents"', "quantity": None, "value": None, "m": "1.0"}, "'n' is missing"),
        (
            {"kind": '"exponents"', "quantity": None, "value": None, "m": "1", "n": '"0"'},
            "n = '0': it must be a number",
        ),
    ],
)
def test_faulty_rows_are_refused(changes: dict[str, str | None], message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        parse_rows(written(**changes))
    assert "\n" not in str(caught.value)


def test_a_key_stands_once() -> None:
    with pytest.raises(InputError, match="'k' stands twice"):
        parse_rows(written() + written())


def test_text_that_is_no_table_is_refused() -> None:
    with pytest.raises(InputError, match="cannot be read"):
        parse_rows("[[row]\n")
