"""Broken files of every class met in practice: one line each, with the word that says what is wrong."""

import runpy
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from geomprep.errors import FileError
from geomprep.files import read_file

SCRIPT = runpy.run_path(str(Path(__file__).parent.parent / "benchmarks" / "mutated_files.py"))
BASES = {base.name: base.data for base in SCRIPT["bases"]()}
RAW, TEXT, ZLIB, BASE64 = (BASES[name] for name in ("raw.vtp", "ascii.vtp", "zlib.vtp", "base64.vtp"))
OLD_BINARY, OLD_TEXT = BASES["binary.vtk"], BASES["ascii.vtk"]
N = 60


def swap(data: bytes, old: bytes, new: bytes) -> bytes:
    assert old in data, old
    return data.replace(old, new, 1)


def cut(data: bytes, part: float) -> bytes:
    return data[: int(part * len(data))]


def connectivity_of_raw(value: int) -> bytes:
    """The raw file with one point number replaced."""
    truth = SCRIPT["vessels"]()["connectivity"].astype("<i8")
    block = truth.tobytes()
    bad = truth.copy()
    bad[7] = value
    return swap(RAW, block, bad.tobytes())


def offsets_of_raw(values: list[int]) -> bytes:
    truth = SCRIPT["vessels"]()["offsets"].astype("<i8").tobytes()
    return swap(RAW, truth, np.array(values, "<i8").tobytes())


def points_of_raw(value: float) -> bytes:
    truth = SCRIPT["vessels"]()["points"].astype("<f4")
    bad = truth.copy()
    bad[5, 1] = value
    return swap(RAW, truth.tobytes(), bad.tobytes())


VTP = {
    "empty": (b"", "empty"),
    "junk": (bytes(range(256)) * 40, "damaged|XML|VTKFile"),
    "web page": (b"<html><body>not found</body></html>", "VTKFile|root|PolyData"),
    "wrong root": (swap(swap(RAW, b"<VTKFile", b"<VTKfile"), b"</VTKFile", b"</VTKfile"), "VTKFile|root"),
    "image data": (swap(RAW, b'type="PolyData"', b'type="ImageData"'), "PolyData|ImageData"),
    "entity bomb": (swap(TEXT, b"<VTKFile", b'<!DOCTYPE a [<!ENTITY b "bbbb">]>\n<VTKFile'), "entit|DOCTYPE"),
    "9e9 points raw": (swap(RAW, b'NumberOfPoints="60"', b'NumberOfPoints="9000000000"'), "27000000000 values"),
    "9e9 points text": (swap(TEXT, b'NumberOfPoints="60"', b'NumberOfPoints="9000000000"'), "9000000000|declare"),
    "9e9 lines": (swap(RAW, b'NumberOfLines="2"', b'NumberOfLines="9000000000"'), "9000000000|declare"),
    "points too few": (swap(RAW, b'NumberOfPoints="60"', b'NumberOfPoints="50"'), "declare|50"),
    "points too many": (swap(RAW, b'NumberOfPoints="60"', b'NumberOfPoints="61"'), "183 values"),
    "lines too few": (swap(RAW, b'NumberOfLines="2"', b'NumberOfLines="1"'), "declare|1"),
    "negative count": (swap(RAW, b'NumberOfLines="2"', b'NumberOfLines="-2"'), "-2"),
    "count no number": (swap(RAW, b'NumberOfPoints="60"', b'NumberOfPoints="sixty"'), "sixty"),
    "unknown type": (swap(RAW, b"Float32", b"Float33"), "Float33"),
    "two coordinates": (swap(RAW, b'NumberOfComponents="3"', b'NumberOfComponents="2"'), "coordinates|2"),
    "other byte order": (swap(RAW, b"LittleEndian", b"BigEndian"), "."),
    "odd byte order": (swap(RAW, b"LittleEndian", b"MiddleEndian"), "MiddleEndian|byte_order"),
    "offset -7": (swap(RAW, b'offset="0"', b'offset="-7"'), "offset|-7"),
    "offset beyond the end": (swap(RAW, b'offset="0"', b'offset="99999999"'), "offset|99999999|end"),
    "offset into another array": (swap(RAW, b'offset="0"', b'offset="8"'), "."),
    "format unknown": (swap(RAW, b'format="appended"', b'format="attached"'), "attached|format"),
    "point number huge": (connectivity_of_raw(2**40), "point"),
    "point number one too large": (connectivity_of_raw(N), "point"),
    "point number negative": (connectivity_of_raw(-1), "point|-1"),
    "offsets fall": (offsets_of_raw([50, 10]), "offset|line"),
    "offsets beyond the end": (offsets_of_raw([40, 99]), "offset|line|points"),
    "one-point line": (offsets_of_raw([1, 61]), "line"),
    "nan coordinate": (points_of_raw(np.nan), "finite|nan"),
    "infinite coordinate": (points_of_raw(np.inf), "finite|inf"),
    "cut raw": (cut(RAW, 0.6), "cut|end|damaged|bytes"),
    "cut text": (cut(TEXT, 0.6), "cut|end|damaged|XML"),
    "cut base64": (cut(BASE64, 0.6), "cut|end|damaged|XML"),
    "cut zlib": (cut(ZLIB, 0.6), "cut|end|damaged|XML"),
    "last byte of raw lost": (RAW[:-40], "cut|end|damaged|XML|AppendedData"),
    "text no number": (swap(TEXT, b" 1.9", b" l.9"), "number"),
    "two dots": (swap(TEXT, b" 1.9", b" 1.9."), "number"),
    "base64 sign lost": (swap(BASE64, b"AAAA", b"AA*A"), "."),
    "no lines": (swap(swap(RAW, b'NumberOfLines="2"', b'NumberOfLines="0"'), b"<Lines>", b"<Rines>"), "."),
    "two arrays of one name": (swap(TEXT, b"<PointData>\n", b"<PointData>\n" + b'<DataArray type="Float64" Name="radius" '
                                    b'format="ascii">\n' + b"1 " * N + b"\n</DataArray>\n"), "radius"),
}  # fmt: skip

