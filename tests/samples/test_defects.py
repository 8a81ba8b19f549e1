"""Every defect planted in the rough sample is in its file, where its truth says, and nowhere else."""

import numpy as np
import pytest


@pytest.fixture(scope="module")
def rough(load):
    return load("neck-veins-rough")


def of_kind(rough, kind: str) -> list[dict]:
    return [defect for defect in rough.truth["defects"] if defect["kind"] == kind]


def test_numbers(rough) -> None:
    kinds = [defect["kind"] for defect in rough.truth["defects"]]
    counted = {kind: kinds.count(kind) for kind in sorted(set(kinds))}
    assert counted == {"copy": 2, "gap": 4, "radius spike": 2, "spur": 4, "zero radius": 3}
    # one line per segment, one more behind each gap, one per spur and copy
    assert len(rough.lines) == 21 + 4 + 4 + 2


def test_zero_radii(rough) -> None:
    zero = rough.points[rough.size == 0]
    assert len(zero) == sum(defect["points"] for defect in of_kind(rough, "zero radius")) == 5
    for defect in of_kind(rough, "zero radius"):
        assert np.linalg.norm(zero - defect["position"], axis=1).min() < 0.6


def test_spikes(rough) -> None:
    for defect in of_kind(rough, "radius spike"):
        at = np.argmin(np.linalg.norm(rough.points - defect["position"], axis=1))
        assert rough.size[at] / defect["true_radius"] == pytest.approx(defect["factor"], rel=1e-3)


def test_gaps(rough) -> None:
    ends = np.array([rough.points[line[end]] for line in rough.lines for end in (0, -1)])
    for defect in of_kind(rough, "gap"):
        for side in ("from", "to"):
            assert (np.abs(ends - defect[side]).max(axis=1) == 0).sum() == 1  # an end that meets nothing
        assert np.linalg.norm(np.subtract(defect["from"], defect["to"])) == pytest.approx(defect["width"], abs=1e-3)
        nearest = np.linalg.norm(rough.points - defect["position"], axis=1).min()
        assert nearest > 0.45 * defect["width"]


def test_spurs(rough) -> None:
    starts = [tuple(rough.points[line[0]]) for line in rough.lines]
    for defect in of_kind(rough, "spur"):
        line = rough.lines[starts.index(tuple(defect["position"]))]
        reach = np.linalg.norm(rough.points[line[-1]] - rough.points[line[0]])
        assert reach == pytest.approx(defect["length"], abs=2e-3)
        assert defect["length_outside_lumen"] < rough.size[line[0]]  # no longer than its own radius outside: no vessel


def test_copies(rough) -> None:
    """Points of a copy lie beside the first line by the stated part of the radius, within the sag of the chords."""
    for defect, line in zip(of_kind(rough, "copy"), rough.lines[-2:], strict=True):
        copy, radius = rough.points[line], rough.size[line]
        others = rough.points[np.concatenate(rough.lines[:-2])]
        distance = np.linalg.norm(others[None] - copy[:, None], axis=2)
        first = others[np.argmin(distance, axis=1)]
        order = np.argsort(distance, axis=1)[:, 1]
        along = others[order] - first
        along /= np.linalg.norm(along, axis=1)[:, None]
        offset = copy - first
        beside = np.linalg.norm(offset - np.einsum("ij,ij->i", offset, along)[:, None] * along, axis=1)
        assert np.abs(beside / radius - defect["offset_in_radii"]).max() < 0.012
