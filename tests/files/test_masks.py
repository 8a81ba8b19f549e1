"""Masks come back with every voxel at its place; damaged ones give one line.

NIfTI files are packed here byte by byte after the published header layouts (from memory), and the place
of a voxel is worked out from their matrices and quaternions, not by the reader.
"""

import gzip
import struct
from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation
from vtkmodules.util.numpy_support import numpy_to_vtk
from vtkmodules.vtkCommonDataModel import vtkImageData
from vtkmodules.vtkIOXML import vtkXMLImageDataWriter

from geomprep.errors import FileError
from geomprep.files import read_mask
from geomprep.measure import VoxelGrid, mask_areas

BOX = (np.random.default_rng(4).random((5, 4, 3)) < 0.4).astype(np.uint8)
PLACE = np.array([[2.0, 0, 0, -10], [0, 1, 0, 20], [0, 0, 3, 5]])
CODES = {"u1": 2, "i2": 4, "i4": 8, "f4": 16, "f8": 64, "i1": 256, "u2": 512, "u4": 768, "i8": 1024, "u8": 1280}


def nifti(
    values: np.ndarray, sform=None, qform=None, spacing=(1.0, 1.0, 1.0), order="<", slope=0.0, **changes
) -> bytes:
    """A NIfTI-1 file; `qform` is quaternion b, c, d, offsets x, y, z and the sense of the third axis."""
    values = values.astype(np.dtype(values.dtype).newbyteorder(order))
    head = bytearray(352)

    def put(place: int, kind: str, *numbers: float) -> None:
        struct.pack_into(f"{order}{len(numbers)}{kind}", head, place, *numbers)

    put(0, "i", 348)
    put(40, "h", *changes.get("dims", (3, *values.shape, 1, 1, 1, 1)))
    put(70, "h", changes.get("code", CODES[values.dtype.str[1:]]), 8 * values.dtype.itemsize)
    put(76, "f", 1.0 if qform is None else qform[6], *spacing)
    put(108, "f", changes.get("first", 352.0), slope, 0.0)
    head[123] = 2  # millimetres
    if qform is not None:
        put(252, "h", 1)
        put(256, "f", *qform[:6])
    if sform is not None:
        put(254, "h", 1)
        put(280, "f", *np.ravel(sform))
    head[344:348] = changes.get("mark", b"n+1\0")
    return bytes(head) + values.tobytes(order="F")


def nifti2(values: np.ndarray, sform: np.ndarray, spacing: tuple[float, float, float]) -> bytes:
    """A NIfTI-2 file."""
    head = bytearray(544)
    struct.pack_into("<i8sh", head, 0, 540, b"n+2\0\r\n\x1a\n", CODES[values.dtype.str[1:]])
    struct.pack_into("<h8q", head, 14, 8 * values.dtype.itemsize, 3, *values.shape, 1, 1, 1, 1)
    struct.pack_into("<8d", head, 104, 1.0, *spacing, 0, 0, 0, 0)
    struct.pack_into("<q", head, 168, 544)
    struct.pack_into("<ii", head, 344, 0, 1)
    struct.pack_into("<12d", head, 400, *np.ravel(sform))
    struct.pack_into("<i", head, 500, 2)
    return bytes(head) + values.tobytes(order="F")


def places(mask) -> np.ndarray:
    """Centres of the voxels inside, in order."""
    found = VoxelGrid(mask.origin, mask.spacing, mask.directions).centres(np.argwhere(mask.inside))
    return found[np.lexsort(found.round(3).T)]


def expected(values: np.ndarray, matrix: np.ndarray) -> np.ndarray:
    found = np.argwhere(values) @ matrix[:3, :3].T + matrix[:3, 3]
    return found[np.lexsort(found.round(3).T)]


def put(folder: Path, name: str, data: bytes) -> Path:
    path = folder / name
    path.write_bytes(data)
    return path


@pytest.mark.parametrize(
    "columns",
    [(0, 1, 2), (2, 0, 1), (1, 0, 2)],
    ids=["straight", "turned", "left-handed"],
)
def test_voxels_lie_where_the_matrix_puts_them(tmp_path: Path, columns: tuple[int, int, int]) -> None:
    """Columns exchanged; an odd exchange makes the axes left-handed, and the reader turns the slices about."""
    spacing = (2.0, 1.0, 3.0)
    turn = Rotation.from_euler("xyz", [20, -35, 50], degrees=True).as_matrix()[:, columns]
    matrix = np.column_stack((turn * spacing, [-10, 20, 5]))
    found = read_mask(put(tmp_path, "mask.nii", nifti(BOX, matrix, spacing=spacing)))
    np.testing.assert_allclose(places(found), expected(BOX, matrix), atol=1e-4)
    assert (found.format, found.length_unit, found.frame) == ("NIfTI-1", "mm", "RAS")
    assert found.labels.tolist() == [1]
    assert not found.findings


