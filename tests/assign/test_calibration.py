"""Calibration: the steady state must give back what it was calibrated to; contradictions are named."""

import dataclasses

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from geomprep.assign import (
    CalibrationSettings,
    InletSettings,
    OutletResult,
    OutletSettings,
    assign_inlets,
    assign_outlets,
    gravity,
    resolve_ends,
    with_heights,
)
from geomprep.errors import CaseError, ModelError
from geomprep.flow import steady_state
from geomprep.model import Basis, Lumped, Network

MMHG = 133.322387415
ML_MIN = 1e-6 / 60
EVERY = "every other open end"
RESISTANCE = CalibrationSettings(5e-6, 93 * MMHG, "shares", far_pressure=5 * MMHG, model="resistance")


def calibrated(
    network: Network, entries: list[OutletSettings], target: CalibrationSettings | None,
    inlets: list[InletSettings] | None = None, posture: str | None = None,
) -> tuple[Network, OutletResult]:  # fmt: skip
    """Assign ends to a network with a wave speed of 8 m/s."""
    stated = inlets or [InletSettings("trunk", mean_flow=5e-6)]
    ends = resolve_ends(with_heights(network, gravity("LPS", posture)), stated, entries)
    resistance = 8 * 4e-3 / np.pi * network.measures.inverse_fourth_power
    lumped = Lumped(resistance, np.ones_like(resistance), np.full_like(resistance, 1e-11))
    network = dataclasses.replace(ends.network, inlets=assign_inlets(ends, stated)[0], lumped=lumped)
    result = assign_outlets(network, ends, entries, target, np.full(len(network.stations), 8.0))
    return dataclasses.replace(network, outlets=result.outlets), result


def flow_of(network: Network, name: str) -> float:
    """Outflow at the end of a vessel in the steady state."""
    node = network.segments.to_node[np.flatnonzero(network.segments.name == name)[0]]
    state = steady_state(network)
    return next(
        flow for outlet, flow in zip(network.outlets, state.outlet_flow.tolist(), strict=True) if outlet.node == node
    )


@settings(max_examples=25, derandomize=True, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    share=st.floats(0.05, 0.95),
    total=st.floats(1e-7, 5e-6),
    posture=st.sampled_from([None, "supine", "left side", "upright"]),
    by_flow=st.booleans(),
)
def test_steady_state_gives_back_the_targets(
    fork: Network, share: float, total: float, posture: str | None, by_flow: bool
) -> None:
    """Whatever the split and the posture: stated outflows, stated inlet pressure, balance."""
    inlet = InletSettings("trunk", mean_flow=total) if by_flow else InletSettings("trunk", pressure=93 * MMHG)
    entries = [OutletSettings("left branch", share=share), OutletSettings("right branch")]
    target = dataclasses.replace(RESISTANCE, total_flow=total)
    network, _ = calibrated(fork, entries, target, [inlet], posture)
    state = steady_state(network)
    assert state.pressure[network.inlets[0].node] == pytest.approx(93 * MMHG, rel=1e-9)
    assert state.inlet_flow == pytest.approx([total], rel=1e-9)
    assert flow_of(network, "left branch") == pytest.approx(share * total, rel=1e-9)
    assert flow_of(network, "right branch") == pytest.approx((1 - share) * total, rel=1e-9)


def test_total_flow_is_that_of_the_inlets_where_not_stated(fork: Network) -> None:
    target = dataclasses.replace(RESISTANCE, total_flow=None)
    network, _ = calibrated(fork, [OutletSettings(EVERY, share=0.5)], target)
    assert flow_of(network, "left branch") == pytest.approx(2.5e-6, rel=1e-9)


def test_flows_of_all_outlets_need_no_total(fork: Network) -> None:
    target = dataclasses.replace(RESISTANCE, total_flow=None, mean_pressure=None)
    entries = [OutletSettings("left branch", mean_flow=3e-6), OutletSettings("right branch", mean_flow=1e-6)]
    network, result = calibrated(fork, entries, target, [InletSettings("trunk", pressure=93 * MMHG)])
    assert steady_state(network).inlet_flow == pytest.approx([4e-6], rel=1e-9)
    assert sorted(one.share or 0.0 for one in result.outlets) == pytest.approx([0.25, 0.75])


