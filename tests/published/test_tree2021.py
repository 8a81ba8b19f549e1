"""Rows 1 to 33 of a subject-specific arterial tree, laid out in space and built from its parent column.

Front Physiol 2021;12:734311, doi 10.3389/fphys.2021.734311, table 2 (seen; sizes read as radii). Rows from 34 on were
not seen and are left out.
"""

import numpy as np
import pytest

from geomprep.measure import measure_segments
from geomprep.model import Centrelines
from geomprep.repair import join
from geomprep.segments import order_segments, orient, split
from geomprep.units import parse_quantity

# row, parent, length cm, radius proximal > distal cm
ROWS = """
1 0 4.4 1.092 1.193|2 1 1.0 1.157 1.072|3 1 3.7 0.881 0.296|4 3 2.9 0.405 0.438|5 3 10.3 0.312 0.327
6 4 23.4 0.249 0.148|7 4 39.8 0.410 0.229|8 7 22.0 0.175 0.140|9 7 6.7 0.215 0.215|10 9 7.0 0.100 0.100
11 9 17.0 0.203 0.180|12 5 15.8 0.268 0.162|13 5 12.0 0.204 0.109|14 2 1.5 1.096 1.046|15 2 13.4 0.394 0.262
16 15 15.1 0.262 0.175|17 15 11.4 0.177 0.103|18 14 7.9 1.078 0.850|19 14 5.2 0.731 0.238|20 19 20.8 0.173 0.164
21 19 39.8 0.410 0.228|22 21 22.0 0.175 0.140|23 21 6.7 0.215 0.215|24 23 7.0 0.100 0.100|25 23 17.0 0.203 0.180
26 18 7.3 0.300 0.300|27 18 15.9 0.909 0.805|28 27 1.3 0.815 0.790|29 27 1.8 0.614 0.233|30 29 2.0 0.300 0.250
31 29 6.5 0.275 0.250|32 30 5.5 0.200 0.200|33 30 5.8 0.175 0.150
"""
TABLE = {
    int(n): (int(parent), float(length), float(near), float(far))
    for n, parent, length, near, far in (row.split() for row in ROWS.replace("\n", "|").split("|") if row.strip())
}
CHILDLESS = {6, 8, 10, 11, 12, 13, 16, 17, 20, 22, 24, 25, 26, 28, 31, 32, 33}


def laid_out() -> tuple[Centrelines, dict[int, np.ndarray]]:
    """Each vessel a straight line from the end of its parent; sisters leave to opposite sides."""
    random = np.random.default_rng(4)
    end, heading, paths, radii, seen = {0: np.zeros(3)}, {0: np.array([0.0, 0, 1])}, [], [], dict.fromkeys(TABLE, 0)
    side: dict[int, np.ndarray] = {}
    for row, (parent, length, near, far) in TABLE.items():
        if parent not in side:
            side[parent] = np.cross(heading[parent], random.normal(size=3))
            side[parent] /= np.linalg.norm(side[parent])
        sign = 1.0 if seen.setdefault(parent, 0) == 0 else -1.0
        seen[parent] += 1
        way = heading[parent] + sign * side[parent]
        heading[row] = way / np.linalg.norm(way)
        t = np.linspace(0, 1, max(3, int(length / 0.2)))[:, None]
        paths.append((end[parent] + heading[row] * length * t) * 1e-2)
        radii.append((near + (far - near) * t[:, 0]) * 1e-2)
        end[row] = end[parent] + heading[row] * length
    points = np.concatenate(paths)
    offsets = np.concatenate(([0], np.cumsum([len(path) for path in paths])))
    count = len(paths)
    lines = Centrelines(points, np.concatenate(radii), points, np.arange(len(points)), offsets, np.ones(count),
                        np.zeros(count), np.zeros(len(points)))  # fmt: skip
    return lines, {row: end[row] * 1e-2 for row in TABLE}


@pytest.fixture(scope="module")
def built():
    lines, ends = laid_out()
    network = split(join(lines).graph)
    open_ends = np.flatnonzero(network.nodes.role == 2)
    root = open_ends[np.argmin(np.linalg.norm(network.nodes.position[open_ends], axis=1))]
    leaves = open_ends[open_ends != root]
    network = orient(network, np.array([root]), leaves)
    return measure_segments(order_segments(network, np.array([root]), leaves).network), ends


def row_of(network, ends: dict[int, np.ndarray]) -> dict[int, int]:
    """Row of the table that each segment is, by the place of its far end."""
    far = network.nodes.position[network.segments.to_node]
    return {
        segment: min(ends, key=lambda row: np.linalg.norm(far[segment] - ends[row]))
        for segment in range(len(network.segments))
    }


def test_tree_has_the_vessels_and_ends_of_the_table(built) -> None:
    network, ends = built
    rows = row_of(network, ends)
    assert sorted(rows.values()) == sorted(TABLE)
    assert len(network.nodes) == 34
    leaves = {rows[s] for s in range(33) if network.segments.strahler_order[s] == 1 and rows[s] in CHILDLESS}
    assert leaves == CHILDLESS
    assert (network.segments.generation >= 0).all()


def test_ancestors_of_row_24(built) -> None:
    """24, 23, 21, 19, 14, 2, 1."""
    network, ends = built
    rows = row_of(network, ends)
    segment = next(s for s, row in rows.items() if row == 24)
    chain = [24]
    while network.segments.generation[segment] > 0:
        segment = int(np.flatnonzero(network.segments.to_node == network.segments.from_node[segment])[0])
        chain.append(rows[segment])
    assert chain == [24, 23, 21, 19, 14, 2, 1]


@pytest.mark.parametrize(
    ("row", "resistance"), [(12, 9.2746e7), (13, 2.8066e8), (6, 1.9170e8), (3, 7.9663e5), (19, 2.5648e6)]
)
def test_a_daughter_keeps_its_own_radius_at_the_fork(built, row: int, resistance: float) -> None:
    """Tapered Poiseuille resistance at 4 mPa·s (derived): jumps of radius at joints must not leak into it."""
    network, ends = built
    segment = next(s for s, found in row_of(network, ends).items() if found == row)
    found = 8 * 4e-3 / np.pi * network.measures.inverse_fourth_power[segment]
    assert found == pytest.approx(resistance, rel=1e-4)


def test_units_of_the_table() -> None:
    assert parse_quantity("27.87 mmHg*s/mL", "resistance") == pytest.approx(3.71569e9, rel=1e-5)
    assert parse_quantity("0.0126 mL/mmHg", "compliance") == pytest.approx(9.45078e-11, rel=1e-5)
