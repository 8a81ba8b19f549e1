"""A network between its ends against Ohm's law by hand."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import ModelError
from geomprep.solve import Boundary, solve_between

NONE = np.nan


def boundary(*rows: tuple[int, float, float, float]) -> Boundary:
    """Rows of node, inflow, head, resistance."""
    node, inflow, head, resistance = zip(*rows, strict=True)
    return Boundary(np.array(node), np.array(inflow), np.array(head), np.array(resistance))


def test_flow_divides_over_two_far_heads() -> None:
    """Q = 6 into a node with R = 1 and R = 2 to ground: 4 and 2, head 4; a series edge of R = 0.5 before it: 7."""
    ends = boundary((0, 6.0, NONE, 0.0), (1, NONE, 0.0, 1.0), (2, NONE, 0.0, 1.0))
    found = solve_between(3, [0, 1], [1, 2], [2.0, 1.0], ends)
    np.testing.assert_allclose(found.head, [7.0, 4.0, 2.0], rtol=1e-14)
    np.testing.assert_allclose(found.inflow, [6.0, -4.0, -2.0], rtol=1e-14)
    assert found.imbalance < 1e-14


def test_two_held_heads_and_a_withdrawal() -> None:
    """Unit edges, heads 10 and 4 held, 1 taken out between: 1·(10 − h) + 1·(4 − h) = 1, h = 6.5."""
    ends = boundary((0, NONE, 10.0, 0.0), (2, NONE, 4.0, 0.0), (1, -1.0, NONE, 0.0))
    found = solve_between(3, [0, 1], [1, 2], [1.0, 1.0], ends)
    np.testing.assert_allclose(found.head, [10.0, 6.5, 4.0], rtol=1e-14)
    np.testing.assert_allclose(found.inflow, [3.5, -2.5, -1.0], rtol=1e-14)


def test_no_head_at_all_is_refused() -> None:
    with pytest.raises(ModelError, match="no node of known head"):
        solve_between(2, [0], [1], [1.0], boundary((0, 1.0, NONE, 0.0), (1, -1.0, NONE, 0.0)))


def test_negative_end_resistance_is_refused() -> None:
    with pytest.raises(ModelError, match="resistance -2 at an end"):
        solve_between(2, [0], [1], [1.0], boundary((0, NONE, 1.0, 0.0), (1, NONE, 0.0, -2.0)))


def test_node_held_twice_is_refused() -> None:
    with pytest.raises(ModelError, match="node 0 is fixed twice"):
        solve_between(2, [0], [1], [1.0], boundary((0, NONE, 1.0, 0.0), (0, NONE, 0.0, 0.0)))
