"""Stations take their areas from a lumen surface or a mask, and resistances the outlines' friction shapes."""

from __future__ import annotations

import gzip
import itertools
import json
import shutil
import struct
import tempfile
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from phantoms.skins import Mesh, ellipse, joined, straight, swept
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray
from vtkmodules.vtkCommonCore import vtkPoints
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkImageData, vtkPolyData
from vtkmodules.vtkIOXML import vtkXMLImageDataWriter, vtkXMLPolyDataWriter

from geomprep.case.build import BuildResult, build
from geomprep.case.file import read_case
from geomprep.case.image_areas import with_image_areas
from geomprep.errors import InputError
from geomprep.export import validate_network
from geomprep.files import write_lines
from geomprep.findings import Finding
from geomprep.model import Basis, Network, Nodes, Segments, Stations

SAMPLE = Path(__file__).parent.parent.parent / "sample_geometries" / "limb"
LONG, SHORT, LENGTH = 4.0, 2.0, 60.0  # semi-axes and length of the ellipse, mm
VISCOSITY = 3.5e-3

CASE = """
[case]
name = "one-vein"
[[input]]
file = "line.vtp"
vessels = "veins"
length_unit = "mm"
size_array = "radius"
size_means = "inscribed radius"
{more}
[imaging_state]
venous_pressure = "5 mmHg"
[walls.vein]
wave_speed = "4 m/s"
[blood]
density = "1060 kg/m^3"
viscosity = "3.5 mPa*s"
velocity_profile = 2
[surroundings.rest]
pressure = "0 mmHg"
[[inlets]]
at = "0 0 0"
mean_flow = "200 mL/min"
[[outlets]]
at = "0 0 60"
model = "fixed pressure"
pressure = "5 mmHg"
"""


def surface_file(path: Path, mesh: Mesh) -> None:
    """A mesh as a file."""
    points, cells, data = vtkPoints(), vtkCellArray(), vtkPolyData()
    points.SetData(numpy_to_vtk(np.ascontiguousarray(mesh[0]), deep=True))
    offsets = np.arange(len(mesh[1]) + 1) * 3
    cells.SetData(*(numpy_to_vtkIdTypeArray(each.astype(np.int64), deep=True) for each in (offsets, mesh[1].ravel())))
    data.SetPoints(points)
    data.SetPolys(cells)
    writer = vtkXMLPolyDataWriter()
    writer.SetFileName(str(path))
    writer.SetInputData(data)
    writer.Write()


def mask_file(path: Path, inside: np.ndarray, origin: np.ndarray, spacing: float) -> None:
    """A mask as an image of VTK, or as a NIfTI-1 file in mm (layout from memory, as in the tests of its reader)."""
    if path.suffix != ".vti":
        head = bytearray(352)
        struct.pack_into("<i", head, 0, 348)
        struct.pack_into("<8h", head, 40, 3, *inside.shape, 1, 1, 1, 1)
        struct.pack_into("<hh", head, 70, 2, 8)  # unsigned bytes
        struct.pack_into("<5f", head, 76, 1.0, *[spacing] * 3, 0.0)
        struct.pack_into("<f", head, 108, 352.0)
        head[123] = 2  # millimetres
        struct.pack_into("<h", head, 254, 1)
        struct.pack_into("<12f", head, 280, *np.column_stack((spacing * np.eye(3), origin)).ravel())
        head[344:348] = b"n+1\0"
        data = bytes(head) + inside.astype(np.uint8).tobytes(order="F")
        path.write_bytes(gzip.compress(data) if path.suffix == ".gz" else data)
        return
    image = vtkImageData()
    image.SetDimensions(*inside.shape)
    image.SetSpacing(*[spacing] * 3)
    image.SetOrigin(*origin)
    image.GetPointData().SetScalars(numpy_to_vtk(inside.astype(np.uint8).ravel(order="F"), deep=True))
    writer = vtkXMLImageDataWriter()
    writer.SetFileName(str(path))
    writer.SetInputData(image)
    writer.Write()