def test_a_stated_resistance_beside_a_calibrated_one(fork: Network) -> None:
    """The stated one takes what its pressure gives; the other is set for its own flow at 93 mmHg."""
    entries = [OutletSettings("left branch", resistance=5e9), OutletSettings("right branch", mean_flow=1e-6)]
    target = dataclasses.replace(RESISTANCE, total_flow=None)
    network, _ = calibrated(fork, entries, target, [InletSettings("trunk", pressure=93 * MMHG)])
    assert flow_of(network, "right branch") == pytest.approx(1e-6, rel=1e-9)
    node = next(one.node for one in network.outlets if one.resistance == 5e9)
    pressure = steady_state(network).pressure[node]
    assert flow_of(network, "left branch") == pytest.approx((pressure - 5 * MMHG) / 5e9, rel=1e-9)


def test_windkessel_with_a_stated_periphery_keeps_it(fork: Network) -> None:
    """R1 = ρ c/A by hand: 1060 · 8/(π · 0.002²) for the left branch."""
    entries = [OutletSettings(EVERY, "three-element windkessel", peripheral_resistance=2e9, compliance=1e-10)]
    network, result = calibrated(fork, entries, None)
    assert [one.peripheral_resistance for one in result.outlets] == [2e9, 2e9]
    largest = min(one.characteristic_resistance or 0.0 for one in result.outlets)
    assert largest == pytest.approx(1060 * 8 / (np.pi * 0.002**2), rel=1e-12)
    assert steady_state(network).outlet_flow.sum() == pytest.approx(5e-6, rel=1e-12)


@pytest.mark.parametrize(
    ("entries", "target", "inlet", "words"),
    [
        (
            [OutletSettings(EVERY, share=0.5)],
            dataclasses.replace(RESISTANCE, total_flow=6e-6),
            InletSettings("trunk", mean_flow=5e-6),
            r"take 360 mL/min.*states 300 mL/min",
        ),
        (
            [OutletSettings(EVERY, share=0.5)],
            RESISTANCE,
            InletSettings("trunk", pressure=80 * MMHG),
            r"93 mmHg: inlet 'trunk'.*states 80 mmHg",
        ),
        (
            [OutletSettings(EVERY, share=0.5)],
            dataclasses.replace(RESISTANCE, mean_pressure=None),
            InletSettings("trunk", mean_flow=5e-6),
            "mean_pressure: missing",
        ),
        (
            [OutletSettings(EVERY, share=0.5)],
            dataclasses.replace(RESISTANCE, total_flow=None),
            InletSettings("trunk", pressure=93 * MMHG),
            "total_flow: missing",
        ),
        (
            [OutletSettings("left branch", "fixed pressure", 600.0), OutletSettings("right branch", share=0.5)],
            dataclasses.replace(RESISTANCE, total_flow=None),
            InletSettings("trunk", mean_flow=5e-6),
            "total_flow: missing",
        ),
        (
            [OutletSettings("left branch", mean_flow=5e-6), OutletSettings("right branch")],
            RESISTANCE,
            InletSettings("trunk", mean_flow=5e-6),
            "nothing is left for 'right branch'",
        ),
        (
            [OutletSettings(EVERY, "three-element windkessel", share=0.5)],
            RESISTANCE,
            InletSettings("trunk", mean_flow=5e-6),
            "needs a compliance",
        ),
    ],
)
def test_contradictions_are_named(
    fork: Network, entries: list[OutletSettings], target: CalibrationSettings, inlet: InletSettings, words: str
) -> None:
    with pytest.raises(CaseError, match=words) as caught:
        calibrated(fork, entries, target, [inlet])
    assert "\n" not in str(caught.value)


def test_a_radius_far_too_small_is_named_with_its_loss(fork: Network) -> None:
    """A left branch of a tenth of its radius has 1e4 times the resistance: 2.5e-6 · 4.97e11 Pa = 9323 mmHg are lost."""
    measures = fork.measures
    left = fork.segments.name == "left branch"
    narrowed = dataclasses.replace(
        measures, inverse_fourth_power=np.where(left, 1e4, 1.0) * measures.inverse_fourth_power
    )
    with pytest.raises(ModelError, match=r"outlet 'left branch'") as caught:
        calibrated(dataclasses.replace(fork, measures=narrowed), [OutletSettings(EVERY, share=0.5)], RESISTANCE)
    said = str(caught.value)
    assert "Lost on the way: 'left branch'" in said  # the largest loss first
    assert "9.32e+03 mmHg, 'trunk'" in said


