"""Pressure at imaging: columns by hand, independence of the origin, veins from a solve done by hand."""

import dataclasses

import numpy as np
import pytest

from geomprep.assign import (
    CalibrationSettings,
    ImagingPressures,
    ImagingResult,
    InletSettings,
    OutletSettings,
    SurroundingsSettings,
    assign_inlets,
    gravity,
    imaging_transmural,
    resolve_ends,
    surroundings_at_imaging,
    with_heights,
)
from geomprep.errors import CaseError, OpenQuestions
from geomprep.model import Basis, Network

MMHG = 133.322387415
COLUMN = 1060 * 9.80665  # Pa per metre of blood
# 8 μ L/(π r⁴) at 4 mPa·s by hand: trunk 100 mm r 3 mm; branches √(60² + 50²) = 78.1025 mm, r 2 and 1.5 mm
R_TRUNK, R_LEFT, R_RIGHT = 1.257521e7, 4.972159e7, 1.571448e8
EVERY = "every other open end"


def of_class(network: Network, vessel_class: object) -> Network:
    """The network with other classes of vessels."""
    classes = np.broadcast_to(np.asarray(vessel_class), len(network.segments))
    return dataclasses.replace(network, segments=dataclasses.replace(network.segments, vessel_class=classes))


def moved(network: Network, by: tuple[float, float, float]) -> Network:
    """The network somewhere else."""
    nodes = dataclasses.replace(network.nodes, position=network.nodes.position + by)
    stations = dataclasses.replace(network.stations, position=network.stations.position + by)
    return dataclasses.replace(network, nodes=nodes, stations=stations)


def imaged(
    network: Network, pressures: ImagingPressures, entries: list[OutletSettings], posture: str | None = "supine",
    calibration: CalibrationSettings | None = None, inlet: InletSettings | None = None,
) -> ImagingResult:  # fmt: skip
    """Pressures at imaging with 5 mL/s through the trunk and nothing outside."""
    field = gravity("LPS", posture)
    inlets = [inlet or InletSettings("trunk", mean_flow=5e-6)]
    ends = resolve_ends(with_heights(network, field), inlets, entries)
    network = dataclasses.replace(ends.network, inlets=assign_inlets(ends, inlets)[0])
    outside = np.zeros(len(network.stations))
    return imaging_transmural(network, ends, entries, pressures, field, outside, calibration)


def at_end(network: Network, result: ImagingResult, name: str) -> float:
    """Transmural pressure at the last station of a vessel."""
    row = int(np.flatnonzero(network.segments.name == name)[0])
    return float(result.transmural[network.stations.offsets[row + 1] - 1])


FIXED = [OutletSettings(EVERY, "fixed pressure", 600.0)]


@pytest.mark.parametrize("vessel_class", [1, 2])
@pytest.mark.parametrize("pressures", [ImagingPressures(800.0, 12000.0), ImagingPressures(None, 12000.0)])
def test_nothing_depends_on_the_origin_of_the_coordinates(
    fork: Network, vessel_class: int, pressures: ImagingPressures
) -> None:
    here = of_class(fork, vessel_class)
    first = imaged(here, pressures, FIXED).transmural
    second = imaged(moved(here, (0.3, 1.7, -0.9)), pressures, FIXED).transmural
    np.testing.assert_allclose(second, first, rtol=1e-9, atol=1e-7)


def test_stated_pressure_of_arteries_holds_at_their_inlet(fork: Network) -> None:
    """Lying on the back in LPS, y grows downwards: the left end at y = +50 mm has 50 mm of blood more on it."""
    found = imaged(moved(fork, (0.0, 0.4, 0.0)), ImagingPressures(arterial=12000.0), FIXED)
    assert found.transmural[fork.stations.offsets[np.flatnonzero(fork.segments.name == "trunk")]] == pytest.approx(
        12000
    )
    assert at_end(fork, found, "left branch") == pytest.approx(12000 + 0.05 * COLUMN)
    assert at_end(fork, found, "right branch") == pytest.approx(12000 - 0.05 * COLUMN)


def test_stated_pressure_of_veins_holds_at_their_outlet(fork: Network) -> None:
    entries = [OutletSettings("right branch", "fixed pressure", 600.0), OutletSettings(EVERY, "fixed pressure", 600.0)]
    found = imaged(of_class(fork, 2), ImagingPressures(venous=700.0), entries)
    assert at_end(fork, found, "right branch") == pytest.approx(700)
    assert at_end(fork, found, "left branch") == pytest.approx(700 + 0.1 * COLUMN)


