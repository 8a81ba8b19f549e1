"""The whole way: samples in, files out, the receiver's steady check."""

from pathlib import Path

import numpy as np
import pytest

from geomprep.case.build import build
from geomprep.case.results import station_pressure
from geomprep.files import read_file

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"


@pytest.mark.parametrize("name", ["limb", "head-arteries", "neck-veins"])
def test_samples_build_and_balance(name: str, tmp_path: Path) -> None:
    result = build(SAMPLES / name / "case.toml", output=tmp_path)
    assert result.state.mass_residual < 1e-12
    assert result.state.inlet_flow.sum() == pytest.approx(result.state.outlet_flow.sum(), rel=1e-12)
    assert len(result.summary) <= 8
    assert (tmp_path / "network.json").is_file()
    lines = read_file(tmp_path / "lines.vtp")
    assert lines.n_lines == len(result.network.segments)
    assert set(lines.point_arrays) == {"radius", "area", "arc_length", "pressure"}


def test_a_dry_run_writes_nothing(tmp_path: Path) -> None:
    result = build(SAMPLES / "limb" / "case.toml", output=tmp_path / "results", dry_run=True)
    assert result.output_folder is None
    assert list(tmp_path.iterdir()) == []


def test_pressure_on_the_lines_meets_the_nodes(tmp_path: Path) -> None:
    result = build(SAMPLES / "neck-veins" / "case.toml", dry_run=True)
    network, state = result.network, result.state
    height = np.zeros(len(network.stations))
    offsets, segments = network.stations.offsets, network.segments
    # gravity points along +y in LPS when supine: height is −y
    height = -network.stations.position[:, 1]
    # a vessel starts where it leaves its parent; between the node and there the head is that of the node
    head = station_pressure(network, state, height) + network.blood.density * 9.80665 * height
    at_node = state.pressure + network.blood.density * 9.80665 * network.nodes.height
    np.testing.assert_allclose(head[offsets[:-1]], at_node[segments.from_node], rtol=1e-9, atol=1e-6)
    np.testing.assert_allclose(head[offsets[1:] - 1], at_node[segments.to_node], rtol=1e-9, atol=1e-6)
    assert (network.cuts.at_from > 0).any()


def test_the_input_is_never_touched(tmp_path: Path) -> None:
    before = {path: path.read_bytes() for path in sorted((SAMPLES / "limb").iterdir()) if path.is_file()}
    build(SAMPLES / "limb" / "case.toml", output=tmp_path)
    assert {path: path.read_bytes() for path in before} == before
