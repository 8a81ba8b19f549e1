"""Cells add up to their segments, and lie on the nearest axis that runs the same way."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.curves import piece_integrals
from geomprep.measure.alongside import Cells, Nearest, Reach, cells, nearest, shared_pairs
from geomprep.model import Stations

REACH = Reach(within=0.5, named_within=1.0, floor=0.0, cosine=0.5)


def stations(*lines: np.ndarray) -> Stations:
    """Stations of lines of rows x, y, z, radius in mm."""
    rows = np.concatenate(lines) * 1e-3
    along = [np.concatenate(([0], np.cumsum(np.linalg.norm(np.diff(one[:, :3], axis=0), axis=1)))) for one in lines]
    offsets = np.cumsum([0, *(len(one) for one in lines)])
    return Stations(offsets, np.concatenate(along) * 1e-3, rows[:, :3], rows[:, 3], np.zeros(len(rows)))


def kind(count: int) -> tuple[np.ndarray, np.ndarray]:
    return np.array([""] * count, dtype=object), np.ones(count, np.uint8)


def test_cells_add_up_exactly() -> None:
    random = np.random.default_rng(2)
    lines = [
        np.column_stack((np.cumsum(random.uniform(0.2, 2, (20, 3)), axis=0), random.uniform(1, 3, 20))) for _ in "ab"
    ]
    one = stations(*lines)
    cut = cells(one, 0.5)
    for row in (0, 1):
        own = slice(*one.offsets[row : row + 2])
        whole = piece_integrals(np.diff(one.distance[own]), one.radius[own][:-1], one.radius[own][1:])[:, 3].sum()
        mine = cut.segment == row
        assert cut.inverse_fourth_power[mine].sum() == pytest.approx(whole, rel=1e-12)
        assert cut.length[mine].sum() == pytest.approx(one.distance[own][-1], rel=1e-12)
    assert cut.first.tolist() == [0, np.count_nonzero(cut.segment == 0), len(cut.segment)]


def test_a_short_segment_has_four_cells() -> None:
    assert len(cells(stations(np.array([[0, 0, 0, 3.0], [0.1, 0, 0, 3]])), 0.5).length) == 4


@pytest.mark.parametrize(("aside", "turn", "found"), [(0.9, 0, 0), (1.1, 0, -1), (0, 59, 0), (0, 61, -1), (0, 180, 0)])
def test_distance_and_angle_have_limits(aside: float, turn: float, found: int) -> None:
    """Radius 2 mm: half of it is 1 mm; the angle counts without sign, to 60°. Only the middle cells are looked at."""
    x = np.linspace(-10, 10, 41)
    way = np.array([np.cos(np.radians(turn)), np.sin(np.radians(turn)), 0])
    one = cells(stations(np.column_stack((x, 0 * x, 0 * x, 0 * x + 2))), 0.5)
    two = cells(stations(np.column_stack((x[:, None] * way + [0, aside, 0], 0 * x + 2))), 0.5)
    assert nearest(one, two, (kind(1), kind(1)), REACH).segment[[9, 10]].tolist() == [found, found]


def test_the_radius_is_that_at_the_foot() -> None:
    """A cone from 1 to 3 mm over 20 mm beside a tube of 2 mm: linear in x."""
    x = np.linspace(0, 20, 41)
    tube = cells(stations(np.column_stack((x, 0 * x, 0 * x, 0 * x + 2))), 0.5)
    cone = cells(stations(np.column_stack((x, 0 * x, 0 * x, 1 + x / 10))), 0.5)
    found = nearest(tube, cone, (kind(1), kind(1)), REACH)
    assert found.radius == pytest.approx(1e-3 + tube.middle[:, 0] / 10, rel=1e-9)


def test_pairs_need_their_share_from_both_sides() -> None:
    """Two segments of 10 and 6 mm in cells of 1 mm: 3 of the shorter's 6 mm are enough, 2.9 seen from one side are not."""
    x = np.linspace(0, 10, 41)
    long = cells(stations(np.column_stack((x, 0 * x, 0 * x, 0 * x + 2))), 0.5)
    short = cells(stations(np.column_stack((0.6 * x, 0 * x, 0 * x, 0 * x + 2))), 0.5)

    def along(cut: Cells, count: int) -> Nearest:
        return Nearest(np.where(np.arange(len(cut.length)) < count, 0, -1), np.full(len(cut.length), 2e-3))

    for first, second, met in ((3, 3, 1), (3, 2, 0), (2, 3, 0), (0, 0, 0)):
        assert len(shared_pairs((long, along(long, first)), (short, along(short, second)), 0.5)) == met


def test_nothing_on_one_side() -> None:
    none = Stations([0], [], np.empty((0, 3)), [], [])
    one = cells(stations(np.array([[0, 0, 0, 2.0], [9, 0, 0, 2]])), 0.5)
    empty = cells(none, 0.5)
    assert set(nearest(one, empty, (kind(1), kind(0)), REACH).segment.tolist()) == {-1}
    assert len(nearest(empty, one, (kind(0), kind(1)), REACH).segment) == 0
