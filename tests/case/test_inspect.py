"""What inspect sees in a file, and the first look at its open ends."""

import json
from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from geomprep.case.inspect import inspect, inspection_of
from geomprep.case.open_ends import find_open_ends
from geomprep.errors import CaseError, FileError, InputError
from geomprep.files.contents import FileContents
from geomprep.files.statement import InputStatement
from geomprep.findings import Severity

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"


def drawn(points, lines, **arrays):
    points = np.asarray(points, dtype=float)
    return FileContents(
        "made.vtp",
        "0" * 64,
        "made here",
        points,
        np.concatenate([np.asarray(line) for line in lines]),
        np.cumsum([0] + [len(line) for line in lines]),
        arrays or {"radius": np.ones(len(points))},
    )


SQUARE = [[0, 0, 0], [10, 0, 0], [10, 10, 0], [0, 10, 0]]


@pytest.mark.parametrize(
    ("points", "lines", "ends", "parts", "loops"),
    [
        (SQUARE, [[0, 1, 2, 3]], [0, 3], 1, 0),
        (SQUARE, [[0, 1, 2, 3, 0]], [], 1, 1),
        (SQUARE, [[0, 1], [2, 3]], [0, 1, 2, 3], 2, 0),
        (SQUARE, [[0, 1, 2], [2, 1, 0]], [0, 2], 1, 0),  # drawn twice: one vessel
        ([*SQUARE, [10, 10, 0], [20, 20, 0]], [[0, 1, 2], [4, 5]], [0, 5], 1, 0),  # own copies of one place
        (SQUARE, [[0, 1, 1, 2]], [0, 2], 1, 0),  # a repeated point
        ([*SQUARE, [50, 0, 0]], [[0, 1, 2, 3, 0], [1, 4]], [4], 1, 1),
    ],
)
def test_open_ends_parts_and_loops(points, lines, ends, parts, loops):
    found = find_open_ends(drawn(points, lines))
    assert sorted(found.points.tolist()) == ends
    assert (found.n_parts, found.n_loops) == (parts, loops)


def test_length_and_steps_without_length():
    found = find_open_ends(drawn(SQUARE, [[0, 1, 1, 2], [3, 0]]))
    assert found.total_length == pytest.approx(30.0)
    assert found.n_zero_steps == 1


def kinds(contents):
    found = inspection_of(contents, InputStatement("made.vtp"))
    return {finding.kind: finding for finding in found.findings}


def test_what_is_wrong_is_said_with_numbers():
    contents = drawn([*SQUARE, [1, 1, 1]], [[0, 1], [2, 3, 3]], radius=np.array([1.0, 0.0, np.nan, -2.0, 1.0]))
    found = kinds(contents)
    assert found["bad sizes"].severity is Severity.ERROR
    assert "3 of 5 points: 1, 2, 3" in found["bad sizes"].message
    assert found["unused points"].message.startswith("1 points")
    assert found["parts"].severity is Severity.WARNING
    assert "repeated points" in found


def test_a_closed_ring_has_no_way_in():
    assert "open ends" in kinds(drawn(SQUARE, [[0, 1, 2, 3, 0]]))


def test_a_file_without_sizes_is_an_error_finding_and_no_exception():
    found = inspection_of(drawn(SQUARE, [[0, 1]], flow=np.ones(4)), InputStatement("made.vtp"))
    assert found.gate is None
    assert [finding.kind for finding in found.findings if finding.severity is Severity.ERROR] == ["no sizes"]


def test_sample_as_json():
    """The maker of the sample draws it in centimetres with diameters (sample_geometries/README.md)."""
    found = inspect(SAMPLES / "limb" / "arteries.vtk", vessels="arteries", voxel=(8e-4, 8e-4, 8e-4))
    document = json.loads(json.dumps(found.to_dict()))
    assert (document["lines"], document["open_ends"], document["parts"], document["independent_loops"]) == (7, 5, 1, 0)
    assert document["arrays"][0]["may_hold"] == "may hold diameter"
    best = document["readings"][0]
    assert (best["unit"], best["meaning"]) == ("cm", "diameter")
    assert [question["key"] for question in document["questions"]] == ["input[0].length_unit", "input[0].size_means"]


def test_bad_arguments():
    with pytest.raises(FileError, match="no such file"):
        inspect("none.vtp")
    with pytest.raises(InputError, match="vessels = 'nerves'"):
        inspect(SAMPLES / "limb" / "arteries.vtk", vessels="nerves")
    with pytest.raises(CaseError, match="no such array"):
        inspect(SAMPLES / "limb" / "arteries.vtk", size_array="girth")


def test_what_would_be_repaired_is_listed_without_a_case() -> None:
    """The rough sample holds 4 gaps, 4 spurs, 2 copies and 5 runs of bad radii; read as veins, gaps and copies are asked."""
    found = inspect(SAMPLES / "neck-veins-rough" / "veins.vtp", vessels="veins")
    kinds = Counter((repair.kind, repair.verdict_by) for repair in found.preview.repairs)
    assert kinds == {
        ("gap", "open"): 4,
        ("overlapping veins", "open"): 1,
        ("copy of a vessel", "open"): 1,
        ("spur", "rule"): 4,
        ("impossible radius", "rule"): 3,
        ("radius spike", "rule"): 2,
    }
    assert "in mm" in found.preview.read_as
    listed = found.to_dict()["repairs"]
    assert len(listed["repairs"]) == 15
    assert listed["repairs"][0]["options"]
