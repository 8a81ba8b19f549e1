"""Names from a table of points."""

from pathlib import Path

import numpy as np
import pytest

from geomprep.anatomy import NamedPoint, name_segments, read_names
from geomprep.errors import InputError
from geomprep.segments import split


def network(make_graph):
    points = [[0, 0, 0], [10, 0, 0], [20, 10, 0], [20, -10, 0]]
    return split(make_graph(points, [[0, 1], [1, 2], [1, 3]], 1.0))


def test_nearest_piece_names_the_segment(make_graph) -> None:
    # (9, 0.5, 0) is nearest to the station at the fork, which three segments share: the piece decides
    result = name_segments(network(make_graph), [NamedPoint("trunk", (8.9, 0.2, 0)), NamedPoint("upper", (16, 6, 0))])
    found = dict(zip(result.network.segments.name, result.network.segments.to_node, strict=True))
    assert {"trunk", "upper", ""} == set(found)
    assert result.findings == ()
    upper = result.network.segments.name.tolist().index("upper")
    last = result.network.stations.offsets[upper + 1] - 1
    first = result.network.stations.offsets[upper]
    ends = result.network.stations.position[[first, last], 1]
    assert ends.max() == 10


def test_a_far_point_names_nothing(make_graph) -> None:
    result = name_segments(network(make_graph), [NamedPoint("lost", (0, 30, 0))])
    assert set(result.network.segments.name) == {""}
    assert result.findings[0].kind == "name far from vessels"


def test_two_names_on_one_segment_are_said(make_graph) -> None:
    points = [NamedPoint("b", (5, 0.4, 0)), NamedPoint("a", (4, 0.1, 0))]
    result = name_segments(network(make_graph), points)
    assert "a" in result.network.segments.name.tolist()
    assert result.findings[0].kind == "two names on one segment"
    assert np.sum(result.network.segments.name == "a") == 1


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("name,x,y\na,1,2\n", "column z is missing"),
        ("name,x,y,z\na,1,2,three\n", "line 2"),
        ("name,x,y,z\n,1,2,3\n", "a name and three finite numbers"),
        ("name,x,y,z\na,1,2,inf\n", "finite"),
        ("", "column name is missing"),
    ],
)
def test_bad_tables_are_refused_in_one_line(tmp_path: Path, text: str, word: str) -> None:
    file = tmp_path / "names.csv"
    file.write_text(text)
    with pytest.raises(InputError, match=word):
        read_names(file, 1e-3)


def test_table_in_file_units(tmp_path: Path) -> None:
    file = tmp_path / "names.csv"
    file.write_text("name,x,y,z\nleft internal jugular vein,10,20,-5\n")
    (point,) = read_names(file, 1e-3)
    assert point.name == "left internal jugular vein"
    assert point.position == pytest.approx((0.010, 0.020, -0.005))
    with pytest.raises(InputError, match="cannot be read"):
        read_names(tmp_path / "none.csv", 1.0)
