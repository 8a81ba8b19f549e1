"""Loops that are left are kept and named."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.repair import Given, join
from geomprep.repair.floor import FloorSettings, report_floor
from geomprep.repair.loops import LoopSettings, name_loops

Z = np.array([0, 0, 1.0])


def with_arms(lines, length: float):
    """A vessel that parts into two arms of a length, 3 mm apart each, and is one again."""
    t = np.linspace(0, 1, 41)
    arms = [np.stack((s * 3e-3 * np.sin(np.pi * t), 0 * t, 20e-3 + length * t), axis=1) for s in (1, -1)]
    before, after = np.linspace(0, 20e-3, 21)[:, None] * Z, (20e-3 + length + np.linspace(0, 20e-3, 21))[:, None] * Z
    return join(lines([before, after, *arms], 1e-3)).graph


@pytest.mark.parametrize(("length", "name"), [(10e-3, "fenestration"), (30e-3, "duplication")])
def test_two_arms_are_named_by_their_length(lines, length: float, name: str) -> None:
    graph = with_arms(lines, length)
    result = name_loops(graph, LoopSettings(), Given())
    assert result.graph is graph
    (finding,) = result.findings
    assert finding.message.endswith(f"leave and meet again: kept as a {name}")


def test_a_ring_of_three_vessels_is_counted(lines) -> None:
    corners = 20e-3 * np.array([[0, 0, 0], [1, 0, 0], [0.5, 0.9, 0]])
    sides = [
        corners[a] + np.linspace(0, 1, 21)[:, None] * (corners[b] - corners[a]) for a, b in ((0, 1), (1, 2), (2, 0))
    ]
    tails = [corner + np.linspace(0, 15e-3, 16)[:, None] * Z for corner in corners]
    (finding,) = name_loops(join(lines([*sides, *tails], 1e-3)).graph, LoopSettings(), Given()).findings
    assert "1 independent loop(s), 1 of them through three or more segments" in finding.message


def test_a_tree_has_none(lines) -> None:
    assert (
        name_loops(join(lines([np.linspace(0, 1, 5)[:, None] * Z], 1e-3)).graph, LoopSettings(), Given()).findings == ()
    )


def test_a_floor_is_reported_and_not_changed(lines) -> None:
    """Four of five vessels at 0.4 mm, as an image with voxels of 0.4 mm shows all that is smaller."""
    vessels = [np.linspace(0, 20e-3, 21)[:, None] * Z + [8e-3 * k, 0, 0] for k in range(5)]
    graph = join(lines(vessels, [0.4e-3] * 4 + [1.5e-3])).graph
    result = report_floor(graph, FloorSettings(), Given(voxel=0.4e-3))
    (finding,) = result.findings
    assert result.graph is graph
    assert "80 % of the points, on 4 vessels, have the radius 0.4 mm, voxels have 0.4 mm" in finding.message
    # a radius far above a voxel is that of the vessels
    assert report_floor(graph, FloorSettings(), Given(voxel=0.1e-3)).findings == ()
    assert report_floor(graph, FloorSettings(share_above=0.9), Given()).findings == ()


def test_settings_out_of_range() -> None:
    with pytest.raises(InputError, match=r"repair\.loops\.fenestration_below"):
        LoopSettings(0.0)
    with pytest.raises(InputError, match=r"repair\.floor\.share_above"):
        FloorSettings(0.0)
