"""A new case asks until it is answered, and is a case once it is."""

import re
from pathlib import Path

import numpy as np
import pytest

from geomprep.case.build import build
from geomprep.case.file import read_case
from geomprep.case.new import new_case, new_case_text
from geomprep.errors import InputError, OpenQuestions
from geomprep.files import read_file

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"
VEINS = SAMPLES / "neck-veins" / "veins.vtp"
LIMB = SAMPLES / "limb" / "arteries.vtk"

TWO_CLASSES = """# vtk DataFile Version 3.0
two vessels
ASCII
DATASET POLYDATA
POINTS 4 float
0 0 0 0 0 50 9 0 0 9 0 50
LINES 2 6
2 0 1
2 2 3
CELL_DATA 2
SCALARS kind int 1
LOOKUP_TABLE default
4 9
SCALARS radius double 1
LOOKUP_TABLE default
2.0 3.0
SCALARS radius_negative double 1
LOOKUP_TABLE default
-2.0 -3.0
"""


def test_nothing_is_chosen_for_anybody(tmp_path):
    case = read_case(new_case([VEINS], tmp_path / "case.toml"))
    statement = case.inputs[0]
    assert (statement.vessels, statement.length_unit, statement.size_means, statement.frame) == (None,) * 4
    assert case.inlets == case.outlets == ()
    with pytest.raises(OpenQuestions):
        build(tmp_path / "case.toml")


def test_every_choice_stands_with_its_evidence_and_is_toml_once_uncommented(tmp_path):
    text = new_case([VEINS], tmp_path / "case.toml").read_text(encoding="utf-8")
    units = re.findall(r'# CHOOSE: length_unit = "(\w+)" +# (.*)', text)
    assert units[0][0] == "mm"
    assert all("median radius" in evidence for _, evidence in units)
    chosen = text
    for line in ('vessels = "veins"', 'length_unit = "mm"', 'size_means = "inscribed radius"', 'frame = "LPS"'):
        assert f"# CHOOSE: {line}" in chosen
        chosen = chosen.replace(f"# CHOOSE: {line}", line)
    (tmp_path / "case.toml").write_text(chosen, encoding="utf-8")
    statement = read_case(tmp_path / "case.toml").inputs[0]
    assert (statement.vessels, statement.length_unit, statement.frame) == ("veins", "mm", "LPS")


def test_open_ends_are_places_of_the_file_the_widest_first(tmp_path):
    """The places are those of points at which exactly one line ends (counted here by coordinates)."""
    contents = read_file(LIMB)
    text = new_case_text([LIMB], tmp_path, "limb")
    listed = re.findall(r'#   at = "([^"]+)" +# size ([\d.]+)', text)
    sizes = [float(size) for _, size in listed]
    assert sizes == sorted(sizes, reverse=True)
    firsts = contents.points[contents.connectivity[contents.offsets[:-1]]]
    lasts = contents.points[contents.connectivity[contents.offsets[1:] - 1]]
    ends = np.concatenate([firsts, lasts])
    places, counts = np.unique(np.round(ends, 9), axis=0, return_counts=True)
    lonely = {" ".join(f"{value:.6g}" for value in place) for place in (places[counts == 1] + 0.0).tolist()}
    assert {place for place, _ in listed} == lonely


def test_answers_are_written_and_open_the_next_question(tmp_path):
    """'both' asks which array tells; a negated array and a wrong unit are refused and asked again."""
    (tmp_path / "two.vtk").write_text(TWO_CLASSES)
    answers = {
        "size_array": ["radius_negative", "radius"],
        "vessels": ["both"],
        "class_array": ["kind"],
        "class_values": ["{ artery = 4", "{ artery = 4, vein = 9 }"],
        "length_unit": ["furlong", "mm"],
        "size_means": ["inscribed radius"],
    }
    asked = []

    def ask(question):
        name = question.key.split(".")[-1]
        asked.append((name, question.text))
        return answers[name].pop(0)

    case = read_case(new_case([tmp_path / "two.vtk"], tmp_path / "case.toml", ask))
    statement = case.inputs[0]
    assert statement.file == "two.vtk"
    assert (statement.size_array, statement.vessels, statement.length_unit) == ("radius", "both", "mm")
    assert statement.class_values == (4.0, 9.0)
    again = [text for name, text in asked if name == "length_unit"]
    assert len(again) == 2
    assert "furlong" in again[1]
    assert not any(answers.values())


def test_an_empty_answer_leaves_the_question_open(tmp_path):
    seen = []
    path = new_case([VEINS], tmp_path / "case.toml", lambda question: seen.append(question.key))
    assert len(seen) == len(set(seen)) >= 3
    assert "# CHOOSE: length_unit" in path.read_text(encoding="utf-8")


def test_several_files_and_relative_paths(tmp_path):
    (tmp_path / "data").mkdir()
    for name in ("a.vtk", "b.vtk"):
        (tmp_path / "data" / name).write_text(TWO_CLASSES)
    case = read_case(new_case([tmp_path / "data" / "a.vtk", tmp_path / "data" / "b.vtk"], tmp_path / "case.toml"))
    assert [statement.file for statement in case.inputs] == ["data/a.vtk", "data/b.vtk"]


def test_a_file_in_the_way_stays(tmp_path):
    (tmp_path / "case.toml").write_text("mine")
    with pytest.raises(InputError, match="exists already"):
        new_case([VEINS], tmp_path / "case.toml")
    assert (tmp_path / "case.toml").read_text() == "mine"
    with pytest.raises(InputError):
        new_case([VEINS], tmp_path / "no such folder" / "case.toml")
