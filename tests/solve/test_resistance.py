"""Effective resistance against closed forms, networkx and Foster's theorem."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.solve import effective_resistance

CUBE = [(i, i ^ bit) for i in range(8) for bit in (1, 2, 4) if i < i ^ bit]


def test_cube_of_unit_resistors() -> None:
    """Edge 7/12, face diagonal 3/4, space diagonal 5/6 (classic puzzle, from MEMORY)."""
    tail, head = np.transpose(CUBE)
    found = effective_resistance(8, tail, head, np.ones(12), [[0, 1], [0, 3], [0, 7]])
    np.testing.assert_allclose(found, [7 / 12, 3 / 4, 5 / 6], rtol=1e-13)


def test_agrees_with_networkx_and_foster() -> None:
    """networkx.resistance_distance on a weighted graph; Foster 1949: Σ g R = n − 1 over edges (MEMORY)."""
    networkx = pytest.importorskip("networkx")
    rng = np.random.default_rng(3)
    graph = networkx.gnm_random_graph(14, 30, seed=5)
    assert networkx.is_connected(graph)
    edges = np.array(graph.edges())
    conductance = rng.uniform(0.1, 10.0, len(edges))
    for (i, j), g in zip(edges.tolist(), conductance.tolist(), strict=True):
        graph[i][j]["g"] = g
    found = effective_resistance(14, edges[:, 0], edges[:, 1], conductance, edges)
    assert np.sum(found * conductance) == pytest.approx(13.0, rel=1e-12)
    expected = [networkx.resistance_distance(graph, i, j, weight="g", invert_weight=False) for i, j in edges[:6]]
    np.testing.assert_allclose(found[:6], expected, rtol=1e-9)


def test_no_path_and_same_node() -> None:
    found = effective_resistance(4, [0, 2], [1, 3], [2.0, 1.0], [[0, 3], [2, 2], [1, 0]])
    np.testing.assert_array_equal(found, [np.inf, 0.0, 0.5])


def test_small_resistance_behind_a_large_one_keeps_its_digits() -> None:
    """Pairs (1, 2) of a wide edge behind a narrow one: 1/g to all digits, twelve decades apart."""
    found = effective_resistance(3, [0, 1], [1, 2], [3e-12, 7.0], [[1, 2], [0, 2]])
    np.testing.assert_allclose(found, [1 / 7, 1 / 3e-12 + 1 / 7], rtol=1e-14)
