"""Resistance between ends against circuits solved on paper."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.measure.route_resistance import Routes, effect_of_factor, route_resistance

# two inlets 0 and 1 meet at 2; a bridge 2-3 lies beside a way 2-4-3; outlets 5 and 6 leave 3
WAYS = [(0, 2), (1, 2), (2, 3), (2, 4), (4, 3), (3, 5), (3, 6)]
RESISTANCE = np.array([2.0, 6.0, 3.0, 4.0, 2.0, 4.0, 12.0])


def circuit(resistance: np.ndarray = RESISTANCE) -> Routes:
    ends = np.array(WAYS)
    return Routes(7, ends[:, 0], ends[:, 1], resistance, np.array([0, 1]), np.array([5, 6]))


def parallel(*resistances: float) -> float:
    return 1 / sum(1 / value for value in resistances)


def test_series_and_parallel() -> None:
    expected = parallel(2, 6) + parallel(3, 4 + 2) + parallel(4, 12)
    assert route_resistance(circuit()) == pytest.approx(expected, rel=1e-12)
    assert route_resistance(circuit(RESISTANCE * 1e9)) == pytest.approx(1e9 * expected, rel=1e-12)


def test_effect_of_one_change() -> None:
    whole = route_resistance(circuit())
    # the bridge of 3 made 6, or closed, beside the way of 6
    assert effect_of_factor(circuit(), whole, [2], 2.0) == pytest.approx(parallel(6, 6) - parallel(3, 6), rel=1e-9)
    assert effect_of_factor(circuit(), whole, [2], np.inf) == pytest.approx(6 - parallel(3, 6), rel=1e-9)
    # both pieces of the way by a factor of 3
    assert effect_of_factor(circuit(), whole, [3, 4], 3.0) == pytest.approx(parallel(3, 18) - parallel(3, 6), rel=1e-9)
    assert effect_of_factor(circuit(), whole, [2, 3], np.inf) == np.inf
    assert effect_of_factor(circuit(), whole, [], np.inf) == pytest.approx(0, abs=1e-12)


def test_no_way_at_all() -> None:
    ends = np.array(WAYS)
    apart = Routes(9, ends[:, 0], ends[:, 1], RESISTANCE, np.array([7]), np.array([8]))
    assert route_resistance(apart) == np.inf
    assert np.isnan(effect_of_factor(apart, np.inf, [0], 2.0))
