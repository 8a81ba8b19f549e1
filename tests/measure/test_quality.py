"""What a network says of how well its geometry is known."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.measure import describe, measure_segments
from geomprep.measure.quality import unresolved_finding
from geomprep.model import Lumped, Network, Nodes, Segments, Stations


def tube(radius: np.ndarray, length: float = 80e-3) -> Network:
    """One straight segment."""
    along = np.linspace(0, length, len(radius))
    position = np.stack((along, 0 * along, 0 * along), axis=1)
    zero = np.zeros(1, int)
    segments = Segments(["s"], [""], zero, zero + 1, zero, zero, zero, zero, zero)
    stations = Stations([0, len(radius)], along, position, radius, np.zeros(len(radius)))
    nodes = Nodes(["i", "j"], position[[0, -1]], np.zeros(2), np.zeros(2), np.arange(2))
    return measure_segments(Network(nodes, segments, stations))


def test_a_taper_and_what_one_radius_makes_of_it() -> None:
    """2 to 1 mm, linear in r: R from one radius of equal volume over the true one, by hand.

    Mean of r² is (a² + ab + b²)/3 = 7/3, mean of r⁻⁴ is (a² + ab + b²)/(3a³b³) = 7/24: ratio (7/3)⁻² / (7/24) = 0.6297.
    """
    network, findings = describe(tube(np.linspace(2e-3, 1e-3, 161)), None)
    assert network.profiles.ratio_for_volume == pytest.approx([(7 / 3) ** -2 / (7 / 24)], rel=1e-4)
    assert [finding.kind for finding in findings] == ["one radius"]
    assert f"{1 / 0.6297:.3g} times" in findings[0].message
    assert network.resolution is None
    assert network.intervals is None


def test_a_cylinder_needs_no_finding() -> None:
    network, findings = describe(tube(np.full(81, 2e-3)), 0.25e-3)
    assert findings == ()
    assert network.resolution.diameter_in_voxels == pytest.approx([16.0])
    measures, spread = network.measures, network.intervals
    assert (spread.inverse_fourth_power_low < measures.inverse_fourth_power).all()
    assert (measures.inverse_fourth_power < spread.inverse_fourth_power_high).all()
    assert spread.confidence == pytest.approx(0.9)


def test_a_vessel_of_three_voxels_is_not_resolved() -> None:
    network, findings = describe(tube(np.full(81, 0.75e-3)), 0.5e-3)
    assert network.resolution.level.tolist() == [2]
    assert network.resolution.share_not_resolved == pytest.approx([1.0])
    assert "not resolved" in findings[0].message
    lumped = Lumped(np.array([1e9]), np.array([1e6]), np.array([1e-12]))
    import dataclasses

    (said,) = unresolved_finding(dataclasses.replace(network, lumped=lumped), np.array([1e-6]))
    assert said.message.startswith("100 % of the friction")


def test_large_networks_are_not_fitted() -> None:
    network, _ = describe(tube(np.full(50_001, 2e-3)), 0.25e-3)
    assert network.profiles is None
    assert network.intervals is None
    assert network.resolution is not None


def test_a_narrowing_is_listed_with_both_conventions() -> None:
    """A throat of 1.2 mm in an artery of 4.0 mm diameter: 70 % by diameter, 91 % by area."""
    along = np.linspace(0, 80e-3, 321)
    network = tube(2e-3 - 1.4e-3 * np.exp(-(((along - 40e-3) / 3e-3) ** 2)))
    import dataclasses

    artery = dataclasses.replace(network, segments=dataclasses.replace(network.segments, vessel_class=np.ones(1)))
    described, findings = describe(artery, None)
    (row,) = described.narrowings
    assert (row.kind, row.focal) == ("narrowing", "focal")
    assert row.degree_by_diameter == pytest.approx(0.7, abs=1e-4)
    assert row.degree_by_area == pytest.approx(0.91, abs=1e-4)
    assert row.against_distal == pytest.approx(0.7, abs=1e-3)
    assert row.against_original == pytest.approx(0.7, abs=1e-3)
    assert any("narrowing of 70 % by diameter (91 % by area)" in finding.message for finding in findings)
    (vein,) = describe(network, None)[0].narrowings
    assert (vein.against_distal, vein.against_original) == (None, None)


def test_bending_of_a_half_circle() -> None:
    """A half circle of 20 mm radius: the tangent turns by π over π · 20 mm, in the plane and one way."""
    import dataclasses

    turn = np.linspace(0, np.pi, 401)
    network = tube(np.full(401, 2e-3), length=np.pi * 20e-3)
    position = 20e-3 * np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    bent = dataclasses.replace(network, stations=dataclasses.replace(network.stations, position=position))
    bending = describe(bent, None)[0].bending
    assert bending.total_curvature == pytest.approx([np.pi], rel=0.005)
    assert bending.sum_of_angles == pytest.approx([1 / 20e-3], rel=0.01)
    assert bending.inflections.tolist() == [0]
    assert bending.step == pytest.approx([np.pi * 20e-3 / 400], rel=1e-3)
