"""Real centreline files of other producers, read where they are present and never committed.

Sources and licences stand in the SOURCE.md beside each file.
"""

from pathlib import Path

import numpy as np
import pytest

from geomprep.case.build import build
from geomprep.cli.main import main
from geomprep.errors import OpenQuestions
from geomprep.export import validate_network
from geomprep.files import read_file

REAL = Path(__file__).parent.parent.parent.parent / "shared" / "real"
RENAL = REAL / "renal_artery" / "final_main_artery.vtk"
present = pytest.mark.skipif(not RENAL.is_file(), reason="the real files are not on this machine")

CASE = """
[case]
name = "renal-tree"
[[input]]
file = "{file}"
vessels = "arteries"
{stated}
[imaging_state]
arterial_pressure = "93 mmHg"
[walls.artery]
stiffness = "user"
wave_speed = "8 m/s"
[[inlets]]
at = "{root}"
pressure = "93 mmHg"
[[outlets]]
at = "every other open end"
model = "fixed pressure"
pressure = "60 mmHg"
"""


def case(folder: Path, stated: str) -> Path:
    contents = read_file(RENAL)
    root = " ".join(str(value) for value in contents.points[contents.connectivity[0]].tolist())
    path = folder / "case.toml"
    path.write_text(CASE.format(file=RENAL.as_posix(), stated=stated, root=root), encoding="utf-8")
    return path


@present
def test_renal_tree_is_refused_with_the_candidates_listed(tmp_path: Path) -> None:
    with pytest.raises(OpenQuestions) as caught:
        build(case(tmp_path, ""), output=tmp_path / "results")
    keys = {question.key: question for question in caught.value.questions}
    assert "input[0].length_unit" in keys
    assert len(keys["input[0].size_array"].candidates) >= 2
    assert not (tmp_path / "results").exists()


@present
def test_renal_tree_builds_once_array_and_unit_are_named(tmp_path: Path) -> None:
    contents = read_file(RENAL)
    arrays = {**contents.point_arrays, **contents.cell_arrays}
    name = next(
        key for key, values in arrays.items() if "radi" in key.lower() and values.ndim == 1 and (values > 0).all()
    )
    stated = f'length_unit = "mm"\nsize_array = "{name}"\nsize_means = "inscribed radius"'
    result = build(case(tmp_path, stated), output=tmp_path / "results")
    assert validate_network(tmp_path / "results" / "network.json").valid
    # 22 points, 21 two-point lines (SOURCE.md): a tree, so one node more than segments
    assert len(result.network.nodes) == len(result.network.segments) + 1
    drawn = np.linalg.norm(np.diff(contents.points[contents.connectivity.reshape(-1, 2)], axis=1), axis=2).sum()
    cuts = result.network.cuts.at_from.sum() + result.network.cuts.at_to.sum()
    assert result.network.measures.length.sum() + cuts == pytest.approx(1e-3 * drawn, rel=1e-6)
    assert any(finding.kind == "stored length" for finding in result.findings)


@present
@pytest.mark.parametrize(
    ("file", "word"),
    [("renal_artery/sampled_terminal_nodes.vtk", "line"), ("planar_path/centerline.vtp", "size")],
)
def test_points_without_lines_and_lines_without_radius_are_one_line_each(
    file: str, word: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "case.toml"
    path.write_text(CASE.format(file=(REAL / file).as_posix(), stated='length_unit = "mm"', root="0 0 0"))
    assert main(["build", str(path)]) == 2
    said = capsys.readouterr().err.strip()
    assert len(said.splitlines()) == 1
    assert word in said