@pytest.mark.parametrize("sense", [1.0, -1.0])
def test_quaternions(tmp_path: Path, sense: float) -> None:
    rotation = Rotation.from_euler("xyz", [10, 40, -70], degrees=True)
    x, y, z, w = rotation.as_quat()
    b, c, d = np.sign(w) * np.array([x, y, z])  # a ≥ 0 is not stored
    spacing = np.array([2.0, 1.0, 3.0])
    matrix = np.column_stack((rotation.as_matrix() * spacing * [1, 1, sense], [-10, 20, 5]))
    data = nifti(BOX, qform=(b, c, d, -10, 20, 5, sense), spacing=spacing)
    found = read_mask(put(tmp_path, "mask.nii", data))
    np.testing.assert_allclose(places(found), expected(BOX, matrix), atol=1e-4)


@pytest.mark.parametrize(("kind", "order"), [*((kind, "<") for kind in CODES), ("i2", ">"), ("f8", ">")])
def test_types_and_byte_orders(tmp_path: Path, kind: str, order: str) -> None:
    data = gzip.compress(nifti(BOX.astype(kind), PLACE, spacing=(2, 1, 3), order=order))
    found = read_mask(put(tmp_path, "mask.nii.gz", data))
    np.testing.assert_allclose(places(found), expected(BOX, PLACE), atol=1e-5)


def test_second_version(tmp_path: Path) -> None:
    found = read_mask(put(tmp_path, "mask.nii", nifti2(BOX, PLACE, (2.0, 1.0, 3.0))))
    np.testing.assert_allclose(places(found), expected(BOX, PLACE), atol=1e-5)
    assert (found.format, found.length_unit) == ("NIfTI-2", "mm")


def test_labels_and_scale(tmp_path: Path) -> None:
    """Labels 0, 1, 2 stored at half their value."""
    values = (np.arange(60) % 3).reshape(5, 4, 3).astype(np.float32)
    found = read_mask(put(tmp_path, "mask.nii", nifti(values / 2, PLACE, spacing=(2, 1, 3), slope=2.0)))
    assert found.labels.tolist() == [1, 2]
    assert found.inside.sum() == 40
    assert [finding.message for finding in found.findings] == ["2 labels (1, 2) all count as lumen"]


def test_two_places_that_differ_are_said(tmp_path: Path) -> None:
    """The quaternion says the axes of the body, the matrix the same, 4 mm farther along x."""
    data = nifti(BOX, PLACE, qform=(0, 0, 0, -14, 20, 5, 1.0), spacing=(2, 1, 3))
    found = read_mask(put(tmp_path, "mask.nii", data))
    np.testing.assert_allclose(places(found), expected(BOX, PLACE), atol=1e-5)
    assert "up to 4 apart; the sform is taken" in found.findings[0].message
    data = nifti(BOX, PLACE, qform=(0, 0, 0, -10, 20, 5, 1.0), spacing=(2, 1, 3))
    assert not read_mask(put(tmp_path, "same.nii", data)).findings


def image(folder: Path, name: str, on_cells: bool = False, first: int = 0, text: bool = False, **arrays) -> Path:
    data, writer = vtkImageData(), vtkXMLImageDataWriter()
    sides = next(iter(arrays.values())).shape
    last = [side - (0 if on_cells else 1) for side in sides]
    data.SetExtent(first, first + last[0], 0, last[1], 0, last[2])
    data.SetOrigin(-10, 20, 5)
    data.SetSpacing(2, 1, 3)
    data.SetDirectionMatrix(0, -1, 0, 1, 0, 0, 0, 0, 1)
    for key, values in arrays.items():
        array = numpy_to_vtk(np.ravel(values, order="F"), deep=True)
        array.SetName(key)
        (data.GetCellData() if on_cells else data.GetPointData()).AddArray(array)
    writer.SetFileName(str(folder / name))
    writer.SetInputData(data)
    writer.SetDataModeToAscii() if text else writer.EncodeAppendedDataOff()
    writer.Write()
    return folder / name


TURNED = np.array([[0, -1, 0, -10], [2, 0, 0, 20], [0, 0, 3, 5.0]])


@pytest.mark.parametrize("text", [False, True])
def test_vtk_images(tmp_path: Path, text: bool) -> None:
    found = read_mask(image(tmp_path, "mask.vti", text=text, lumen=BOX))
    np.testing.assert_allclose(places(found), expected(BOX, TURNED))
    assert (found.length_unit, found.frame) == ("", "")


def test_values_on_cells_lie_between_the_points(tmp_path: Path) -> None:
    """Half a spacing along every axis; the first point is number 7 along the first axis."""
    found = read_mask(image(tmp_path, "mask.vti", on_cells=True, first=7, lumen=BOX))
    shifted = TURNED.copy()
    shifted[:, 3] += TURNED[:, :3] @ [7.5, 0.5, 0.5]
    np.testing.assert_allclose(places(found), expected(BOX, shifted))


def test_one_of_several_arrays_is_named(tmp_path: Path) -> None:
    path = image(tmp_path, "mask.vti", lumen=BOX, wall=1 - BOX)
    assert read_mask(path, "wall").inside.sum() == BOX.size - BOX.sum()
    refused(path, "has 2 arrays of one value per voxel; name one of these: 'lumen', 'wall'")


