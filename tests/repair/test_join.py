"""The basic steps of joining."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import Centrelines, PointGraph, degrees
from geomprep.repair import JoinSettings, join
from geomprep.repair.parts import PartSettings, report_parts
from geomprep.repair.steps import Given

Lines = Callable[..., Centrelines]


def kinds(result: Any) -> list[str]:
    return [finding.kind for finding in result.findings]


def test_fork_of_private_copies_becomes_one_junction(lines: Lines) -> None:
    result = join(lines([[(0, 0, 0), (0, 0, 10)], [(0, 0, 10), (5, 0, 20)], [(0, 0, 10), (-5, 0, 20)]]))
    assert sorted(degrees(result.graph.n_points, result.graph.edges)) == [1, 1, 1, 3]
    assert result.graph.merged_into[1] == result.graph.merged_into[2] == result.graph.merged_into[4]
    assert result.repairs == ()
    assert result.findings == ()


@pytest.mark.parametrize("bad", [0.0, -1.0, np.nan, np.inf])
def test_bad_radius_is_refused_by_number_and_value(lines: Lines, bad: float) -> None:
    with pytest.raises(InputError) as caught:
        join(lines([[(0, 0, 0), (0, 0, 1), (0, 0, 2)]], [[1.0, bad, 1.0]]))
    message = str(caught.value)
    assert "1 of 3 points" in message
    assert f"point 1 ({bad:g} m)" in message
    assert "above 0 m" in message
    assert "\n" not in message


def test_bad_radius_of_a_point_that_no_line_uses_is_ignored() -> None:
    places = np.arange(9.0).reshape(3, 3)
    given = Centrelines(places, [1.0, 1.0, np.nan], places, [0, 1], [0, 2], [1], [0], [0, 0, 0])
    graph = join(given).graph
    assert graph.merged_into.tolist() == [0, 1, PointGraph.UNUSED]


def test_line_of_one_point_and_no_line_are_refused(lines: Lines) -> None:
    with pytest.raises(InputError, match=r"1 of 2 lines have fewer than 2 points: line 1 \(1\)"):
        join(lines([[(0, 0, 0), (0, 0, 1)], [(0, 0, 2)]]))
    empty = np.empty((0, 3))
    with pytest.raises(InputError, match="no lines"):
        join(Centrelines(empty, [], empty, [], [0], [], [], []))
    with pytest.raises(InputError, match="needs at least one line with a length"):
        join(lines([[(0, 0, 0), (0, 0, 0)]]))


def test_coordinates_that_are_not_finite_are_refused(lines: Lines) -> None:
    with pytest.raises(InputError, match="1 of 2 points have coordinates that are not finite: point 1"):
        join(lines([[(0, 0, 0), (0, np.nan, 1)]]))


def test_repeated_points_and_a_line_within_one_place_are_accounted_for(lines: Lines) -> None:
    result = join(lines([[(0, 0, 0), (0, 0, 0), (0, 0, 5)], [(9, 0, 0), (9, 0, 0)]]))
    assert result.graph.n_edges == 1
    assert result.graph.merged_into.tolist() == [0, 0, 1, -1, -1]
    assert result.repairs[0].kind == "line of no length"
    assert result.repairs[0].raw_points == (3, 4)
    assert kinds(result) == ["repeated points"]


@pytest.mark.parametrize(("apart", "expected"), [(0.9e-3, [1, 1, 2]), (1.1e-3, [1, 1, 1, 1])])
def test_ends_merge_within_the_tolerance_only(lines: Lines, apart: float, expected: list[int]) -> None:
    result = join(
        lines([[(0, 0, 0), (0, 0, 5)], [(0, 0, 5 + apart), (0, 0, 9)]]), JoinSettings(joints_within=0, tolerance=1e-3)
    )
    assert sorted(degrees(result.graph.n_points, result.graph.edges)) == expected


def test_jittered_ends_merge_exactly_as_planted(lines: Lines) -> None:
    """Quantised keys split about a third of such places; a tolerance merge splits none."""
    rng = np.random.default_rng(4)
    hubs = np.stack(np.meshgrid(*[np.arange(6.0) * 10] * 3), axis=-1).reshape(-1, 3)
    jitter = rng.uniform(-0.2e-3, 0.2e-3, (len(hubs), 3, 3))
    tips = rng.uniform(1, 2, (len(hubs), 3, 3)) * np.array([[1, 1, 1], [-2, 1, 0], [1, -2, 0]])
    given = lines([[hub + jitter[i, k], hub + tips[i, k]] for i, hub in enumerate(hubs) for k in range(3)])
    degree = degrees(join(given).graph.n_points, join(given).graph.edges)
    assert np.count_nonzero(degree == 3) == 216
    assert np.count_nonzero(degree == 1) == 3 * 216


def test_chain_of_near_ends_does_not_snowball(lines: Lines) -> None:
    starts = [(0.8e-3 * k, 0, 0) for k in range(12)]
    result = join(
        lines([[start, (start[0], 5 + k, 3)] for k, start in enumerate(starts)]), JoinSettings(joints_within=0)
    )
    assert "wide group of points" in kinds(result)
    place = result.graph.points[result.graph.merged_into[[0, 22]]]
    assert np.linalg.norm(place[0] - place[1]) > 5e-3


def test_artery_and_vein_at_one_point_stay_apart_and_unknown_joins(lines: Lines) -> None:
    cross = [[(0, 0, 0), (0, 0, 5)], [(0, 0, 5), (0, 5, 5)]]
    apart = join(lines(cross, classes=[1, 2]))
    assert sorted(degrees(apart.graph.n_points, apart.graph.edges)) == [1, 1, 1, 1]
    assert kinds(apart) == ["classes kept apart"]
    unknown = join(lines(cross, classes=[1, 0]))
    assert sorted(degrees(unknown.graph.n_points, unknown.graph.edges)) == [1, 1, 2]
    assert kinds(unknown) == ["unknown class", "unknown class joined"]
    through = join(lines([*cross, [(0, 0, 5), (5, 0, 5)]], classes=[1, 2, 0]))
    assert "classes joined" in kinds(through)


def test_point_number_shared_by_artery_and_vein_counts_twice() -> None:
    places = np.array([[0.0, 0, 0], [0, 0, 5], [0, 5, 5]])
    given = Centrelines(places, [1.0] * 3, places, [0, 1, 1, 2], [0, 2, 4], [1, 2], [0, 0], [0] * 3)
    graph = join(given).graph
    assert graph.n_points == 4
    assert graph.vessel_class[graph.edges].tolist() == [[1, 1], [2, 2]]


def test_doubled_edges_count_once_and_parallel_lines_stay(lines: Lines) -> None:
    trunk = [(0, 0, 0), (0, 0, 5), (0, 0, 10)]
    result = join(lines([trunk, trunk[::-1], trunk, [(0, 0, 0), (3, 0, 5), (0, 0, 10)]]))
    assert result.graph.n_edges == 4
    doubled = next(finding for finding in result.findings if finding.kind == "doubled edges")
    assert doubled.value == 2
    assert "up to 3 times (6 drawings in all)" in doubled.message


def test_isolated_part_is_reported_with_length_and_volume(lines: Lines) -> None:
    result = join(lines([[(0, 0, 0), (0, 0, 50)], [(40, 0, 0), (40, 0, 3)]], [1.0, 2.0]))
    (part,) = report_parts(result.graph, PartSettings(), Given()).findings
    assert part.kind == "isolated part"
    assert part.value == pytest.approx(3.0)
    assert f"volume {1e9 * 12 * np.pi:.4g} mm³" in part.message  # π 2² 3
    assert part.position == (40, 0, 0)
