"""Outlets: stated, calibrated by hand calculation, refused with the path of losses."""

import dataclasses

import numpy as np
import pytest

from geomprep.assign import (
    CalibrationSettings,
    InletSettings,
    OutletSettings,
    assign_inlets,
    assign_outlets,
    resolve_ends,
)
from geomprep.errors import CaseError, ModelError
from geomprep.flow import steady_state
from geomprep.model import Lumped, Network, Outlet

MMHG = 133.322387415
# Poiseuille at 4 mPa·s, 8 μ L/(π r⁴), by hand: trunk 100 mm r 3 mm; branches √(60² + 50²) = 78.1025 mm, r 2 and 1.5 mm
R_TRUNK, R_LEFT, R_RIGHT = 1.257521e7, 4.972159e7, 1.571448e8
EVERY = "every other open end"


def outlets(
    network: Network, entries: list[OutletSettings], calibration: CalibrationSettings | None = None,
    inlet: InletSettings | None = None, speed: float = 8.0,
) -> tuple[Network, tuple[Outlet, ...]]:  # fmt: skip
    """Assign ends to a network and return both."""
    inlets = [inlet or InletSettings("trunk", pressure=93 * MMHG)]
    ends = resolve_ends(network, inlets, entries)
    made, _, _ = assign_inlets(ends, inlets)
    resistance = 8 * 4e-3 / np.pi * network.measures.inverse_fourth_power
    lumped = Lumped(resistance, np.ones_like(resistance), np.full_like(resistance, 1e-11))
    network = dataclasses.replace(ends.network, inlets=made, lumped=lumped)
    result = assign_outlets(network, ends, entries, calibration, np.full(len(network.stations), speed))
    return dataclasses.replace(network, outlets=result.outlets), result.outlets


def by_name(network: Network, made: tuple[Outlet, ...]) -> dict[str, Outlet]:
    return {network.segments.name[np.flatnonzero(network.segments.to_node == one.node)[0]]: one for one in made}


def test_resistances_by_hand(fork: Network) -> None:
    resistance = 8 * 4e-3 / np.pi * fork.measures.inverse_fourth_power
    assert sorted(resistance) == pytest.approx([R_TRUNK, R_LEFT, R_RIGHT], rel=1e-6)


def test_calibration_by_hand(fork: Network) -> None:
    """300 mL/min, 93 mmHg at the inlet, shares 0.6 and 0.4, far pressure 5 mmHg."""
    entries = [OutletSettings("left branch", share=0.6), OutletSettings("right branch")]
    network, made = outlets(
        fork, entries, CalibrationSettings(5e-6, 93 * MMHG, "shares", far_pressure=5 * MMHG, model="resistance")
    )
    found = by_name(network, made)
    fork_pressure = 93 * MMHG - R_TRUNK * 5e-6
    for name, share, branch in (("left branch", 0.6, R_LEFT), ("right branch", 0.4, R_RIGHT)):
        flow = share * 5e-6
        expected = (fork_pressure - branch * flow - 5 * MMHG) / flow
        assert found[name].resistance == pytest.approx(expected, rel=1e-6)
        assert found[name].share == pytest.approx(share)
    state = steady_state(network)
    assert np.sort(state.outlet_flow) == pytest.approx([2e-6, 3e-6], rel=1e-9)


@pytest.mark.parametrize(
    ("exponent", "share"),
    # r^k/Σr^k for radii 2 and 1.5 mm: 8/(8 + 3.375), and 2^(7/3)/(2^(7/3) + 1.5^(7/3)), by hand
    [(3.0, 0.703297), ("radius-power-murray-1926", 0.703297), (7 / 3, 0.661785)],
)
def test_radius_power_split(fork: Network, exponent: float | str, share: float) -> None:
    settings = CalibrationSettings(5e-6, 93 * MMHG, "radius power", exponent, 5 * MMHG, "resistance")
    network, made = outlets(fork, [OutletSettings(EVERY)], settings)
    assert by_name(network, made)["left branch"].share == pytest.approx(share, abs=2e-6)


