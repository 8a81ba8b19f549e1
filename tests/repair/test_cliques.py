"""Knots of short edges at a junction become one junction; forks that only lie close stay two."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import degrees
from geomprep.repair import Given, Verdict, Verdicts, join
from geomprep.repair.cliques import CliqueSettings, collapse_cliques

TURN = np.radians([90.0, 210.0, 330.0])
WAYS = np.stack((np.cos(TURN), np.sin(TURN), 0 * TURN), axis=1)


def triangle(lines, size: float, radius: float = 1.0):
    """Three branches that end at the corners of a triangle, each joined with each; corners so far from the middle."""
    corners = size * WAYS
    branches = [corner + np.linspace(0, 15, 31)[:, None] * way for corner, way in zip(corners, WAYS, strict=True)]
    sides = [[corners[a], corners[b]] for a, b in ((0, 1), (1, 2), (2, 0))]
    return join(lines([*branches, *sides], radius)).graph


def counts(graph) -> tuple[int, int, int]:
    """Open ends, junctions, independent loops."""
    degree = degrees(graph.n_points, graph.edges)
    return int((degree == 1).sum()), int((degree >= 3).sum()), graph.n_edges - graph.n_points + 1


def test_a_triangle_becomes_its_middle(lines) -> None:
    graph = triangle(lines, 0.4)
    assert counts(graph) == (3, 3, 1)
    result = collapse_cliques(graph, CliqueSettings(), Given())
    assert counts(result.graph) == (3, 1, 0)
    junction = degrees(result.graph.n_points, result.graph.edges) == 3
    assert result.graph.points[junction] == pytest.approx(np.zeros((1, 3)), abs=1e-12)
    (repair,) = result.repairs
    # the box around an equilateral triangle of circumradius 0.4: 0.4 √3 wide and 0.6 high
    width = np.hypot(0.4 * np.sqrt(3), 0.6)
    assert f"3 junctions with 1 loop(s) between them lie within {width:.2g} radii" in repair.reason


def test_a_wide_ring_with_room_inside_is_no_knot(lines) -> None:
    """Corners 1.2 radii off the middle, which so lies 0.2 outside the tube of its nearest point."""
    graph = triangle(lines, 1.2)
    assert collapse_cliques(graph, CliqueSettings(), Given()).repairs == ()
    assert len(collapse_cliques(graph, CliqueSettings(), Given(voxel=0.3)).repairs) == 1  # less than a voxel


def test_two_forks_close_to_one_another_stay_two(lines) -> None:
    trunk = np.linspace(0, 30, 61)[:, None] * [0, 0, 1.0]
    branches = [np.array([0, 0, z]) + np.linspace(0, 9, 19)[:, None] * [x, 0, 0.5] for z, x in ((15.0, 1), (15.5, -1))]
    graph = join(lines([trunk, *branches], 1.0)).graph
    assert counts(graph)[:2] == (4, 2)
    assert collapse_cliques(graph, CliqueSettings(), Given()).graph is graph


def test_a_person_can_leave_a_knot(lines) -> None:
    graph = triangle(lines, 0.4)
    (repair,) = collapse_cliques(graph, CliqueSettings(), Given()).repairs
    left = collapse_cliques(graph, CliqueSettings(), Given(Verdicts({repair.id: Verdict("leave", "person")})))
    assert counts(left.graph) == (3, 3, 1)
    assert left.repairs[0].verdict_by == "person"


@pytest.mark.parametrize("value", [0.0, 2.5, float("nan")])
def test_limit_out_of_range(value: float) -> None:
    with pytest.raises(InputError, match=r"repair\.cliques\.within"):
        CliqueSettings(within=value)