@pytest.mark.parametrize(("inlet_pressure", "refused"), [(188.0, True), (195.0, False)])
def test_hardly_anything_left_at_an_outlet_is_refused(fork: Network, inlet_pressure: float, refused: bool) -> None:
    """Trunk and left branch lose 1.257521e7 · 5e-6 + 4.972159e7 · 2.5e-6 = 187.2 Pa; of 188 under a hundredth is left."""
    target = CalibrationSettings(5e-6, model="resistance")
    entries = [OutletSettings("left branch", share=0.5), OutletSettings("right branch", far_pressure=-1000.0)]
    inlets = [InletSettings("trunk", pressure=inlet_pressure)]
    if refused:
        with pytest.raises(ModelError, match=r"left branch.*cannot carry this flow"):
            calibrated(fork, entries, target, inlets)
    else:
        network, _ = calibrated(fork, entries, target, inlets)
        assert flow_of(network, "left branch") == pytest.approx(2.5e-6, rel=1e-9)


def test_origins_of_what_was_calibrated(fork: Network) -> None:
    target = CalibrationSettings(
        5e-6, 93 * MMHG, "radius power", "radius-power-murray-1926", None, "three-element windkessel", time_constant=0.7
    )
    _, result = calibrated(fork, [OutletSettings(EVERY)], target)
    found = {origin.field: (origin.basis, origin.detail) for origin in result.origins}
    assert found["outlets.far_pressure"] == (Basis.PUBLISHED, "gauge-pressure-atmosphere")
    assert found["outlets.share"] == (Basis.PUBLISHED, "radius-power-murray-1926")
    assert found["outlets.compliance"] == (Basis.USER, "calibration.time_constant")
    assert found["outlets.characteristic_resistance"][0] == Basis.DERIVED
    assert "steady_check.pressure" in found["outlets.peripheral_resistance"][1]
    assert "outlets.characteristic_resistance" in found["outlets.peripheral_resistance"][1]
    assert "300 mL/min" in result.findings[0].message
    assert result.findings[0].source == "radius-power-murray-1926"


def test_stated_numbers_lead_to_their_entry(fork: Network) -> None:
    entries = [
        OutletSettings("left branch", "fixed pressure", 600.0),
        OutletSettings("right branch", "resistance", resistance=1e9, far_pressure=500.0),
    ]
    _, result = calibrated(fork, entries, None)
    details = {(origin.field, origin.detail) for origin in result.origins}
    assert details == {
        ("outlets.far_pressure", "outlets[0].pressure"),
        ("outlets.far_pressure", "outlets[1].far_pressure"),
        ("outlets.peripheral_resistance", "outlets[1].resistance"),
    }
    assert {origin.basis for origin in result.origins} == {Basis.USER}
    assert result.findings == ()


def test_one_entry_for_several_inlets_is_said(fork: Network) -> None:
    inlets = [InletSettings(EVERY, mean_flow=100 * ML_MIN)]
    ends = resolve_ends(fork, inlets, [OutletSettings("trunk", "fixed pressure", 0.0)])
    made, origins, findings = assign_inlets(ends, inlets)
    assert [inlet.mean_flow for inlet in made] == [100 * ML_MIN] * 2
    assert "each takes 100 mL/min, 200 mL/min in all" in findings[0].message
    assert [(origin.field, origin.detail, origin.rows) for origin in origins] == [
        ("inlets.mean_flow", "inlets[0].mean_flow", ())
    ]
    for wrong in (InletSettings(EVERY), InletSettings(EVERY, 1e-6, 900.0)):
        with pytest.raises(CaseError, match="either mean_flow or pressure"):
            assign_inlets(ends, [wrong])


def test_share_of_a_total_compliance_of_a_published_example(fork: Network) -> None:
    """C_i = C_per R_sys/R_i (Alastruey 2008, from memory), numbers derived from it.

    5 L/min at 88 mmHg: R_sys = 1.40788e8 Pa·s/m³; τ = 1.5 s gives 1.065431e-8 m³/Pa, of which 0.4 lie in the outlets;
    150 mL/min at 88 mmHg: R_i = 4.6929344e9 Pa·s/m³. Then C_i = 1.278518e-10 m³/Pa.
    """
    rest = 1 / (1 / 1.40788e8 - 1 / 4.6929344e9)
    entries = [
        OutletSettings("left branch", "three-element windkessel", resistance=4.6929344e9),
        OutletSettings("right branch", "three-element windkessel", resistance=rest, characteristic_resistance=1e6),
    ]
    held = 3e-11  # the three segments of this network hold 1e-11 each
    target = CalibrationSettings(compliance=0.4 * 1.065431e-8 + held)
    _, result = calibrated(fork, entries, target)
    compliance = {round(one.resistance): one.compliance for one in result.outlets}
    assert compliance[4692934400] == pytest.approx(1.278518e-10, rel=1e-6)
