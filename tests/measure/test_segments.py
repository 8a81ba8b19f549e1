"""Measures against closed forms, with their order of convergence."""

import numpy as np
import pytest

from geomprep.measure import junctions, measure_segments
from geomprep.segments import split


def line(make_graph, points, radius):
    n = len(points)
    return measure_segments(split(make_graph(points, [[i, i + 1] for i in range(n - 1)], radius))).measures


def test_cone(make_graph) -> None:
    """Cone 2 → 1 mm, 100 mm: closed forms (derived): V 7.330383e-7 m³, R 2.970892e8 Pa·s/m³ at 4 mPa·s."""
    x = np.linspace(0, 0.1, 41)
    m = line(make_graph, np.stack((x, 0 * x, 0 * x), axis=1), 2e-3 - 1e-3 * x / 0.1)
    assert m.volume[0] == pytest.approx(7.330383e-7, rel=1e-7)
    assert m.lateral_area[0] == pytest.approx(9.425249e-4, rel=1e-7)
    assert 8 * 4e-3 / np.pi * m.inverse_fourth_power[0] == pytest.approx(2.970892e8, rel=2e-7)
    # radius of the cylinder of equal length and resistance: 1.360750 mm
    assert m.radius_for_resistance[0] == pytest.approx(1.360750e-3, rel=4e-7)
    assert m.taper[0] == pytest.approx(-0.01, rel=1e-9)
    assert m.median_radius[0] == pytest.approx(1.5e-3, rel=0.02)
    assert (m.radius_at_from[0], m.radius_at_to[0], m.minimum_radius[0]) == pytest.approx((2e-3, 1e-3, 1e-3))
    assert m.tortuosity[0] == pytest.approx(1.0)


@pytest.mark.parametrize(
    ("row", "length_cm", "proximal_cm", "distal_cm", "resistance"),
    [
        # subject-specific arterial tree, Front Physiol 2021;12:734311, table 2 (seen: lengths and radii);
        # tapered Poiseuille resistance at 4 mPa·s derived with the closed form for a cone
        (12, 15.8, 0.268, 0.162, 9.2746e7),
        (13, 12.0, 0.204, 0.109, 2.8066e8),
        (6, 23.4, 0.249, 0.148, 1.9170e8),
        (3, 3.7, 0.881, 0.296, 7.9663e5),
        (19, 5.2, 0.731, 0.238, 2.5648e6),
    ],
)
def test_published_tapers(make_graph, row, length_cm, proximal_cm, distal_cm, resistance) -> None:
    x = np.linspace(0, 1, 7)
    points = np.stack((length_cm / 100 * x, 0 * x, 0 * x), axis=1)
    m = line(make_graph, points, (proximal_cm + (distal_cm - proximal_cm) * x) / 100)
    assert 8 * 4e-3 / np.pi * m.inverse_fourth_power[0] == pytest.approx(resistance, rel=1e-4), row


def test_lumping_a_cone_by_mid_radii_converges_at_second_order(make_graph) -> None:
    """n equal cylinders of mid radius: relative errors of R −3.228e-1, −1.150e-1, −3.282e-2, −8.531e-3 (derived)."""
    exact = 2.970892e8
    for n, error in [(1, -3.228e-1), (2, -1.150e-1), (4, -3.282e-2), (8, -8.531e-3)]:
        total = 0.0
        for i in range(n):
            x = np.array([0.0, 0.1 / n])
            mid = 2e-3 - 1e-3 * (i + 0.5) / n
            total += line(make_graph, np.stack((x, 0 * x, 0 * x), axis=1), mid).inverse_fourth_power[0]
        assert 8 * 4e-3 / np.pi * total / exact - 1 == pytest.approx(error, abs=6e-5)


@pytest.mark.parametrize(("n", "ratio"), [(12, 2.21573), (24, 2.23097), (48, 2.23479), (96, 2.23575), (192, 2.23599)])
def test_helix_tortuosity(make_graph, n: int, ratio: float) -> None:
    """Helix a = 1, b = 0.5, two turns: length over distance tends to 2.236068, order 2 (derived)."""
    t = np.linspace(0, 4 * np.pi, 2 * n + 1)
    m = line(make_graph, np.stack((np.cos(t), np.sin(t), 0.5 * t), axis=1), 0.1)
    assert m.tortuosity[0] == pytest.approx(ratio, abs=6e-6)


def test_ring(make_graph) -> None:
    """Ring R = 20, r = 2: length 125.663706, volume and side 1579.136704; the ends coincide."""
    t = np.linspace(0, 2 * np.pi, 4001)[:-1]
    points = 20 * np.stack((np.cos(t), np.sin(t), 0 * t), axis=1)
    edges = [[i, (i + 1) % 4000] for i in range(4000)]
    m = measure_segments(split(make_graph(points, edges, 2.0))).measures
    assert m.length[0] == pytest.approx(125.663706, rel=1e-6)
    assert m.volume[0] == pytest.approx(1579.136704, rel=1e-6)
    assert m.lateral_area[0] == pytest.approx(1579.136704, rel=1e-6)
    assert m.tortuosity[0] == 0


def test_junction_directions_and_areas(make_graph) -> None:
    points = [[0, 0, 0], [10, 0, 0], [20, 10, 0], [20, -10, 0]]
    network = junctions(split(make_graph(points, [[0, 1], [1, 2], [1, 3]], [2.0, 2.0, 1.0, 1.0], own=[(1, 0, 1.0)])))
    table = network.junctions
    assert table.offsets.tolist() == [0, 3]
    half = 0.5**0.5
    expected = sorted([(-1.0, 0.0, 0.0), (half, -half, 0.0), (half, half, 0.0)])
    found = sorted(tuple(row) for row in np.round(table.direction, 12).tolist())
    np.testing.assert_allclose(found, expected, atol=1e-12)
    assert sorted(table.area.tolist()) == pytest.approx([np.pi, 4 * np.pi, 4 * np.pi])
