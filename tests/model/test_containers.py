"""Containers check themselves once and stay read-only."""

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import Centrelines, anchor_ids, concatenate, raw_order


def centrelines(**changes: object) -> Centrelines:
    values: dict[str, object] = {
        "points": np.zeros((3, 3)),
        "radius": np.ones(3),
        "raw_points": np.zeros((3, 3), np.float32),
        "connectivity": [0, 1, 2],
        "offsets": [0, 3],
        "vessel_class": [1],
        "input_id": [0],
        "radius_basis": [0, 0, 0],
    }
    return Centrelines(**(values | changes))  # type: ignore[arg-type]


def test_arrays_are_read_only_and_raw_bytes_kept() -> None:
    lines = centrelines()
    assert lines.raw_points.dtype == np.float32
    with pytest.raises(ValueError, match="read-only"):
        lines.points[0, 0] = 1.0


@pytest.mark.parametrize(
    ("changes", "word"),
    [
        ({"radius": np.ones(2)}, "must agree"),
        ({"points": np.zeros((3, 2))}, "shape"),
        ({"connectivity": [0, 1, 3]}, "names point 3"),
        ({"offsets": [0, 2]}, "offsets must rise"),
        ({"offsets": [1, 3]}, "offsets must rise"),
        ({"vessel_class": [1, 1]}, "must agree"),
    ],
)
def test_parts_that_do_not_fit_are_refused(changes: dict[str, object], word: str) -> None:
    with pytest.raises(InputError, match=word):
        centrelines(**changes)


def test_concatenating_numbers_the_inputs_and_shifts_the_points() -> None:
    both = concatenate([centrelines(), centrelines(raw_points=np.ones((3, 3)))])
    assert both.connectivity.tolist() == [0, 1, 2, 3, 4, 5]
    assert both.offsets.tolist() == [0, 3, 6]
    assert both.input_id.tolist() == [0, 1]


def test_ids_follow_raw_bytes_not_order() -> None:
    random = np.random.default_rng(0)
    points = random.normal(size=(6, 3)).astype(np.float32)
    shuffle = random.permutation(6)
    place = np.argsort(shuffle)
    first = anchor_ids("node", points, np.array([[0, 4], [5, -1]]))
    second = anchor_ids("node", points[shuffle], place[np.array([[4, 0], [5, 5]])])
    assert first[0] == second[0]
    assert first[1] != second[1]  # one anchor is not the same as that anchor twice
    assert np.array_equal(points[raw_order(points, np.arange(6))], sorted(points.tolist()))


def test_equal_anchors_are_told_apart() -> None:
    ids = anchor_ids("segment", np.zeros((2, 3)), np.array([[0], [1], [0]]))
    assert len(set(ids)) == 3
    assert ids[1] == f"{ids[0]}-2"


def test_negative_zero_is_zero() -> None:
    assert anchor_ids("n", np.array([[-0.0, 0, 0]]), np.array([[0]])) == anchor_ids(
        "n", np.zeros((1, 3)), np.array([[0]])
    )