VTK = {
    "empty": (b"", "empty"),
    "no header": (swap(OLD_TEXT, b"# vtk DataFile Version 3.0", b"# vessels"), "first line"),
    "neither text nor binary": (swap(OLD_TEXT, b"ASCII", b"ROMAN"), "ASCII"),
    "another data set": (swap(OLD_TEXT, b"POLYDATA", b"VOLUME"), "DATASET"),
    "cell of 1e9 points": (swap(OLD_TEXT, b"\n40 0 1", b"\n1000000000 0 1"), "."),
    "cut at 99.9 %": (cut(OLD_BINARY, 0.999), "cut|bytes"),
    "cut at 2 %": (cut(OLD_BINARY, 0.02), "."),
    "cut text": (cut(OLD_TEXT, 0.8), "."),
    "points too many": (swap(OLD_BINARY, b"POINTS 60", b"POINTS 300000"), "declared|cut"),
    "points too few": (swap(OLD_TEXT, b"POINTS 60", b"POINTS 59"), "."),
    "lines too few": (swap(OLD_TEXT, b"LINES 2", b"LINES 1"), "."),
    "lines 9e9": (swap(OLD_TEXT, b"LINES 2", b"LINES 9000000000"), "."),
    "point number too large": (swap(OLD_TEXT, b" 38 39", b" 38 99"), "point"),
    "point number negative": (swap(OLD_TEXT, b" 38 39", b" -3 39"), "."),
    "unknown section": (swap(OLD_TEXT, b"SCALARS", b"SKALARE"), "SKALARE"),
    "unknown type": (swap(OLD_TEXT, b"radius double", b"radius triple"), "triple"),
    "rows of data too many": (swap(OLD_TEXT, b"POINT_DATA 60", b"POINT_DATA 61"), "61"),
    "two numbers run together": (swap(OLD_TEXT, b" 1.9", b"1.9"), "number"),
    "text among numbers": (swap(OLD_TEXT, b" 1.9", b" one.9"), "number"),
}  # fmt: skip

CASES = [
    *((f"{label}.vtp", data, words) for label, (data, words) in VTP.items()),
    *((f"{label}.vtk", data, words) for label, (data, words) in VTK.items()),
]


@pytest.mark.parametrize(("name", "data", "words"), CASES, ids=[case[0] for case in CASES])
def test_broken_file(tmp_path: Path, name: str, data: bytes, words: str) -> None:
    file = tmp_path / name
    file.write_bytes(data)
    with pytest.raises(FileError, match=rf"(?s)(?i){words}") as caught:
        read_file(file)
    said = str(caught.value)
    assert "\n" not in said
    assert name in said
    assert file.read_bytes() == data


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (lambda folder: folder / "none.vtp", "no such file"),
        (lambda folder: folder, "folder|directory|suffix"),
        (lambda folder: named(folder, "lines.doc"), "suffix"),
        (lambda folder: named(folder, "lines"), "suffix"),
    ],
)
def test_what_is_no_file(tmp_path: Path, make: Callable[[Path], Path], words: str) -> None:
    with pytest.raises(FileError, match=words):
        read_file(make(tmp_path))


def named(folder: Path, name: str) -> Path:
    (folder / name).write_bytes(RAW)
    return folder / name


def test_there_is_a_wide_table() -> None:
    assert len(CASES) >= 55
