"""The 33-artery network through the whole program: topology, loops by deletion, resistances, outlets."""

import numpy as np
import pytest

from geomprep.case.build import build
from geomprep.export import validate_network
from geomprep.files import write_lines
from geomprep.model import Centrelines
from geomprep.repair import join
from geomprep.segments import split
from geomprep.solve import parts
from published.arteries33 import ARTERIES, CEREBRAL, NODES, OUTLETS, lines

CASE = """
[case]
name = "thirty-three arteries"
imaged_in = "supine"
[[input]]
file = "arteries.vtp"
vessels = "arteries"
length_unit = "cm"
size_array = "radius"
size_means = "inscribed radius"
frame = "LPS"
[imaging_state]
arterial_pressure = "93 mmHg"
[walls.artery]
stiffness = "user"
wave_speed = "8 m/s"
[segments]
vessels_start_at = "node"
[blood]
viscosity = "4 mPa*s"
density = "1060 kg/m^3"
[[inlets]]
at = "0 0 0"
mean_flow = "5 L/min"
"""

OUTLET = """
[[outlets]]
at = "{x} {y} {z}"
model = "three-element windkessel"
resistance = "{resistance}e9 Pa*s/m^3"
compliance = "{compliance}e-10 m^3/Pa"
far_pressure = "0 mmHg"
"""


def network(without: set[int] = frozenset(), only: set[int] | None = None):
    points, radius, connectivity, offsets = lines(without, only)
    count = len(offsets) - 1
    centrelines = Centrelines(
        points * 1e-2,
        radius * 1e-2,
        points,
        connectivity,
        offsets,
        np.ones(count),
        np.zeros(count),
        np.zeros(len(points)),
    )
    return split(join(centrelines).graph)


def loops_and_parts(net) -> tuple[int, int]:
    start, end = net.segments.from_node, net.segments.to_node
    count = int(parts(len(net.nodes), start, end, np.ones(len(start))).max()) + 1
    return len(start) - len(net.nodes) + count, count


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory):
    folder = tmp_path_factory.mktemp("arteries33")
    points, radius, connectivity, offsets = lines()
    write_lines(folder / "arteries.vtp", points, connectivity, offsets, {"radius": radius})
    outlets = [
        OUTLET.format(x=x, y=y, z=z, resistance=resistance, compliance=compliance)
        for (x, y, z), (resistance, compliance) in ((NODES[key], OUTLETS[key]) for key in OUTLETS)
    ]
    (folder / "case.toml").write_text(CASE + "".join(outlets), encoding="utf-8")
    return build(folder / "case.toml")


def test_topology(built) -> None:
    """E = 33, V = 30, 4 independent loops, 1 inlet, 11 outlets, one part."""
    net = built.network
    assert (len(net.segments), len(net.nodes)) == (33, 30)
    assert loops_and_parts(net) == (4, 1)
    assert (len(net.inlets), len(net.outlets)) == (1, 11)
    assert validate_network(built.output_folder / "network.json").valid


def test_lengths_are_those_of_the_table(built) -> None:
    found = np.sort(built.network.measures.length)
    np.testing.assert_allclose(found, np.sort([one.length / 100 for one in ARTERIES]), rtol=1e-12)


@pytest.mark.parametrize(
    ("number", "resistance"),
    # Poiseuille at 4 mPa·s, derived from length and radius: 8 μ L/(π r⁴)
    [(19, 5.3802e8), (31, 1.0190e8), (25, 6.5229e7), (27, 3.8854e7), (22, 4.2888e7)],
)
def test_resistances(built, number: int, resistance: float) -> None:
    row = next(one for one in ARTERIES if one.number == number)
    net = built.network
    match = np.isclose(net.measures.length, row.length / 100, rtol=1e-9) & np.isclose(
        net.measures.median_radius, row.radius / 100, rtol=1e-9
    )
    assert net.lumped.resistance[match] == pytest.approx(resistance, rel=5e-5)  # half of the last printed digit


def test_outlets_together(built) -> None:
    """1/Σ(1/R) = 1.3474e8 Pa·s/m³, ΣC = 5.160e-9 m³/Pa; six cerebral outlets take 10.12 % of the conductance."""
    outlets = built.network.outlets
    conductance = np.array([1 / outlet.resistance for outlet in outlets])
    assert 1 / conductance.sum() == pytest.approx(1.3474e8, rel=4e-5)
    assert sum(outlet.compliance for outlet in outlets) == pytest.approx(5.160e-9, rel=1e-4)
    position = built.network.nodes.position[[outlet.node for outlet in outlets]] * 100
    cerebral = [key for key in OUTLETS if key in {"t6", "t7", "t8", "t9", "t10", "t11"}]
    rows = [int(np.argmin(np.linalg.norm(position - NODES[key], axis=1))) for key in cerebral]
    assert conductance[rows].sum() / conductance.sum() == pytest.approx(0.1012, abs=5e-5)


def test_symmetric_ring_has_almost_no_cross_flow(built) -> None:
    """The two sides differ only below the carotids: the link between the anterior arteries carries next to nothing."""
    net = built.network
    link = int(np.argmin(np.abs(net.measures.length - 0.003)))
    assert abs(built.state.flow[link]) < 0.02 * np.abs(built.state.flow).max()
    assert built.state.mass_residual < 1e-12


@pytest.mark.parametrize(
    ("label", "removed", "whole", "cerebral", "components"),
    # variants by deletion (derived): loops of the whole, loops and components of the cerebral part
    [
        ("complete", set(), 4, 1, 1),
        ("no anterior communicating", {31}, 3, 0, 1),
        ("no posterior communicating, one side", {19}, 3, 0, 1),
        ("no posterior communicating, both sides", {19, 20}, 2, 0, 2),
        ("no A1, one side", {25}, 3, 0, 1),
        ("no P1, one side", {27}, 3, 0, 1),
        ("no P1, both sides", {27, 28}, 2, 0, 2),
        ("no vertebral, one side", {17}, 3, 1, 1),
        ("no communicating artery at all", {19, 20, 31}, 1, 0, 3),
    ],
)
def test_variants(label: str, removed: set[int], whole: int, cerebral: int, components: int) -> None:
    assert loops_and_parts(network(removed))[0] == whole, label
    assert loops_and_parts(network(removed, CEREBRAL)) == (cerebral, components), label
