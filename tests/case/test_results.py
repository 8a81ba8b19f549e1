"""Tables and pictures say what the network says."""

import csv
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from geomprep.case.build import BuildResult, build

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> BuildResult:
    return build(SAMPLES / "neck-veins" / "case.toml", output=tmp_path_factory.mktemp("results"))


def rows(folder: Path, name: str) -> list[dict[str, str]]:
    with (folder / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_tables_give_every_number_back_exactly(built: BuildResult) -> None:
    segments = rows(built.output_folder, "segments.csv")
    assert [float(row["length [m]"]) for row in segments] == built.network.measures.length.tolist()
    assert [float(row["flow [m3/s]"]) for row in segments] == built.state.flow.tolist()
    stations = rows(built.output_folder, "stations.csv")
    assert [float(row["radius [m]"]) for row in stations] == built.network.stations.radius.tolist()
    nodes = rows(built.output_folder, "nodes.csv")
    assert [row["id"] for row in nodes] == built.network.nodes.id.tolist()
    assert {row["severity"] for row in rows(built.output_folder, "findings.csv")} <= {"note", "warning", "error"}


def test_overview_is_well_formed_and_shows_every_segment(built: BuildResult) -> None:
    text = (built.output_folder / "overview.svg").read_text(encoding="utf-8")
    root = ElementTree.fromstring(text)
    paths = root.findall(".//{http://www.w3.org/2000/svg}path")
    assert len(paths) == 2 * len(built.network.segments)  # once in true proportions, once on the flat map
    said = " ".join(element.text or "" for element in root.iter("{http://www.w3.org/2000/svg}text"))
    for word in ("left", "right", "head", "feet", "mm", "not for diagnosis", "superior sagittal sinus"):
        assert word in said


def test_left_is_left_on_the_picture(built: BuildResult) -> None:
    """In LPS x grows to the patient's left, which is on the right of a picture seen from the front."""
    from geomprep.export.projection import chosen_view

    view = chosen_view(built.network, "LPS", 600.0)
    names = built.network.segments.name.tolist()
    middle = {}
    for side in ("left", "right"):
        row = names.index(f"{side} internal jugular vein")
        rows_of = slice(*built.network.stations.offsets[row : row + 2])
        middle[side] = view.place(built.network.stations.position[rows_of])[:, 0].mean()
    assert middle["left"] > middle["right"]
    mirrored = chosen_view(built.network, "RPS", 600.0)
    place = mirrored.place(built.network.stations.position)
    np.testing.assert_allclose(place[:, 0] + view.place(built.network.stations.position)[:, 0], 600.0)