def elliptic_mask(spacing: float, low: float = -10.0, high: float = LENGTH + 10.0) -> tuple[np.ndarray, np.ndarray]:
    """Voxels whose centres lie in the ellipse, and the centre of the first one."""
    origin = np.array([-LONG - 1.03, -SHORT - 1.07, low])
    sides = [np.arange(first, last, spacing) for first, last in zip(origin, (LONG + 1, SHORT + 1, high), strict=True)]
    x, y, _ = np.meshgrid(*sides, indexing="ij")
    return (x / LONG) ** 2 + (y / SHORT) ** 2 < 1, origin


def one_vein(folder: Path, more: str = "", spacing: float = 1.0) -> Path:
    """A case of a straight line along z with the radius of the ellipse's inscribed circle."""
    z = np.arange(0, LENGTH + spacing / 2, spacing)
    points = np.stack((0 * z, 0 * z, z), axis=1)
    write_lines(folder / "line.vtp", points, np.arange(len(z)), [0, len(z)], {"radius": np.full(len(z), SHORT)})
    (folder / "case.toml").write_text(CASE.format(more=more), encoding="utf-8")
    return folder / "case.toml"


def found(result: BuildResult, kind: str) -> Finding:
    """The one finding of a kind."""
    (only,) = [finding for finding in result.findings if finding.kind == kind]
    return only


def of_ellipse(long: float = LONG, short: float = SHORT) -> float:
    """Resistance 4μl(a² + b²)/(πa³b³) of an elliptic pipe (derived in laws/shapes.py), SI."""
    a, b = long * 1e-3, short * 1e-3
    return 4 * VISCOSITY * LENGTH * 1e-3 * (a**2 + b**2) / (np.pi * a**3 * b**3)


def test_an_elliptic_surface_gives_the_resistance_of_an_ellipse(tmp_path: Path) -> None:
    """A polygon of n corners on the ellipse has the area ab·n/2·sin(2π/n): for 96, 0.07 % below πab."""
    case = one_vein(tmp_path, 'lumen_surface = "skin.vtp"')
    points, triangles = straight(ellipse(96, LONG, SHORT), 60, LENGTH + 20)
    surface_file(tmp_path / "skin.vtp", (points - [0, 0, 10], triangles))
    result = build(case, output=tmp_path / "results")
    network = result.network
    area = LONG * SHORT * 96 / 2 * np.sin(2 * np.pi / 96) * 1e-6
    np.testing.assert_allclose(network.stations.area, area, rtol=1e-9)
    assert (network.stations.basis == Basis.MEASURED).all()
    # (k + 1/k)/2 with k = 2, hardly changed by the corners
    np.testing.assert_allclose(network.segments.friction_shape, 1.25, rtol=1e-4)
    np.testing.assert_allclose(network.lumped.resistance, of_ellipse(), rtol=2e-3)
    drop = result.state.pressure[network.segments.from_node] - result.state.pressure[network.segments.to_node]
    np.testing.assert_allclose(drop, of_ellipse() * 200e-6 / 60, rtol=2e-3)
    assert found(result, "areas from lumen surface").message.endswith(
        "61 of 61 stations take their area from the lumen surface"
    )
    # equal-area radius √(ab) = √8 over the inscribed 2
    assert found(result, "radii of lumen surface and lines").value == pytest.approx(np.sqrt(2), rel=1e-3)
    report = validate_network(tmp_path / "results" / "network.json")
    assert not report.faults


def test_the_validator_holds_the_friction_shape_against_the_resistance(tmp_path: Path) -> None:
    case = one_vein(tmp_path, 'lumen_surface = "skin.vtp"')
    points, triangles = straight(ellipse(24, LONG, SHORT), 20, LENGTH + 20)
    surface_file(tmp_path / "skin.vtp", (points - [0, 0, 10], triangles))
    build(case, output=tmp_path / "results")
    file = tmp_path / "results" / "network.json"
    document = json.loads(file.read_text(encoding="utf-8"))
    bases = [row for row in document["basis"]["fields"] if row["field"] == "segments.friction_shape"]
    assert [row["basis"] for row in bases] == ["measured"]
    document["segments"]["friction_shape"] = [1.0]
    file.write_text(json.dumps(document), encoding="utf-8")
    assert [fault.place for fault in validate_network(file).faults] == ["segments.lumped.resistance[0]"]


