"""Planted faults: what a schema can know, validator and jsonschema refuse alike; meaning only the validator."""

import copy
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from geomprep.case.build import build
from geomprep.errors import NetworkFileError
from geomprep.export import schema, schema_text, validate_network
from geomprep.export.checks.schema import schema_faults
from geomprep.export.validate import document_faults

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"
PACKAGE = Path(__file__).parent.parent.parent / "geomprep"

Change = Callable[[dict[str, Any]], object]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("results")
    build(SAMPLES / "limb" / "case.toml", output=out)
    return out


@pytest.fixture(scope="module")
def valid(folder: Path) -> dict[str, Any]:
    return json.loads((folder / "network.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def checker() -> jsonschema.Draft202012Validator:
    jsonschema.Draft202012Validator.check_schema(schema())
    return jsonschema.Draft202012Validator(schema())


def dig(net: dict[str, Any], path: str) -> tuple[Any, Any]:
    """Holder and last key of a dotted path with row numbers."""
    *outer, last = [int(part) if part.isdigit() else part for part in path.split(".")]
    for part in outer:
        net = net[part]
    return net, last


def put(path: str, value: Any) -> Change:
    def change(net: dict[str, Any]) -> None:
        holder, key = dig(net, path)
        holder[key] = value

    return change


def drop(path: str) -> Change:
    def change(net: dict[str, Any]) -> None:
        holder, key = dig(net, path)
        del holder[key]

    return change


def add(path: str, value: Any = 1) -> Change:
    return put(path, value)


MISSING = [
    "format",
    "format_version",
    "cautions",
    "units",
    "conventions",
    "imaging_state",
    "blood",
    "surroundings",
    "tube_laws",
    "nodes",
    "segments",
    "stations",
    "junctions",
    "inlets",
    "outlets",
    "steady_check",
    "basis",
    "findings",
    "repairs",
    "sources",
    "provenance",
    "producer",
    "nodes.id",
    "nodes.position",
    "nodes.height",
    "nodes.role",
    "segments.id",
    "segments.from_node",
    "segments.to_node",
    "segments.length",
    "segments.radii",
    "segments.radii.minimum",
    "segments.lumped",
    "segments.lumped.resistance",
    "segments.integrals.inverse_area",
    "segments.tube_law",
    "stations.offsets",
    "stations.distance",
    "stations.radius",
    "stations.stiffness",
    "stations.imaging_transmural",
    "blood.density",
    "blood.viscosity",
    "blood.velocity_profile",
    "conventions.gravity",
    "conventions.positive_flow",
    "units.pressure",
    "tube_laws.0.m",
    "outlets.0.model",
    "outlets.0.far_pressure",
    "inlets.0.node",
    "steady_check.pressure",
    "steady_check.tolerance",
    "basis.fields",
    "provenance.inputs",
    "sources.0.doi",
    "junctions.direction",
    "surroundings.0.id",
]

UNKNOWN = [
    "beta",
    "nodes.colour",
    "segments.stiffness",
    "stations.wall",
    "blood.hematocrit",
    "outlets.0.r1",
    "inlets.0.wave",
    "units.mass",
]

# path, value, word of the validator
WRONG: list[tuple[str, Any, str]] = [
    ("format", "some other network", "choice"),
    ("blood.density", "1060", "type"),
    ("blood.density", -1060.0, "range"),
    ("blood.density", None, "type"),
    ("blood.viscosity", 0.0, "range"),
    ("blood", [], "type"),
    ("nodes", [], "type"),
    ("nodes.id.0", 7, "type"),
    ("nodes.id.0", "", "length"),
    ("nodes.height.0", "0", "type"),
    ("nodes.height.0", None, "type"),
    ("nodes.position.0", [0.0, 0.0], "length"),
    ("nodes.position.0", [0.0, 0.0, "0"], "type"),
    ("nodes.position.0.0", 1e9, "range"),
    ("nodes.role.0", "tip", "choice"),
    ("segments.from_node.0", -1, "reference"),
    ("segments.from_node.0", 0.5, "type"),
    ("segments.from_node.0", "node-1", "type"),
    ("segments.length.0", 0.0, "range"),
    ("segments.length.0", -0.1, "range"),
    ("segments.volume.0", -1e-6, "range"),
    ("segments.radii.minimum.0", 0.0, "range"),
    ("segments.lumped.resistance.0", 0.0, "range"),
    ("segments.lumped.compliance.0", -1e-12, "range"),
    ("segments.vessel_class.0", "nerve", "choice"),
    ("segments.reference_state.0", "guessed", "choice"),
    ("stations.radius.0", 0.0, "range"),
    ("stations.radius.0", True, "type"),
    ("stations.radius", "0.001", "type"),
    ("stations.area.0", -1e-6, "range"),
    ("stations.stiffness.0", 0.0, "range"),
    ("stations.offsets.0", 0.5, "type"),
    ("stations.distance.1", "far", "type"),
    ("tube_laws.0.form", "rubber band", "choice"),
    ("tube_laws.0.m", -0.5, "range"),
    ("tube_laws.0.n", 1.0, "range"),
    ("tube_laws", {}, "type"),
    ("outlets.0.model", "cork", "choice"),
    ("outlets.0.far_pressure", None, "type"),
    ("outlets.0.compliance", -1e-12, "range"),
    ("outlets.0", 3, "type"),
    ("inlets", {}, "type"),
    ("inlets.0.node", "0", "type"),
    ("junctions.end.0", "middle", "choice"),
    ("junctions.area.0", 0.0, "range"),
    ("units.pressure", "mm[Hg]", "unit"),
    ("units.length", "mm", "unit"),
    ("provenance.inputs.0.sha256", "abc", "form"),
    ("provenance.case_sha256", "G" * 64, "form"),
    ("steady_check.pressure", None, "type"),
    ("steady_check.tolerance", -1.0, "range"),
    ("cautions", "none", "type"),
]

STRUCTURAL: list[tuple[str, Change, str]] = [
    *((f"missing {path}", drop(path), "missing") for path in MISSING),
    *((f"unknown {path}", add(path), "unknown") for path in UNKNOWN),
    *((f"{path} = {value!r}"[:60], put(path, value), word) for path, value, word in WRONG),
]


def scaled(path: str, factor: float) -> Change:
    def change(net: dict[str, Any]) -> None:
        holder, key = dig(net, path)
        holder[key] = holder[key] * factor

    return change


def same(path: str, other: str) -> Change:
    def change(net: dict[str, Any]) -> None:
        holder, key = dig(net, path)
        source, last = dig(net, other)
        holder[key] = copy.deepcopy(source[last])

    return change


def short(path: str) -> Change:
    def change(net: dict[str, Any]) -> None:
        holder, key = dig(net, path)
        holder[key] = holder[key][:-1]

    return change


MEANING: list[tuple[str, Change, str]] = [
    ("two nodes of one id", same("nodes.id.1", "nodes.id.0"), "identity"),
    ("two segments of one id", same("segments.id.1", "segments.id.0"), "identity"),
    ("a segment to a node that is not there", put("segments.to_node.0", 99), "reference"),
    ("an outlet at a node that is not there", put("outlets.0.node", 99), "reference"),
    ("a tube law that is not there", put("segments.tube_law.0", "rubber"), "reference"),
    ("a junction end of no segment", put("junctions.segment.0", 99), "reference"),
    ("offsets that fall", put("stations.offsets.1", 5000), "reference"),
    ("a column one short", short("segments.length"), "length"),
    ("stations one short", short("stations.radius"), "length"),
    ("an outlet's role lost", same("nodes.role.7", "nodes.role.1"), "incidence"),
    ("two outlets at one node", same("outlets.1.node", "outlets.0.node"), "incidence"),
    ("a junction that lists another segment", put("junctions.segment.0", 6), "incidence"),
    ("a direction of length 1/2", put("junctions.direction.0", [0.5, 0.0, 0.0]), "incidence"),
    ("a segment turned without its stations", same("segments.from_node.0", "segments.to_node.1"), "incidence"),
    ("a length in millimetres", scaled("segments.length.0", 1e3), "range"),
    ("a length 1 % off", scaled("segments.length.0", 1.01), "stations"),
    ("a distance that falls", put("stations.distance.3", 0.0), "stations"),
    ("an area that is not π r²", scaled("stations.area.5", 1.001), "stations"),
    ("a radius that is a diameter", scaled("stations.radius.5", 2.0), "stations"),
    ("a station away from its node", put("stations.position.0", [0.0, 0.0, 0.0]), "stations"),
    ("a reference area of the wrong state", scaled("stations.reference_area.7", 1.01), "wall law"),
    ("a reference pressure left out", put("stations.reference_transmural.7", 0.0), "wall law"),
    ("another viscosity", scaled("blood.viscosity", 1.1), "steady check"),
    ("another profile", put("blood.velocity_profile", 9.0), "steady check"),
    ("a resistance twice as high", scaled("segments.lumped.resistance.2", 2.0), "steady check"),
    ("a flow with the other sign", scaled("steady_check.flow.0", -1.0), "steady check"),
    ("a pressure in mmHg", scaled("steady_check.pressure.0", 1 / 133.322), "steady check"),
    ("a height of another plane", put("nodes.height.3", 0.5), "heights"),
    ("heights where no gravity is", put("conventions.gravity", [0.0, 0.0, 0.0]), "heights"),
    ("gravity of another posture", put("conventions.gravity", [0.0, 0.0, -9.80665]), "heights"),
    ("gravity twice as strong", put("conventions.gravity", [0.0, 19.6133, 0.0]), "steady check"),
    ("a volume in millilitres", scaled("segments.volume.1", 1e6), "range"),
    ("a volume 1 % off", scaled("segments.volume.1", 1.01), "stations"),
    ("a resistance radius for a volume radius", scaled("segments.radii.for_volume.1", 0.999), "stations"),
    ("a minimum that is none", scaled("segments.radii.minimum.2", 1.001), "stations"),
    ("an integral of the mean radius", scaled("segments.integrals.inverse_fourth_power.1", 0.9), "stations"),
    ("an inertance with 4/3", scaled("segments.lumped.inertance.1", 4 / 3), "steady check"),
    ("a compliance of another wall", scaled("segments.lumped.compliance.1", 1.1), "wall law"),
    ("a chord longer than its arc", put("stations.position.3.0", 0.5), "stations"),
    ("a junction area of another segment", scaled("junctions.area.0", 1.1), "stations"),
    ("an inlet that fixes nothing", put("inlets.0.pressure", None), "ends"),
    ("an inlet that fixes both", put("inlets.0.mean_flow", 1e-6), "ends"),
    ("a windkessel without compliance", put("outlets.0.compliance", None), "ends"),
    ("a windkessel without its first resistance", put("outlets.0.characteristic_resistance", None), "ends"),
    ("a fixed pressure behind a resistance", put("outlets.0.model", "fixed pressure"), "ends"),
    ("an outlet at the inlet", same("outlets.0.node", "inlets.0.node"), "incidence"),
    ("a station of surroundings that are not there", put("stations.surroundings.0", 3), "reference"),
    ("a basis of a field that is not there", put("basis.fields.3.field", "segments.colour"), "basis"),
    ("a number derived from nothing", put("basis.fields.12.detail", "somewhere"), "basis"),
    ("two bases for one number", lambda net: net["basis"]["fields"].append(net["basis"]["fields"][0]), "basis"),
    ("the radius of a repair that is not there", put("basis.station_radius.repair.0", "repair-1"), "basis"),
    ("another far pressure", scaled("outlets.0.far_pressure", 1.5), "steady check"),
    ("an outlet resistance in other units", scaled("outlets.0.peripheral_resistance", 133.322), "steady check"),
    ("a number without basis", put("basis.fields", []), "basis"),
    ("a source that is not there", put("sources", []), "basis"),
    ("no input behind what is measured", put("provenance.inputs", []), "reference"),
    ("radius runs with a gap", put("basis.station_radius.last.0", 3), "basis"),
]


def changed(valid: dict[str, Any], change: Change) -> dict[str, Any]:
    net = copy.deepcopy(valid)
    change(net)
    return net


def test_there_are_a_hundred_faults_that_both_must_refuse() -> None:
    assert len(STRUCTURAL) >= 100


def test_the_untouched_file_passes_both(valid: dict[str, Any], folder: Path, checker) -> None:
    assert validate_network(folder / "network.json").valid
    assert list(checker.iter_errors(valid)) == []


@pytest.mark.parametrize(("change", "word"), [row[1:] for row in STRUCTURAL], ids=[row[0] for row in STRUCTURAL])
def test_both_refuse(valid, folder: Path, checker, change: Change, word: str) -> None:
    net = changed(valid, change)
    assert next(checker.iter_errors(net), None) is not None, "jsonschema lets it pass"
    faults, _ = document_faults(net, folder)
    assert faults, "the validator lets it pass"
    assert word in {fault.word for fault in faults}, [str(fault) for fault in faults]
    # to a schema a negative row number is a number out of range
    of_schema = "range" if word == "reference" else word
    assert of_schema in {fault.word for fault in schema_faults(net)}, [str(fault) for fault in schema_faults(net)]
    assert all("\n" not in str(fault) for fault in faults)


@pytest.mark.parametrize(("change", "word"), [row[1:] for row in MEANING], ids=[row[0] for row in MEANING])
def test_the_validator_refuses_what_no_schema_sees(valid, folder: Path, change: Change, word: str) -> None:
    faults, _ = document_faults(changed(valid, change), folder)
    assert word in {fault.word for fault in faults}, [str(fault) for fault in faults]


@pytest.mark.parametrize(
    ("data", "word"),
    [
        (b"", "json"),
        (b"{", "json"),
        (b'{"format": NaN}', "json"),
        (b'{"a": 1, "a": 2}', "duplicate"),
        (b"\xff\xfe{}", "json"),
        (b"[]", "type"),
        (b"null", "type"),
        (b"<html></html>", "json"),
        (b'{"format": "geomprep network"}', "missing"),
        (b"[" * 100_000, "json"),
    ],
)
def test_broken_bytes_are_one_fault_each(tmp_path: Path, data: bytes, word: str) -> None:
    file = tmp_path / "network.json"
    file.write_bytes(data)
    report = validate_network(file)
    assert report.faults
    assert word in {fault.word for fault in report.faults}


@pytest.mark.parametrize("literal", ["NaN", "Infinity", "1e400", "-1e400"])
def test_numbers_that_json_has_not(valid, tmp_path: Path, literal: str) -> None:
    text = json.dumps(valid).replace(repr(valid["segments"]["length"][0]), literal, 1)
    file = tmp_path / "network.json"
    file.write_text(text, encoding="utf-8")
    assert not validate_network(file).valid


def test_a_cut_file_never_passes(folder: Path, tmp_path: Path) -> None:
    data = (folder / "network.json").read_bytes()
    for part in (0.1, 0.5, 0.9, 0.999):
        file = tmp_path / "network.json"
        file.write_bytes(data[: int(len(data) * part)])
        assert {fault.word for fault in validate_network(file).faults} == {"json"}


def test_a_missing_file_is_one_line(tmp_path: Path) -> None:
    with pytest.raises(NetworkFileError, match="cannot be read"):
        validate_network(tmp_path / "none.json")


def test_shipped_schema_is_made_from_the_table() -> None:
    shipped = (PACKAGE / "export" / "network.schema.json").read_text(encoding="utf-8")
    assert shipped == schema_text(), "write schema_text() to geomprep/export/network.schema.json"