def test_veins_by_hand_without_gravity(fork: Network) -> None:
    """5 mL/s to 600 Pa through R_left ∥ R_right behind the trunk; halfway along a branch half of its drop is left."""
    found = imaged(of_class(fork, 2), ImagingPressures(), FIXED, posture=None)
    joint = 600 + 5e-6 / (1 / R_LEFT + 1 / R_RIGHT)
    assert at_end(fork, found, "trunk") == pytest.approx(joint, rel=1e-6)
    left = int(np.flatnonzero(fork.segments.name == "left branch")[0])
    start, stop = fork.stations.offsets[left], fork.stations.offsets[left + 1]
    np.testing.assert_allclose(found.transmural[start:stop], np.linspace(joint, 600, stop - start), rtol=1e-6)
    trunk = int(np.flatnonzero(fork.segments.name == "trunk")[0])
    assert found.transmural[fork.stations.offsets[trunk]] == pytest.approx(joint + 5e-6 * R_TRUNK, rel=1e-6)


def test_veins_behind_stated_and_calibrated_resistances(fork: Network) -> None:
    """Calibrated to halves of 5 mL/s with 2000 Pa at the inlet: the ends keep 2000 − 5e-6 R_trunk − 2.5e-6 R_branch."""
    entries = [OutletSettings(EVERY, "resistance", share=0.5)]
    settings = CalibrationSettings(5e-6, 2000.0, "shares")
    found = imaged(of_class(fork, 2), ImagingPressures(), entries, posture=None, calibration=settings)
    for name, branch in (("left branch", R_LEFT), ("right branch", R_RIGHT)):
        assert at_end(fork, found, name) == pytest.approx(2000 - 5e-6 * R_TRUNK - 2.5e-6 * branch, rel=1e-6)
    stated = [OutletSettings(EVERY, "resistance", resistance=1e8, far_pressure=300.0)]
    found = imaged(of_class(fork, 2), ImagingPressures(), stated, posture=None)
    flow_left = 5e-6 * (R_RIGHT + 1e8) / (R_LEFT + R_RIGHT + 2e8)
    assert at_end(fork, found, "left branch") == pytest.approx(300 + 1e8 * flow_left, rel=1e-6)


def test_veins_whose_outlets_say_too_little_are_refused(fork: Network) -> None:
    with pytest.raises(CaseError, match="mean_pressure: missing"):
        imaged(of_class(fork, 2), ImagingPressures(), [OutletSettings(EVERY, "resistance", mean_flow=2.5e-6)])


def test_arteries_and_veins_together_say_where_each_comes_from(fork: Network) -> None:
    classes = np.where(fork.segments.name == "trunk", 1, 2)
    found = imaged(of_class(fork, classes), ImagingPressures(arterial=12000.0), FIXED)
    assert {origin.basis for origin in found.origins} == {Basis.DERIVED}
    assert {origin.field for origin in found.origins} == {"stations.imaging_transmural"}
    default, other = found.origins
    assert default.rows == ()
    trunk = np.flatnonzero((fork.segments.name == "trunk")[fork.stations.segment])
    assert "imaging_state.arterial_pressure" in other.detail
    assert list(other.rows) == trunk.tolist()
    assert "arteries" in found.described
    assert "steady solve" in found.described


def test_arteries_without_a_pressure_are_a_question(fork: Network) -> None:
    with pytest.raises(OpenQuestions) as caught:
        imaged(fork, ImagingPressures(), FIXED)
    assert caught.value.questions[0].key == "imaging_state.arterial_pressure"


def test_intracranial_pressure_at_imaging() -> None:
    stated = {"neck": SurroundingsSettings(0.0), "cranium": SurroundingsSettings(900.0, 0.1, 1000.0, ("a",))}
    found, findings = surroundings_at_imaging(stated, 1300.0)
    assert found == {"neck": stated["neck"], "cranium": SurroundingsSettings(1300.0, 0.1, 1000.0, ("a",))}
    assert findings == ()
    assert stated["cranium"].pressure == 900.0
    assert surroundings_at_imaging(stated, None) == (stated, ())
    assert "presses on nothing" in surroundings_at_imaging({}, 1300.0)[1][0].message