def test_each_input_has_its_own_surface(tmp_path: Path) -> None:
    """Two veins 50 mm apart in two files inside two skins; only the second input states them."""
    case = one_vein(tmp_path)
    z = np.arange(0, 61.0)
    write_lines(
        tmp_path / "second.vtp", np.stack((0 * z + 50, 0 * z, z), axis=1), np.arange(61), [0, 61],
        {"radius": np.full(61, SHORT)},
    )  # fmt: skip
    text = case.read_text(encoding="utf-8")
    first = text[text.index("[[input]]") : text.index("[imaging_state]")]
    second = first.replace("line.vtp", "second.vtp") + 'lumen_surface = "skins.vtp"\n'
    ends = text[text.index("[[inlets]]") :]
    case.write_text(text.replace(first, first + second) + ends.replace('"0 0', '"50 0'), encoding="utf-8")
    points, triangles = straight(ellipse(24, LONG, SHORT), 20, LENGTH + 20)
    both = joined((points - [0, 0, 10], triangles), (points - [-50, 0, 10], triangles))
    surface_file(tmp_path / "skins.vtp", both)
    result = build(case, dry_run=True)
    of_second = result.network.segments.input_id == 1
    assert of_second.sum() == 1
    shape = result.network.segments.friction_shape
    assert shape[~of_second].tolist() == [1.0]
    assert shape[of_second] == pytest.approx([1.25], rel=2e-3)
    ratio = result.network.lumped.resistance[of_second] / result.network.lumped.resistance[~of_second]
    # 24 corners: area 12·sin(15°)/π = 0.9886 of the ellipse's; 1.25/(2·0.9886)² of the circle with r = 2
    assert ratio == pytest.approx([1.25 / (2 * 12 * np.sin(np.pi / 12) / np.pi) ** 2], rel=2e-3)


def test_marked_stations_keep_their_radius(tmp_path: Path) -> None:
    """A skin from −0.5 to 40.5 mm: stations at 0 to 40 mm lie inside, the 20 from 41 to 60 mm outside."""
    case = one_vein(tmp_path, 'lumen_surface = "skin.vtp"')
    points, triangles = straight(ellipse(48, LONG, SHORT), 83, 41.0)
    surface_file(tmp_path / "skin.vtp", (points - [0, 0, 0.5], triangles))
    result = build(case, dry_run=True)
    radius = result.network.stations.radius
    assert np.count_nonzero(radius != SHORT * 1e-3) == 41
    assert (radius[41:] == SHORT * 1e-3).all()
    said = found(result, "areas from lumen surface")
    assert said.message.endswith("41 of 61 stations take their area from the lumen surface; 20 keep the radius they "
                                 "have (20 outside the surface)")  # fmt: skip
    # ∫ds/r⁴: the narrow rest, 20 mm of r = 2, has 20/16; 40 mm of r⁴ = 64 have 40/64: a third is known, too little
    assert result.network.segments.friction_shape.tolist() == [1.0]
    assert "0 of 1 segments" in found(result, "friction shapes").message


