"""Smoothing takes noise off a path without shrinking it, within its bounds, and only where noise is declared."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import degrees
from geomprep.repair import Given, Verdict, Verdicts, join
from geomprep.repair.paths import PathSettings, smooth_paths

NOISE = 0.3e-3
RADIUS, PITCH, TURNS, STEP = 4e-3, 12e-3, 3, 0.28e-3
LENGTH = TURNS * np.hypot(2 * np.pi * RADIUS, PITCH)


def helix(lines, seed: int, noise: float = NOISE):
    """The helix of 4 mm radius and 12 mm pitch, sampled every 0.28 mm, with noise on every point but its ends."""
    turn = np.linspace(0, 2 * np.pi * TURNS, round(LENGTH / STEP) + 1)
    places = np.stack((RADIUS * np.cos(turn), RADIUS * np.sin(turn), PITCH * turn / (2 * np.pi)), axis=1)
    moved = places + np.random.default_rng(seed).normal(0, noise, places.shape)
    moved[[0, -1]] = places[[0, -1]]
    return join(lines([moved], 2e-3)).graph


def length(graph) -> float:
    return float(np.linalg.norm(graph.points[graph.edges[:, 0]] - graph.points[graph.edges[:, 1]], axis=1).sum())


def test_helix_keeps_length_and_curve_radius(lines) -> None:
    """Length within 3 % in every draw; curve radius within 1 % in the mean of ten, which is what the noise allows."""
    radii = []
    for seed in range(10):
        graph = helix(lines, seed)
        assert length(graph) > 2.3 * LENGTH  # the noise alone makes the path more than twice as long
        smooth = smooth_paths(graph, PathSettings(NOISE), Given()).graph
        assert length(smooth) == pytest.approx(LENGTH, rel=0.03)
        inner = smooth.points[30:-30]
        radii.append(np.hypot(inner[:, 0], inner[:, 1]).mean())
    assert np.mean(radii) == pytest.approx(RADIUS, rel=0.01)
    assert np.abs(np.array(radii) / RADIUS - 1).max() < 0.02


def test_displacements_are_bounded(lines) -> None:
    graph = helix(lines, 3)
    smooth = smooth_paths(graph, PathSettings(NOISE), Given()).graph
    moved = smooth.points - graph.points
    assert np.sqrt((moved**2).mean(axis=0)).max() <= 1.05 * NOISE
    assert np.linalg.norm(moved, axis=1).max() <= 4 * NOISE * (1 + 1e-12)


def test_straight_lines_and_ends_stay_where_they_are(lines) -> None:
    line = np.linspace(0, 40e-3, 81)[:, None] * [0.6, 0, 0.8]
    branch = line[40] + np.linspace(0, 20e-3, 41)[:, None] * [0.8, 0, -0.6]
    graph = join(lines([line, branch], 2e-3)).graph
    smooth = smooth_paths(graph, PathSettings(NOISE), Given()).graph
    assert smooth.points == pytest.approx(graph.points, abs=1e-8)
    ends = degrees(graph.n_points, graph.edges) != 2
    assert (smooth.points[ends] == graph.points[ends]).all()


def test_nothing_moves_where_no_noise_is_declared_but_jagged_paths_are_reported(lines) -> None:
    graph = helix(lines, 0)
    result = smooth_paths(graph, PathSettings(), Given())
    assert result.graph is graph
    assert [finding.kind for finding in result.findings] == ["jagged paths"]
    assert smooth_paths(helix(lines, 0, noise=0.0), PathSettings(), Given()).findings == ()


def test_one_repair_with_the_length_before_and_after(lines) -> None:
    graph = helix(lines, 1)
    result = smooth_paths(graph, PathSettings(NOISE), Given())
    (repair,) = result.repairs
    assert f"length {1e3 * length(graph):.5g} mm before, {1e3 * length(result.graph):.5g} mm after" in repair.reason
    left = smooth_paths(graph, PathSettings(NOISE), Given(Verdicts({repair.id: Verdict("leave", "person")})))
    assert left.graph is graph


def test_negative_noise_is_refused() -> None:
    with pytest.raises(InputError, match=r"repair\.paths\.positional_noise = -1 m"):
        PathSettings(-1.0)
