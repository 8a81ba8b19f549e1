"""Flip bytes in centreline files of every encoding; each result must be refused or equal an independent decoding.

    python tests/benchmarks/mutated_files.py [N]      N flips in all (500)

At least half of the flips lie in payload bytes. The decoding here uses numpy, zlib and base64 on the
mutated bytes alone, at the places where this script itself put them.
"""

from __future__ import annotations

import base64
import struct
import sys
import tempfile
import zlib
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from geomprep.errors import FileError
from geomprep.files import FileContents, read_file

Decoded = dict[str, np.ndarray]


@dataclass(frozen=True)
class Base:
    """One file before it is damaged, where its payload lies, and how to decode it anew."""

    name: str
    data: bytes
    payload: tuple[tuple[int, int], ...]
    decode: Callable[[bytes], Decoded]


def vessels(n: int = 60) -> Decoded:
    """A bent line and a branch."""
    t = np.linspace(0, 3, n)
    points = np.stack((20 * t, 8 * np.sin(t), 3 * np.cos(2 * t)), axis=1).astype(np.float32)
    return {
        "points": points,
        "radius": 2.0 - 0.3 * t,
        "connectivity": np.concatenate((np.arange(40), [39], np.arange(40, n))).astype(np.int64),
        "offsets": np.array([40, n + 1], np.int64),
    }


TYPES = {"points": "f4", "radius": "f8", "connectivity": "i8", "offsets": "i8"}
XML_TYPES = {"points": "Float32", "radius": "Float64", "connectivity": "Int64", "offsets": "Int64"}


def _xml(head: str, arrays: dict[str, str], tail: str, attributes: str = "") -> str:
    """The frame of a `.vtp` file around four arrays."""
    n = len(vessels()["points"])
    return (
        '<?xml version="1.0"?>\n<VTKFile type="PolyData" version="1.0" byte_order="LittleEndian" '
        f'header_type="UInt32"{attributes}>\n<PolyData>\n'
        f'<Piece NumberOfPoints="{n}" NumberOfVerts="0" NumberOfLines="2" NumberOfStrips="0" NumberOfPolys="0">\n'
        f"<PointData>\n{arrays['radius']}\n</PointData>\n<Points>\n{arrays['points']}\n</Points>\n"
        f"<Lines>\n{arrays['connectivity']}\n{arrays['offsets']}\n</Lines>\n</Piece>\n</PolyData>\n{head}{tail}</VTKFile>\n"
    )


def _tag(key: str, form: str, body: str = "", extra: str = "") -> str:
    """One array tag."""
    name = "" if key == "points" else f' Name="{key}"'
    columns = ' NumberOfComponents="3"' if key == "points" else ""
    start = f'<DataArray type="{XML_TYPES[key]}"{name}{columns} format="{form}"{extra}'
    return f"{start}>{body}</DataArray>" if body else f"{start}/>"