@pytest.mark.parametrize("name", ["mask.vti", "mask.nii", "mask.nii.gz"])
def test_a_mask_gives_the_areas(tmp_path: Path, name: str) -> None:
    """Twelve voxels across; the count of centres in the ellipse is the area of every layer."""
    inside, origin = elliptic_mask(1 / 3)
    case = one_vein(tmp_path, f'mask = "{name}"\nframe = "RAS"')
    mask_file(tmp_path / name, inside, origin, 1 / 3)
    result = build(case, dry_run=True)
    layer = inside[:, :, 0].sum() / 9 * 1e-6
    assert layer == pytest.approx(np.pi * LONG * SHORT * 1e-6, rel=0.02)
    np.testing.assert_allclose(result.network.stations.area, layer, rtol=1e-6)
    # a mask says nothing of outlines: the circle of equal area, R = 8πμl/A²
    circle = 8 * np.pi * VISCOSITY * LENGTH * 1e-3 / layer**2
    np.testing.assert_allclose(result.network.lumped.resistance, circle, rtol=1e-6)
    assert "61 of 61 stations" in found(result, "areas from mask").message
    assert not [finding for finding in result.findings if finding.kind == "friction shapes"]


def test_a_mask_in_another_frame_is_turned(tmp_path: Path) -> None:
    """NIfTI lies in RAS; in LPS x and y change their sign, so a mask off the axis must be mirrored in both."""
    inside, origin = elliptic_mask(0.5)
    case = one_vein(tmp_path, 'mask = "mask.nii"\nframe = "LPS"')
    points = np.array([[2.0, -1, 0], [2, -1, 30], [2, -1, 60]])
    write_lines(tmp_path / "line.vtp", points, [0, 1, 2], [0, 3], {"radius": np.full(3, SHORT)})
    text = case.read_text().replace('"0 0 0"', '"2 -1 0"').replace('"0 0 60"', '"2 -1 60"')
    case.write_text(text)
    mask_file(tmp_path / "mask.nii", inside, origin + np.array([-2, 1, 0]), 0.5)
    result = build(case, dry_run=True)
    np.testing.assert_allclose(result.network.stations.area, inside[:, :, 0].sum() / 4 * 1e-6, rtol=1e-6)


def test_a_mask_that_ends_early_leaves_its_last_stations_alone(tmp_path: Path) -> None:
    """Voxel layers from −10 mm to the centre 39.875 mm, so the box ends at 40 mm; radius 2 mm.

    Stations from 41 mm on have no voxels; those from 39 to 40 mm lie within 2 mm of the border of the box,
    the one at 38 mm lies on that limit, where rounding decides.
    """
    inside, origin = elliptic_mask(0.25, high=40.0)
    case = one_vein(tmp_path, 'mask = "mask.vti"')
    mask_file(tmp_path / "mask.vti", inside, origin, 0.25)
    result = build(case, dry_run=True)
    radius = result.network.stations.radius
    assert (radius[39:] == SHORT * 1e-3).all()
    np.testing.assert_allclose(np.pi * radius[:38] ** 2, inside[:, :, 0].sum() / 16 * 1e-6, rtol=1e-6)
    assert "20 without voxels" in found(result, "areas from mask").message


def test_the_mask_fills_in_where_the_surface_is_marked(tmp_path: Path) -> None:
    inside, origin = elliptic_mask(0.25)
    case = one_vein(tmp_path, 'lumen_surface = "skin.vtp"\nmask = "mask.vti"')
    points, triangles = straight(ellipse(48, LONG, SHORT), 83, 41.0)
    surface_file(tmp_path / "skin.vtp", (points - [0, 0, 0.5], triangles))
    mask_file(tmp_path / "mask.vti", inside, origin, 0.25)
    result = build(case, dry_run=True)
    assert "20 of 20 stations take their area from the mask" in found(result, "areas from mask").message
    polygon = LONG * SHORT * 24 * np.sin(2 * np.pi / 48) * 1e-6
    np.testing.assert_allclose(result.network.stations.area[:41], polygon, rtol=1e-9)
    np.testing.assert_allclose(result.network.stations.area[41:], inside[:, :, 0].sum() / 16 * 1e-6, rtol=1e-6)
    # all radii are about equal now, so two thirds of ∫ds/r⁴ have an outline
    np.testing.assert_allclose(result.network.segments.friction_shape, 1.25, rtol=1e-3)


