"""Spurs are measured outside their parent's tube, in their own radii."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import degrees
from geomprep.repair import Given, Verdict, Verdicts, join
from geomprep.repair.spurs import SpurSettings, drop_spurs

TRUNK = np.linspace(0, 40, 81)[:, None] * [0, 0, 1.0]


def with_branch(lines, length: float, own: float = 0.5, at: float = 20.0):
    """A trunk of radius 2 along z with a branch at a right angle: length − 2 of it lies outside the trunk."""
    branch = np.array([0, 0, at]) + np.linspace(0, length, 12)[:, None] * [1.0, 0, 0]
    return join(lines([TRUNK, branch], [2.0, own])).graph


def dropped(graph, given: Given | None = None, **settings: float):
    return drop_spurs(graph, SpurSettings(**settings), given or Given())


@pytest.mark.parametrize(("length", "goes"), [(1.0, True), (2.4, True), (2.6, False), (6.0, False)])
def test_a_branch_goes_when_less_than_its_radius_lies_outside(lines, length: float, goes: bool) -> None:
    result = dropped(with_branch(lines, length))
    ends = degrees(result.graph.n_points, result.graph.edges)
    assert (ends == 1).sum() == (2 if goes else 3)
    assert (ends == 3).sum() == (0 if goes else 1)
    assert len(result.repairs) == int(goes)


def test_reason_says_length_and_what_lies_outside(lines) -> None:
    (repair,) = dropped(with_branch(lines, 2.4)).repairs
    assert "a branch of 2.4e+03 mm reaches 400 mm beyond the tube of its parent (radius 2e+03 mm)" in repair.reason
    # a tube of radius 0.5 and length 2.4 that starts with the trunk's radius 2 over its first step of 2.4 / 11: by hand
    step, near, far = 2.4 / 11, 2.0, 0.5
    first = step * (near**2 + near * far + far**2) / (3 * near**3 * far**3)
    assert repair.conductance_before == pytest.approx(np.pi / 8 / (first + 10 * step / 0.5**4), rel=1e-6)
    assert repair.conductance_after == 0.0
    assert len(repair.raw_points) == 11


def test_limit_can_be_moved(lines) -> None:
    assert len(dropped(with_branch(lines, 2.6), outside_below=1.5).repairs) == 1
    assert dropped(with_branch(lines, 2.4), outside_below=0.5).repairs == ()
    assert drop_spurs(with_branch(lines, 1.0), SpurSettings(use=False), Given()).repairs == ()


def test_less_than_two_voxels_outside_is_a_spur(lines) -> None:
    graph = with_branch(lines, 2.9, own=0.5)
    assert dropped(graph).repairs == ()
    assert len(dropped(graph, Given(voxel=0.5)).repairs) == 1


def test_of_a_terminal_fork_one_arm_stays(lines) -> None:
    arms = [np.array([0, 0, 40]) + np.linspace(0, 2.2, 8)[:, None] * [sign, 0, 0.3] for sign in (-1.0, 1.0)]
    result = dropped(join(lines([TRUNK, *arms], [2.0, 0.6, 0.7])).graph)
    ends = degrees(result.graph.n_points, result.graph.edges)
    assert (ends == 1).sum() == 2
    assert len(result.repairs) == 1


def test_protected_points_stay(lines) -> None:
    from dataclasses import replace

    graph = with_branch(lines, 1.0)
    protected = np.zeros(graph.n_points, np.bool_)
    protected[np.argmax(graph.points[:, 0])] = True
    assert dropped(replace(graph, protected=protected)).repairs == ()


def test_a_person_keeps_a_spur_and_drops_a_branch(lines) -> None:
    graph = with_branch(lines, 2.4)
    (repair,) = dropped(graph).repairs
    kept = dropped(graph, Given(Verdicts({repair.id: Verdict("leave", "person")})))
    assert kept.graph.n_edges == graph.n_edges
    assert (kept.repairs[0].verdict_by, kept.repairs[0].conductance_after) == ("person", repair.conductance_before)
    long = with_branch(lines, 2.6)
    (asked,) = dropped(long, outside_below=1.5).repairs
    assert dropped(long, Given(Verdicts({asked.id: Verdict("drop", "person")}))).graph.n_edges == len(TRUNK) - 1


def test_every_raw_point_is_accounted_for(lines) -> None:
    graph = with_branch(lines, 1.0)
    result = dropped(graph)
    tip = 81 + np.arange(1, 12)
    assert (result.graph.merged_into[tip] == -1).all()  # −1 − repair 0
    assert (result.graph.merged_into[:81] >= 0).all()


@pytest.mark.parametrize("value", [0.0, -1.0, 6.0, float("nan")])
def test_limit_out_of_range(value: float) -> None:
    with pytest.raises(InputError, match=r"repair\.spurs\.outside_below = .*above 0 and at most 5"):
        SpurSettings(outside_below=value)