def raw_appended() -> Base:
    """Appended raw data, uncompressed."""
    truth, data, places = vessels(), b"", {}
    for key, kind in TYPES.items():
        block = truth[key].astype("<" + kind).tobytes()
        places[key] = (len(data) + 4, len(block))
        data += struct.pack("<I", len(block)) + block
    tags = {key: _tag(key, "appended", extra=f' offset="{places[key][0] - 4}"') for key in TYPES}
    text = _xml('<AppendedData encoding="raw">\n_', tags, "\n</AppendedData>\n").encode()
    start = text.index(b"_", text.index(b"<AppendedData")) + 1
    whole = text[:start] + data + text[start:]

    def decode(mutated: bytes) -> Decoded:
        return {
            key: np.frombuffer(mutated, "<" + kind, places[key][1] // int(kind[1]), start + places[key][0])
            for key, kind in TYPES.items()
        }

    return Base("raw.vtp", whole, tuple((start + a, start + a + n) for a, n in places.values()), decode)


def inline_base64(compressed: bool) -> Base:
    """Inline base64 data, plain or zlib."""
    truth, bodies = vessels(), {}
    for key, kind in TYPES.items():
        block = truth[key].astype("<" + kind).tobytes()
        if compressed:
            packed = zlib.compress(block)
            head = struct.pack("<IIII", 1, len(block), 0, len(packed))
            bodies[key] = base64.b64encode(head).decode() + base64.b64encode(packed).decode()
        else:
            bodies[key] = base64.b64encode(struct.pack("<I", len(block)) + block).decode()
    tags = {key: _tag(key, "binary", f"\n{bodies[key]}\n") for key in TYPES}
    whole = _xml("", tags, "", ' compressor="vtkZLibDataCompressor"' if compressed else "").encode()
    places = {key: (whole.index(bodies[key].encode()), len(bodies[key])) for key in TYPES}

    def decode(mutated: bytes) -> Decoded:
        found = {}
        for key, kind in TYPES.items():
            text = mutated[places[key][0] : sum(places[key])]
            if compressed:
                head = struct.unpack("<IIII", base64.b64decode(text[:24], validate=True))
                if (head[0], head[2]) != (1, 0):
                    raise ValueError("another number of blocks")
                block = zlib.decompress(base64.b64decode(text[24:], validate=True)[: head[3]])
            else:
                block = base64.b64decode(text, validate=True)
                (size,) = struct.unpack("<I", block[:4])
                block = block[4 : 4 + size]
            found[key] = np.frombuffer(block, "<" + kind)
        return found

    name = "zlib.vtp" if compressed else "base64.vtp"
    return Base(name, whole, tuple((a, a + n) for a, n in places.values()), decode)


def ascii_xml() -> Base:
    """Inline text."""
    truth = vessels()
    bodies = {key: " ".join(repr(float(v)) if kind[0] == "f" else str(v) for v in truth[key].ravel().tolist())
              for key, kind in TYPES.items()}  # fmt: skip
    whole = _xml("", {key: _tag(key, "ascii", f"\n{body}\n") for key, body in bodies.items()}, "").encode()
    places = {key: (whole.index(bodies[key].encode()), len(bodies[key])) for key in TYPES}

    def decode(mutated: bytes) -> Decoded:
        return {key: numbers(mutated[places[key][0] : sum(places[key])], kind) for key, kind in TYPES.items()}

    return Base("ascii.vtp", whole, tuple((a, a + n) for a, n in places.values()), decode)


def numbers(text: bytes, kind: str) -> np.ndarray:
    """Numbers of a text, rounded once."""
    words = text.decode("ascii").split()
    if any("_" in word for word in words):
        raise ValueError("no number")
    values = [float(word) if kind[0] == "f" else int(word) for word in words]
    return np.array(values).astype("<" + kind)


def legacy(binary: bool) -> Base:
    """Legacy poly data, version 3."""
    truth = vessels()
    first = int(truth["offsets"][0])
    lines = np.concatenate(([first], truth["connectivity"][:first], [len(truth["connectivity"]) - first],
                            truth["connectivity"][first:]))  # fmt: skip
    parts = {"points": (truth["points"], ">f4"), "lines": (lines, ">i4"), "radius": (truth["radius"], ">f8")}
    if binary:
        bodies = {key: values.astype(kind).tobytes() for key, (values, kind) in parts.items()}
    else:
        bodies = {
            key: " ".join(repr(float(v)) if kind[1] == "f" else str(v) for v in values.ravel().tolist()).encode()
            for key, (values, kind) in parts.items()
        }
    n = len(truth["points"])
    head = f"# vtk DataFile Version 3.0\nvessels\n{'BINARY' if binary else 'ASCII'}\nDATASET POLYDATA\n"
    between = f"\nPOINT_DATA {n}\nSCALARS radius double 1\nLOOKUP_TABLE default\n"
    whole = b"".join(
        (
            f"{head}POINTS {n} float\n".encode(),
            bodies["points"],
            f"\nLINES 2 {len(lines)}\n".encode(),
            bodies["lines"],
            between.encode(),
            bodies["radius"],
            b"\n",
        )
    )
    places = {key: (whole.index(body), len(body)) for key, body in bodies.items()}

    def decode(mutated: bytes) -> Decoded:
        found = {}
        for key, (_, kind) in parts.items():
            block = mutated[places[key][0] : sum(places[key])]
            found[key] = np.frombuffer(block, kind).astype("<" + kind[1:]) if binary else numbers(block, kind[1:])
        rows = found.pop("lines").astype(np.int64)
        count = int(rows[0])
        rest = int(rows[1 + count])
        if count + rest + 2 != len(rows):
            raise ValueError("cells do not fill their list")
        found["connectivity"] = np.concatenate((rows[1 : 1 + count], rows[2 + count :]))
        found["offsets"] = np.array([count, count + rest])
        return found

    return Base("binary.vtk" if binary else "ascii.vtk", whole, tuple((a, a + n) for a, n in places.values()), decode)


def bases() -> list[Base]:
    """All base files."""
    return [raw_appended(), inline_base64(False), inline_base64(True), ascii_xml(), legacy(True), legacy(False)]


def mutated(base: Base, random: np.random.Generator, in_payload: bool) -> bytes:
    """One byte flipped in one bit or replaced."""
    inside = np.concatenate([np.arange(a, b) for a, b in base.payload])
    places = inside if in_payload else np.setdiff1d(np.arange(len(base.data)), inside)
    place = int(random.choice(places))
    value = base.data[place] ^ (1 << int(random.integers(8))) if random.random() < 0.5 else int(random.integers(256))
    return base.data[:place] + bytes([value]) + base.data[place + 1 :]


def same(found: FileContents, expected: Decoded) -> bool:
    """Whether what was read is what the bytes say, bit by bit."""
    radius = next(iter(found.point_arrays.values()), np.empty(0))
    ends = np.concatenate(([0], expected["offsets"]))
    return (
        found.points.tobytes() == expected["points"].astype("<f4").tobytes()
        and found.connectivity.tolist() == expected["connectivity"].tolist()
        and found.offsets.tolist() == ends.tolist()
        and radius.tobytes() == expected["radius"].astype("<f8").tobytes()
    )


def verdict(base: Base, data: bytes, folder: Path) -> str:
    """What became of one mutated file; anything but ``refused`` and ``equal`` is a failure."""
    file = folder / base.name
    file.write_bytes(data)
    try:
        found = read_file(file)
    except FileError as fault:
        return "refused" if "\n" not in str(fault) and base.name in str(fault) else f"refused badly: {fault!r}"
    try:
        expected = base.decode(data)
    except Exception as fault:  # our own decoding cannot read it, but the program did
        return f"SILENT: read what no decoding gives ({type(fault).__name__}: {fault})"
    return "equal" if same(found, expected) else "SILENT: differs from the bytes"


def run(count: int, seed: int = 0) -> dict[str, Counter[str]]:
    """Mutate every base in turn, three of five flips in payload bytes."""
    random = np.random.default_rng(seed)
    table: dict[str, Counter[str]] = {}
    all_bases = bases()
    with tempfile.TemporaryDirectory() as folder:
        for number in range(count):
            base = all_bases[number % len(all_bases)]
            data = mutated(base, random, in_payload=number % 5 < 3)
            table.setdefault(base.name, Counter())[verdict(base, data, Path(folder))] += 1
    return table


def main() -> None:
    """Print the table."""
    table = run(int(sys.argv[1]) if len(sys.argv) > 1 else 500)
    outcomes = sorted({word for row in table.values() for word in row})
    print("| file | " + " | ".join(outcomes) + " |\n|---|" + "---|" * len(outcomes))
    for name, row in table.items():
        print(f"| {name} | " + " | ".join(str(row[word]) for word in outcomes) + " |")


if __name__ == "__main__":
    main()