def chain(cuts: list[float]) -> Network:
    """Segments along z that meet at some of the whole millimetres, stations 1 mm apart, radius 2 mm."""
    parts = [np.arange(low, high + 0.5) for low, high in itertools.pairwise(cuts)]
    z, count = np.concatenate(parts) * 1e-3, len(parts)
    flat = np.zeros_like(z)
    ends = np.array(cuts) * 1e-3
    nodes = np.stack((0 * ends, 0 * ends, ends), axis=1)
    number, none, same = np.arange(count), np.full(count, -1), np.zeros(count)
    return Network(
        nodes=Nodes([f"n{i}" for i in range(count + 1)], nodes, 0 * ends, 0 * ends, np.arange(count + 1)),
        segments=Segments(
            [f"s{i}" for i in number], [""] * count, number, number + 1, same, same, none, none, none
        ),
        stations=Stations(
            np.cumsum([0, *map(len, parts)]),
            np.concatenate([part - part[0] for part in parts]) * 1e-3,
            np.stack((flat, flat, z), axis=1),
            np.full(len(z), SHORT * 1e-3),
            flat,
        ),
    )  # fmt: skip


@settings(max_examples=20, deadline=None, derandomize=True)
@given(cuts=st.lists(st.integers(1, 59), max_size=4, unique=True))
def test_lines_that_meet_share_the_voxels_between_them(cuts: list[int]) -> None:
    """Where a vessel is cut into segments, two ends lie in one place; each still gets the area of every layer."""
    with tempfile.TemporaryDirectory() as folder:
        inside, origin = elliptic_mask(0.5)
        path = one_vein(Path(folder), 'mask = "mask.vti"')
        mask_file(Path(folder) / "mask.vti", inside, origin, 0.5)
        network, findings = with_image_areas(read_case(path), chain([0, *sorted(cuts), 60]))
    assert len(findings) == 2  # sixteen voxels by eight: none is too coarse
    assert f"{61 + len(cuts)} of {61 + len(cuts)} stations" in findings[0].message
    np.testing.assert_allclose(network.stations.area, inside[:, :, 0].sum() / 4 * 1e-6, rtol=1e-6)


def test_stations_nearer_than_half_a_voxel_to_another_line_are_left_alone(tmp_path: Path) -> None:
    """Layers of 2 mm, half of that 1 mm: at each cut the end (0 to 0.5 mm) and its neighbour (from 0.5 mm), twice."""
    inside, origin = elliptic_mask(2.0)
    mask_file(tmp_path / "mask.vti", inside, origin, 2.0)
    path = one_vein(tmp_path, 'mask = "mask.vti"')
    network, findings = with_image_areas(read_case(path), chain([0, 20, 40, 60]))
    assert [finding.kind for finding in findings] == ["mask too coarse", "areas from mask", "radii of mask and lines"]
    assert "8 within half a voxel of other lines" in findings[1].message
    kept = np.flatnonzero(network.stations.radius == SHORT * 1e-3).tolist()
    assert kept == [19, 20, 21, 22, 40, 41, 42, 43]  # 19 and 20 mm, 20 and 21 mm, …
    np.testing.assert_allclose(np.delete(network.stations.area, kept), inside[:, :, 0].sum() * 4e-6, rtol=1e-6)


def test_a_mask_brings_its_own_unit(tmp_path: Path) -> None:
    """Lines in cm, a NIfTI file in mm."""
    inside, origin = elliptic_mask(0.5)
    case = one_vein(tmp_path, 'mask = "mask.nii"\nframe = "RAS"')
    z = np.arange(0, 6.05, 0.1)
    points = np.stack((0 * z, 0 * z, z), axis=1)
    write_lines(tmp_path / "line.vtp", points, np.arange(61), [0, 61], {"radius": np.full(61, SHORT / 10)})
    case.write_text(case.read_text().replace('length_unit = "mm"', 'length_unit = "cm"').replace("0 0 60", "0 0 6"))
    mask_file(tmp_path / "mask.nii", inside, origin, 0.5)
    result = build(case, dry_run=True)
    np.testing.assert_allclose(result.network.stations.area, inside[:, :, 0].sum() / 4 * 1e-6, rtol=1e-6)