def test_areas_of_a_mask_that_was_read(tmp_path: Path) -> None:
    """Every voxel of 2 by 1 by 3 mm: 5·2 mm by 4 mm across the third axis."""
    found = read_mask(
        put(tmp_path, "mask.nii.gz", gzip.compress(nifti(np.ones((5, 4, 9), np.uint8), PLACE, spacing=(2, 1, 3))))
    )
    grid = VoxelGrid(1e-3 * found.origin, 1e-3 * found.spacing, found.directions)
    stations = 1e-3 * np.array([[-6, 21.5, z] for z in (8, 13, 18, 23)])
    np.testing.assert_allclose(mask_areas(found.inside, grid, stations, np.array([0, 4])).area, 40e-6, rtol=1e-6)


def refused(path: Path, match: str) -> None:
    with pytest.raises(FileError, match=match) as caught:
        read_mask(path)
    assert "\n" not in str(caught.value)
    assert str(caught.value).startswith(str(path))


def test_what_is_no_mask_is_refused(tmp_path: Path) -> None:
    odd = np.where(BOX, 0.37, 0).astype(np.float32)
    skew = PLACE.copy()
    skew[0, 1] = 0.5
    cases = {
        "threshold": (nifti(odd, PLACE), "holds the value 0.37; .* threshold it"),
        "nan": (nifti(odd * np.float32(np.nan), PLACE), "holds the value nan"),
        "zero": (nifti(0 * BOX, PLACE), "no voxel other than 0"),
        "nowhere": (nifti(BOX), "states no place"),
        "skew": (nifti(BOX, skew), "are skew"),
        "times": (nifti(BOX, PLACE, dims=(4, 5, 4, 1, 3, 1, 1, 1)), "holds 3 images"),
        "pair": (nifti(BOX, PLACE, mark=b"ni1\0"), "pair of files"),
        "colour": (nifti(BOX, PLACE, code=128), "NIfTI type 128"),
    }
    for name, (data, match) in cases.items():
        refused(put(tmp_path, f"{name}.nii", data), match)
    refused(tmp_path / "mask.mha", "suffix '.mha' is not read here; one of .vti, .nii, .nii.gz")
    refused(tmp_path, "has no suffix|folder")


def test_damaged_masks_are_refused(tmp_path: Path) -> None:
    whole = nifti(BOX, PLACE)
    packed = gzip.compress(whole)
    bomb = gzip.compress(whole + bytes(4 << 20))
    cases = {
        "short.nii": (whole[:-1], "ends? at byte 412, but has 411 bytes"),
        "head.nii": (whole[:300], "no whole header"),
        "junk.nii": (bytes(range(256)) * 4, "no whole header"),
        "huge.nii": (nifti(BOX, PLACE, dims=(3, 30000, 30000, 30000, 1, 1, 1, 1)), "30000 x 30000 x 30000 voxels"),
        "none.nii": (nifti(BOX, PLACE, dims=(3, 5, -4, 3, 1, 1, 1, 1)), "none of an image"),
        "offset.nii": (nifti(BOX, PLACE, first=np.nan), "offset nan"),
        "short.nii.gz": (packed[:-20], "cut short|unpacked"),
        "sum.nii.gz": (packed[:-6] + bytes([packed[-6] ^ 1]) + packed[-5:], "cannot be unpacked"),
        "short2.nii.gz": (gzip.compress(whole[:-1]), "cut short"),
        "bomb.nii.gz": (bomb, "unpacks to more than"),
    }
    for name, (data, match) in cases.items():
        refused(put(tmp_path, name, data), match)


def test_damaged_vtk_images_are_refused(tmp_path: Path) -> None:
    raw = image(tmp_path, "raw.vti", lumen=BOX).read_bytes()
    text = image(tmp_path, "text.vti", text=True, lumen=BOX).read_bytes()
    extent = b'Extent="0 4 0 3 0 2"'
    assert raw.count(extent) == 2
    cases = {
        "short": (raw[: len(raw) * 2 // 3], "anew"),
        "shorter": (text[: len(text) // 2], "anew"),
        "larger": (raw.replace(extent, b'Extent="0 9 0 3 0 2"'), "120 values"),
        "part": (raw.replace(b"Piece " + extent, b'Piece Extent="0 2 0 3 0 2"'), "one piece"),
        "words": (raw.replace(extent, b'Extent="0 4 0 3 0 x"'), "six whole numbers"),
        "empty": (raw.replace(extent, b'Extent="0 4 0 3 2 0"'), "no voxel or too many"),
        "flat": (raw.replace(b'Spacing="2 1 3"', b'Spacing="2 0 3"'), "above zero"),
        "other": (raw.replace(b"ImageData", b"PolyData"), "holds 'PolyData', not ImageData"),
        "entity": (b'<!DOCTYPE a [<!ENTITY b "c">]>' + text.split(b"\n", 1)[1], "document type"),
    }
    for name, (data, match) in cases.items():
        refused(put(tmp_path, f"{name}.vti", data), match)
