"""The network does not depend on how the same vessels are written down."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.measure import measure_segments
from geomprep.model import Centrelines
from geomprep.repair import join
from geomprep.segments import split


def vessels(seed: int) -> list[tuple[np.ndarray, np.ndarray]]:
    """A small net: a trunk, two arms that meet again, side branches; points in metres."""
    random = np.random.default_rng(seed)
    corners = (
        np.array([[0, 0, 0], [30, 0, 0], [60, 15, 5], [60, -15, 0], [90, 0, 0], [120, 10, 0], [120, -12, 8]]) / 1e3
    )
    links = [(0, 1), (1, 2), (1, 3), (2, 4), (3, 4), (4, 5), (4, 6)]
    lines = []
    for a, b in links:
        n = int(random.integers(6, 14))
        t = np.linspace(0, 1, n)[:, None]
        bend = np.sin(np.pi * t) * random.normal(size=3) * 2e-3
        points = corners[a] * (1 - t) + corners[b] * t + bend
        points[0], points[-1] = corners[a], corners[b]
        lines.append((points, np.full(n, 1e-3) * random.uniform(0.8, 1.6)))
    return lines


def network(lines: list[tuple[np.ndarray, np.ndarray]], raw_scale: float = 1.0):
    points = np.concatenate([points for points, _ in lines])
    counts = [len(points) for points, _ in lines]
    centrelines = Centrelines(
        points=points,
        radius=np.concatenate([radius for _, radius in lines]),
        raw_points=points * raw_scale,
        connectivity=np.arange(len(points)),
        offsets=np.concatenate(([0], np.cumsum(counts))),
        vessel_class=np.ones(len(lines)),
        input_id=np.zeros(len(lines)),
        radius_basis=np.zeros(len(points)),
    )
    return measure_segments(split(join(centrelines).graph))


def signature(net) -> np.ndarray:
    """Numbers of every segment that no rigid motion changes, in a fixed order."""
    m = net.measures
    degree = np.bincount(np.concatenate((net.segments.from_node, net.segments.to_node)))
    low, high = np.sort(np.stack((degree[net.segments.from_node], degree[net.segments.to_node])), axis=0)
    table = np.stack((low, high, m.length, m.volume, m.inverse_fourth_power, m.minimum_radius, m.tortuosity), axis=1)
    return table[np.lexsort(np.round(table, 9).T[::-1])]


def same(a, b) -> None:
    assert (len(a.nodes), len(a.segments)) == (len(b.nodes), len(b.segments))
    np.testing.assert_allclose(signature(a), signature(b), rtol=1e-9)


def rotation(random: np.random.Generator) -> np.ndarray:
    q, r = np.linalg.qr(random.normal(size=(3, 3)))
    return q * np.sign(np.diag(r))


EXAMPLES = settings(max_examples=25, derandomize=True, deadline=None)
SEEDS = st.integers(0, 10_000)


@given(SEEDS)
@EXAMPLES
def test_rotation_and_shift(seed: int) -> None:
    random = np.random.default_rng(seed + 1)
    lines, turn, shift = vessels(seed), rotation(random), random.normal(size=3)
    same(network(lines), network([(points @ turn.T + shift, radius) for points, radius in lines]))


@given(SEEDS)
@EXAMPLES
def test_order_of_lines_and_their_direction(seed: int) -> None:
    random = np.random.default_rng(seed + 1)
    lines = vessels(seed)
    mixed = [lines[i] for i in random.permutation(len(lines))]
    mixed = [(p[::-1], r[::-1]) if random.random() < 0.5 else (p, r) for p, r in mixed]
    first, second = network(lines), network(mixed)
    same(first, second)
    assert first.segments.id.tolist() == second.segments.id.tolist()
    assert np.array_equal(first.stations.position, second.stations.position)


@given(SEEDS)
@EXAMPLES
def test_splitting_lines_in_two(seed: int) -> None:
    random = np.random.default_rng(seed + 1)
    pieces = []
    for points, radius in vessels(seed):
        cut = int(random.integers(1, len(points) - 1))
        pieces += [(points[: cut + 1], radius[: cut + 1]), (points[cut:], radius[cut:])]
    first, second = network(vessels(seed)), network(pieces)
    same(first, second)
    assert first.segments.id.tolist() == second.segments.id.tolist()


@given(SEEDS, st.sampled_from([1e3, 1e2, 1e6, 1 / 0.0254]))
@EXAMPLES
def test_unit_of_the_file(seed: int, scale: float) -> None:
    """Coordinates in another unit, brought to metres at the door, give the same network with other ids."""
    lines = vessels(seed)
    scaled = [(points * scale / scale, radius * scale / scale) for points, radius in lines]
    same(network(lines), network(scaled, raw_scale=scale))
