"""Small networks by hand, measured and with blood."""

import dataclasses

import numpy as np
import pytest

from geomprep.assign import BloodSettings, assign_blood
from geomprep.measure import junctions, measure_segments
from geomprep.model import Network, Nodes, Segments, Stations
from geomprep.segments import orient, split

NAMES = {(0.0, 0.05): "trunk", (0.05, 0.02): "left branch", (0.05, -0.02): "right branch"}


@pytest.fixture
def fork(make_graph) -> Network:
    """A trunk along x of 100 mm (r 3 mm) that forks into two branches of r 2 and 1.5 mm; metres."""
    n = 11
    trunk = [[0.1 * i / (n - 1), 0, 0] for i in range(n)]
    left = [[0.1 + 0.06 * i / (n - 1), 0.05 * i / (n - 1), 0] for i in range(1, n)]
    right = [[0.1 + 0.06 * i / (n - 1), -0.05 * i / (n - 1), 0] for i in range(1, n)]
    points = trunk + left + right
    edges = [[i, i + 1] for i in range(n - 1)]
    edges += [[n - 1 if i == 0 else n - 1 + i, n + i] for i in range(n - 1)]
    edges += [[n - 1 if i == 0 else 2 * n - 2 + i, 2 * n - 1 + i] for i in range(n - 1)]
    radius = [3e-3] * n + [2e-3] * (n - 1) + [1.5e-3] * (n - 1)
    own = [(n - 1, 0, 2e-3), (2 * n - 2, 0, 1.5e-3)]
    return finished(split(make_graph(points, edges, radius, own=own)))


def finished(network: Network) -> Network:
    """Oriented from the smallest x, named by side, measured, with blood of round numbers."""
    ends = np.flatnonzero(network.nodes.role == 2)
    first = ends[np.argmin(network.nodes.position[ends, 0])]
    network = orient(network, np.array([first]), ends[ends != first])
    y = network.nodes.position[network.segments.to_node, 1]
    name = np.where(y > 0, "left branch", np.where(y < 0, "right branch", "trunk")).astype(object)
    network = dataclasses.replace(network, segments=dataclasses.replace(network.segments, name=name))
    blood, _ = assign_blood(BloodSettings(1060.0, 4e-3, 2.0))
    return dataclasses.replace(junctions(measure_segments(network)), blood=blood)


@pytest.fixture
def straight():
    """Builder of separate straight vessels along x: (radius at both ends, length, class, name) of each."""

    def build(*vessels: tuple[tuple[float, float], float, int, str], stations: int = 11) -> Network:
        count = len(vessels)
        along = np.linspace(0, 1, stations)
        distance = np.concatenate([length * along for _, length, _, _ in vessels])
        radius = np.concatenate([near + (far - near) * along for (near, far), _, _, _ in vessels])
        lane = np.repeat(np.arange(count), stations)
        position = np.column_stack((distance, 0.05 * lane, 0 * distance))
        first = np.arange(count) * stations
        ends = np.column_stack((first, first + stations - 1)).ravel()
        nodes = Nodes([f"n{i}" for i in range(2 * count)], position[ends], 0 * ends, 0 * ends + 2, ends)
        segments = Segments(
            id=[f"s{i}" for i in range(count)],
            name=[name for *_, name in vessels],
            from_node=2 * np.arange(count),
            to_node=2 * np.arange(count) + 1,
            vessel_class=[code for _, _, code, _ in vessels],
            input_id=np.zeros(count),
            strahler_order=np.ones(count),
            horsfield_order=np.ones(count),
            generation=np.zeros(count),
        )
        table = Stations(np.append(first, count * stations), distance, position, radius, np.zeros(len(radius)))
        blood, _ = assign_blood(BloodSettings(1060.0, 4e-3, 2.0))
        return dataclasses.replace(measure_segments(Network(nodes, segments, table)), blood=blood)

    return build