def test_windkessel_of_a_published_example() -> None:
    """Q 150 mL/min, 93 to 5 mmHg: R_T = 4.6929344e9; R1 = ρc/A = 1.6811410e9 at r 1.4 mm, c 9.765719 m/s (derived)."""
    from geomprep.laws.lumped import characteristic_impedance

    total = (93 - 5) * 133.322 / (150e-6 / 60)
    assert total == pytest.approx(4.6929344e9, rel=1e-7)
    assert characteristic_impedance(np.pi * 1.4e-3**2, 9.765719, 1060.0) == pytest.approx(1.6811410e9, rel=1e-6)


def test_windkessel_parts_and_time_constant(fork: Network) -> None:
    settings = CalibrationSettings(
        5e-6, 93 * MMHG, "radius power", 3.0, 5 * MMHG, "three-element windkessel", time_constant=0.7
    )
    network, made = outlets(fork, [OutletSettings(EVERY)], settings)
    for name, radius in (("left branch", 2e-3), ("right branch", 1.5e-3)):
        one = by_name(network, made)[name]
        assert one.characteristic_resistance == pytest.approx(1060 * 8 / (np.pi * radius**2), rel=1e-12)
        assert one.peripheral_resistance * one.compliance == pytest.approx(0.7, rel=1e-12)


def test_total_compliance_is_shared_after_what_the_segments_hold(fork: Network) -> None:
    settings = CalibrationSettings(
        5e-6, 93 * MMHG, "radius power", 3.0, 5 * MMHG, "three-element windkessel", compliance=1e-9
    )
    _, made = outlets(fork, [OutletSettings(EVERY)], settings)
    assert sum(one.compliance for one in made) == pytest.approx(1e-9 - 3e-11, rel=1e-9)  # three segments of 1e-11
    assert len({round(one.compliance * one.resistance, 12) for one in made}) == 1
    with pytest.raises(ModelError, match="nothing is left"):
        outlets(fork, [OutletSettings(EVERY)], dataclasses.replace(settings, compliance=2e-11))


def test_a_flow_that_the_geometry_cannot_carry_names_the_way(fork: Network) -> None:
    """81 mL/s through 1.57e8 Pa·s/m³ lose 95 mmHg, more than the 88 that there are."""
    settings = CalibrationSettings(90e-6, 93 * MMHG, "shares", far_pressure=5 * MMHG, model="resistance")
    entries = [OutletSettings("left branch", share=0.1), OutletSettings("right branch")]
    with pytest.raises(ModelError, match="right branch") as caught:
        outlets(fork, entries, settings)
    said = str(caught.value)
    assert "trunk" in said
    assert "mmHg" in said
    assert "\n" not in said


def test_a_characteristic_resistance_above_the_total_is_refused(fork: Network) -> None:
    settings = CalibrationSettings(
        5e-6, 93 * MMHG, "radius power", 3.0, 5 * MMHG, "three-element windkessel", time_constant=0.7
    )
    # ρc/A of the left branch: 1060 · 200/(1.257e-5) = 1.7e10 > (93 − 5) mmHg/(3.5e-6 m³/s) = 3.3e9
    with pytest.raises(ModelError, match=r"left branch.*characteristic"):
        outlets(fork, [OutletSettings(EVERY)], settings, speed=200.0)


@pytest.mark.parametrize(
    ("entries", "calibration", "word"),
    [
        ([OutletSettings(EVERY)], None, "model"),
        ([OutletSettings(EVERY, model="cork")], None, "cork"),
        ([OutletSettings(EVERY, model="fixed pressure")], None, "pressure"),
        ([OutletSettings(EVERY, model="resistance")], None, "resistance|calibration|total_flow"),
        ([OutletSettings(EVERY)], CalibrationSettings(5e-6, 93 * MMHG, "fairness", model="resistance"), "fairness"),
        ([OutletSettings(EVERY)], CalibrationSettings(5e-6, 93 * MMHG, "radius power", model="resistance"), "exponent"),
        ([OutletSettings(EVERY)], CalibrationSettings(5e-6, 93 * MMHG, "shares", model="resistance"), "share"),
        (
            [OutletSettings("left branch", share=0.9), OutletSettings("right branch", share=0.3)],
            CalibrationSettings(5e-6, 93 * MMHG, "shares", model="resistance"),
            "add up",
        ),
    ],
)
def test_what_is_missing_or_wrong_is_named(fork: Network, entries, calibration, word: str) -> None:
    with pytest.raises(CaseError, match=word) as caught:
        outlets(fork, entries, calibration)
    assert "\n" not in str(caught.value)
