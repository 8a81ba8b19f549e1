"""The steady state against circuits solved by hand and by a dense matrix."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.errors import ModelError
from geomprep.flow import steady_state
from geomprep.model import Blood, Inlet, Lumped, Network, Nodes, Outlet, Segments, Stations


def circuit(links, resistance, inlets, outlets, height=None) -> Network:
    """A network of resistances alone; two stations per segment."""
    n, s = 1 + max(max(link) for link in links), len(links)
    none, start, end = np.full(s, -1), *np.array(links).T
    z = np.zeros(n) if height is None else height
    along, rows = np.tile([0.0, 1.0], s), 2 * s
    return Network(
        nodes=Nodes([f"n{i}" for i in range(n)], np.zeros((n, 3)), z, np.zeros(n), np.arange(n)),
        segments=Segments([f"s{i}" for i in range(s)], [""] * s, start, end, np.ones(s), np.zeros(s), none, none, none),
        stations=Stations(np.arange(0, rows + 1, 2), along, np.zeros((rows, 3)), np.ones(rows), np.zeros(rows)),
        blood=Blood(1060.0, 4e-3, 2.0),
        lumped=Lumped(resistance, np.ones(s), np.ones(s)),
        inlets=tuple(inlets),
        outlets=tuple(outlets),
    )


def test_series_and_parallel() -> None:
    """1 then (2 ∥ 2) then 1: 12 units of pressure drive 4 units of flow."""
    net = circuit(
        [(0, 1), (1, 2), (1, 2), (2, 3)],
        [1.0, 2.0, 2.0, 1.0],
        [Inlet(0, pressure=12.0)],
        [Outlet(3, "fixed pressure", 0.0)],
    )
    state = steady_state(net)
    assert state.flow == pytest.approx([4, 2, 2, 4])
    assert state.pressure == pytest.approx([12, 8, 4, 0])
    assert state.mass_residual < 1e-14


def test_balanced_bridge_carries_nothing_across() -> None:
    links = [(0, 1), (0, 2), (1, 3), (2, 3), (1, 2)]
    net = circuit(links, [1.0, 2.0, 3.0, 6.0, 5.0], [Inlet(0, mean_flow=3.0)], [Outlet(3, "fixed pressure", 1.0)])
    state = steady_state(net)
    assert abs(state.flow[4]) < 1e-14
    assert state.flow[:2] == pytest.approx([2, 1])


def test_outlet_resistance_and_far_pressure() -> None:
    """10 in front, 1 + 1 + 3 behind each other down to 5: flow 1."""
    outlet = Outlet(1, "three-element windkessel", 5.0, 1.0, 3.0, 1.0)
    state = steady_state(circuit([(0, 1)], [1.0], [Inlet(0, pressure=10.0)], [outlet]))
    assert state.flow == pytest.approx([1.0])
    assert state.pressure == pytest.approx([10.0, 9.0])


def test_blood_column_stands_without_flow() -> None:
    """A closed column: the pressure differs by ρ g h = 1060 · 9.80665 · 0.1 = 1039.505 Pa and nothing flows."""
    net = circuit([(0, 1)], [1.0], [Inlet(0, mean_flow=0.0)], [Outlet(1, "fixed pressure", 0.0)], np.array([0.0, 0.1]))
    state = steady_state(net)
    assert state.pressure[0] == pytest.approx(1039.5049, rel=1e-7)
    assert abs(state.flow[0]) < 1e-12


def test_a_part_without_pressure_is_named() -> None:
    net = circuit([(0, 1), (2, 3)], [1.0, 1.0], [Inlet(0, pressure=1.0)], [Outlet(1, "fixed pressure", 0.0)])
    with pytest.raises(ModelError, match="n2"):
        steady_state(net)
    with pytest.raises(ModelError, match="lumped"):
        steady_state(dataclasses.replace(net, lumped=None))


@given(seed=st.integers(0, 1000))
@settings(max_examples=40, derandomize=True, deadline=None)
def test_random_nets_agree_with_a_dense_solve(seed: int) -> None:
    random = np.random.default_rng(seed)
    n = int(random.integers(3, 12))
    links = [(i, i + 1) for i in range(n - 1)]
    links += [tuple(sorted(random.choice(n, 2, replace=False))) for _ in range(int(random.integers(0, 8)))]
    resistance = 10.0 ** random.uniform(-3, 3, len(links))
    net = circuit(links, resistance, [Inlet(0, mean_flow=1.0)], [Outlet(n - 1, "fixed pressure", 2.0)])
    laplacian = np.zeros((n, n))
    for (a, b), r in zip(links, resistance, strict=True):
        laplacian[[a, b], [a, b]] += 1 / r
        laplacian[[a, b], [b, a]] -= 1 / r
    source = np.zeros(n)
    source[0] = 1.0
    laplacian[-1], source[-1] = np.eye(n)[-1], 2.0
    expected = np.linalg.solve(laplacian, source)
    np.testing.assert_allclose(steady_state(net).pressure, expected, rtol=1e-7)


def test_needle_of_a_textbook() -> None:
    """OpenStax College Physics 2e, example 12.8 (seen): 0.120 cm³/s through a needle into a vein at 8 mmHg.

    r 0.150 mm, L 2.50 cm, η 1.00e-3 Pa·s, vein 1.066e3 Pa: the entrance stands at 1.62e4 Pa (three digits printed).
    """
    resistance = 8 * 1.00e-3 * 2.50e-2 / (np.pi * 0.150e-3**4)
    net = circuit([(0, 1)], [resistance], [Inlet(0, mean_flow=0.120e-6)], [Outlet(1, "fixed pressure", 1.066e3)])
    assert steady_state(net).pressure[0] == pytest.approx(1.62e4, rel=5e-3)


def test_mirror_symmetric_ring_has_no_cross_flow() -> None:
    """Two carotids, a basilar with two posterior ends, two anterior and two middle ends: nothing crosses the midline."""
    feed = [(0, 1), (2, 3), (4, 5)]
    sides = [(5, 6), (5, 7), (1, 6), (3, 7), (1, 8), (3, 9), (8, 9)]
    ends = [(1, 10), (3, 11), (6, 12), (7, 13), (8, 14), (9, 15)]
    value = [3e8, 3e8, 2e8, 4e7, 4e7, 5e8, 5e8, 7e7, 7e7, 1e8, 1e9, 1e9, 2e9, 2e9, 1.5e9, 1.5e9]
    inlets = [Inlet(node, pressure=12399.0) for node in (0, 2, 4)]
    outlets = [Outlet(node, "resistance", 667.0, peripheral_resistance=6e9) for node in range(10, 16)]
    state = steady_state(circuit(feed + sides + ends, value, inlets, outlets))
    link = (feed + sides).index((8, 9))
    assert abs(state.flow[link]) < 1e-10 * np.abs(state.flow).max()
    np.testing.assert_allclose(state.outlet_flow[0::2], state.outlet_flow[1::2], rtol=1e-10)
    assert state.mass_residual < 1e-14
