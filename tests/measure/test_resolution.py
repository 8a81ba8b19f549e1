"""Voxels across vessels: borders of the levels, shares exact on cones, shares of an inlet-to-outlet resistance."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from geomprep.errors import InputError
from geomprep.findings import Severity
from geomprep.measure.resolution import (
    ResolutionLevel,
    longest_edge,
    resolution,
    resolution_findings,
    unresolved_share,
)
from geomprep.solve import effective_resistance

VOXEL = 0.5e-3


def one(radius, length: float = 0.04):
    radius = np.asarray(radius, float)
    return resolution(np.linspace(0, length, len(radius)), radius, np.array([0, len(radius)]), VOXEL)


@pytest.mark.parametrize(
    ("voxels", "level"),
    [(3.999, "NOT_RESOLVED"), (4.0, "BIASED"), (7.999, "BIASED"), (8.0, "RESOLVED"), (20.0, "RESOLVED")],
)
def test_levels_change_exactly_at_4_and_8(voxels: float, level: str) -> None:
    found = one([voxels / 2 * VOXEL] * 3)
    assert found.diameter_in_voxels == pytest.approx(voxels)
    assert {*found.level, *found.segment_level} == {ResolutionLevel[level]}
    assert found.segment_diameter_in_voxels == pytest.approx([voxels])
    assert found.share_not_resolved[0] == (level == "NOT_RESOLVED")
    assert found.share_biased[0] == (level == "BIASED")


def test_longest_edge_counts() -> None:
    plain = resolution(np.array([0, 0.01]), np.array([1e-3, 1e-3]), np.array([0, 2]), [0.3e-3, 0.5e-3, 0.4e-3])
    assert plain.diameter_in_voxels.tolist() == [4, 4]
    assert longest_edge(0.2e-3) == 0.2e-3


@pytest.mark.parametrize("stations", [2, 7, 100])
def test_shares_of_a_cone_do_not_depend_on_stations(stations: int) -> None:
    """Radius 3 → 0.5 mm: ∫ds/r⁴ from r₁ to r₂ goes with 1/r₂³ − 1/r₁³; limits 2 and 1 mm at voxels of 0.5 mm."""
    found = one(np.linspace(3e-3, 0.5e-3, stations))
    whole = 1 / 0.5**3 - 1 / 3**3
    assert found.share_not_resolved[0] == pytest.approx((1 / 0.5**3 - 1) / whole, rel=1e-9)
    assert found.share_biased[0] == pytest.approx((1 - 1 / 2**3) / whole, rel=1e-9)


def test_narrow_place_decides() -> None:
    """38 of 40 mm at r 3 mm hold 38/3⁴ = 0.47, 2 mm at 0.8 mm hold 2/0.8⁴ = 4.88: not resolved, for all its length."""
    radius = np.full(81, 3e-3)
    radius[38:43] = 0.8e-3
    found = one(radius)
    assert found.segment_level[0] == ResolutionLevel.NOT_RESOLVED
    assert np.bincount(found.level).tolist() == [76, 0, 5]
    assert found.share_not_resolved[0] > 0.85  # less what the flanks between 3 and 0.8 mm hold above 1 mm


def test_findings_say_what_is_not_known() -> None:
    distance = np.tile([0, 0.02], 3)
    found = resolution(distance, np.repeat([0.9e-3, 1.5e-3, 3e-3], 2), np.array([0, 2, 4, 6]), VOXEL)
    seen = resolution_findings(found, ["a", "b", "c"])
    assert [(f.kind, f.severity, f.where, f.limit) for f in seen] == [
        ("not resolved", Severity.WARNING, "a", 4.0),
        ("biased by resolution", Severity.NOTE, "b", 8.0),
    ]
    assert [f.value for f in seen] == pytest.approx([3.6, 6.0])
    assert "3.6 voxels across, 100 % of the resistance below 4" in seen[0].message


def test_share_of_a_network() -> None:
    """Bridge of five: 1 to 4 by two ways with a cross link; the power of unit flow adds up to the resistance."""
    ends = np.array([[0, 1], [0, 2], [1, 2], [1, 3], [2, 3]])
    drag = np.array([1.0, 2.0, 5.0, 3.0, 1.0])
    # node heads for a unit flow from 0 to 3 with node 3 at 0, by the equations written out
    conductance = 1 / drag
    matrix = np.zeros((4, 4))
    for (a, b), g in zip(ends, conductance, strict=True):
        matrix[[a, b], [a, b]] += g
        matrix[[a, b], [b, a]] -= g
    heads = np.append(np.linalg.solve(matrix[:3, :3], [1, 0, 0]), 0)
    flow = (heads[ends[:, 0]] - heads[ends[:, 1]]) * conductance
    whole = effective_resistance(4, ends[:, 0], ends[:, 1], conductance, [[0, 3]])[0]
    assert np.sum(drag * flow**2) == pytest.approx(whole, rel=1e-12)
    poor = np.array([0, 0.5, 1.0, 0, 0])
    assert unresolved_share(drag, flow, poor) == pytest.approx((0.5 * 2 * flow[1] ** 2 + 5 * flow[2] ** 2) / whole)
    states = unresolved_share(drag, np.stack((flow, -3 * flow, 0 * flow)), poor)
    assert states[0] == pytest.approx(states[1], rel=1e-12)
    assert np.isnan(states[2])


@given(radius=st.lists(st.floats(0.1e-3, 5e-3), min_size=2, max_size=12), size=st.floats(0.1, 10))
def test_scale_and_direction_mean_nothing(radius: list[float], size: float) -> None:
    plain = one(radius)
    scaled = resolution(
        size * np.linspace(0, 0.04, len(radius)),
        size * np.array(radius[::-1]),
        np.array([0, len(radius)]),
        size * VOXEL,
    )
    assert scaled.share_not_resolved == pytest.approx(plain.share_not_resolved, rel=1e-9, abs=1e-9)
    assert scaled.share_biased == pytest.approx(plain.share_biased, rel=1e-9, abs=1e-9)
    assert 0 <= plain.share_not_resolved[0] <= plain.share_not_resolved[0] + plain.share_biased[0] <= 1 + 1e-12


def test_bad_input_is_named() -> None:
    for call, message in [
        (lambda: one([1e-3, 0]), "radius = 0"),
        (lambda: resolution(np.array([0, 1.0]), np.ones(2), np.array([0, 2]), [0.5, -1, 1]), "voxel = -1"),
        (lambda: unresolved_share([-1.0], [1.0], [0.0]), "resistance = -1"),
        (lambda: unresolved_share([1.0], [1.0], [1.5]), "share = 1.5"),
    ]:
        with pytest.raises(InputError, match=message):
            call()


def test_no_segments() -> None:
    none = resolution(np.zeros(0), np.zeros(0), np.array([0]), VOXEL)
    assert len(none.segment_level) == 0
    assert resolution_findings(none, []) == ()