def test_one_vessel_of_a_sample_gets_an_elliptic_skin(tmp_path: Path) -> None:
    """Axes √2 r and r/√2 keep the area of the circle: the stations stay, the resistance grows by (2 + 1/2)/2 = 1.25."""
    shutil.copytree(SAMPLE, tmp_path / "limb", ignore=shutil.ignore_patterns("results"))
    case = tmp_path / "limb" / "case.toml"
    before = build(case, dry_run=True).network
    vessel = before.segments.name.tolist().index("left brachial artery")
    rows = slice(*before.stations.offsets[vessel : vessel + 2])
    axis, radius = before.stations.position[rows] * 100, before.stations.radius[rows] * 100  # the file is in cm
    tangent = np.gradient(axis, axis=0)
    across = np.cross(tangent, [0.0, 1, 0.3])
    up = np.cross(tangent, across)
    across, up = (each / np.linalg.norm(each, axis=1, keepdims=True) for each in (across, up))
    outline = ellipse(64, np.sqrt(2), np.sqrt(0.5))
    surface_file(tmp_path / "limb" / "skin.vtp", swept(axis, across, up, radius[:, None, None] * outline))
    stated = 'file = "arteries.vtk"\n'
    text = case.read_text(encoding="utf-8")
    case.write_text(text.replace(stated, stated + 'lumen_surface = "skin.vtp"\n'), encoding="utf-8")
    after = build(case, dry_run=True).network
    ratio = after.lumped.resistance / before.lumped.resistance
    assert ratio[vessel] == pytest.approx(1.25, rel=0.01)
    others = np.arange(len(ratio)) != vessel
    assert (after.segments.friction_shape[others] == 1).all()
    np.testing.assert_allclose(ratio[others], 1, rtol=0.01)


def refused(case: Path, match: str) -> None:
    """A build that ends with one line."""
    with pytest.raises(InputError, match=match) as caught:
        build(case, dry_run=True)
    assert "\n" not in str(caught.value)


def test_files_that_cannot_be_used_give_one_line(tmp_path: Path) -> None:
    inside, origin = elliptic_mask(0.5)
    refused(one_vein(tmp_path, 'mask = "mask.nii"'), r"input\[0\].mask.*no such file")
    mask_file(tmp_path / "mask.nii", inside, origin, 0.5)
    refused(one_vein(tmp_path, 'mask = "mask.nii"'), "lie in the frame RAS.*state input\\[0\\].frame")
    mask_file(tmp_path / "mask.nii", inside, origin + np.array([300, 0, 0]), 0.5)
    refused(
        one_vein(tmp_path, 'mask = "mask.nii"\nframe = "RAS"'), "no station of 'line.vtp' lies in it; check its unit"
    )
    refused(one_vein(tmp_path, 'lumen_surface = "line.vtp"'), "no triangles or polygons")
    (tmp_path / "skin.stl").write_bytes(b"solid")
    refused(one_vein(tmp_path, 'lumen_surface = "skin.stl"'), "skin.stl")
    surface_file(tmp_path / "skin.vtp", straight(ellipse(12, 0.004, 0.002), 5, 0.06))  # in metres
    refused(
        one_vein(tmp_path, 'lumen_surface = "skin.vtp"'),
        "no station of 'line.vtp' lies in it; it must be in the unit and frame",
    )


def test_without_surface_and_mask_nothing_changes(tmp_path: Path) -> None:
    network = build(one_vein(tmp_path), dry_run=True).network
    assert (network.stations.radius == SHORT * 1e-3).all()
    assert network.segments.friction_shape.tolist() == [1.0]
    circle = 8 * VISCOSITY * LENGTH * 1e-3 / (np.pi * (SHORT * 1e-3) ** 4)
    np.testing.assert_allclose(network.lumped.resistance, circle, rtol=1e-9)
