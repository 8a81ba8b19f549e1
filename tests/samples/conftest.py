"""Read the sample files with plain Python, apart from the package and from the maker."""

import json
import xml.etree.ElementTree as ET
from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest

FOLDER = Path(__file__).parents[2] / "sample_geometries"


@dataclass
class Sample:
    """A sample as its files say: points, sizes, lines as point numbers, and the truth."""

    points: np.ndarray
    size: np.ndarray
    lines: list[np.ndarray]
    truth: dict[str, Any]


def _xml(path: Path) -> tuple[np.ndarray, np.ndarray, list[np.ndarray]]:
    """Points, the point array and lines of an ASCII XML file."""
    piece = ET.parse(path).getroot().find("PolyData/Piece")
    arrays = {array.get("Name"): np.array((array.text or "").split(), dtype=float) for array in piece.iter("DataArray")}
    offsets = np.concatenate(([0], arrays["offsets"].astype(int)))
    numbers = arrays["connectivity"].astype(int)
    lines = [numbers[a:b] for a, b in pairwise(offsets)]
    return arrays["Points"].reshape(-1, 3), arrays["radius"], lines


def _legacy(path: Path) -> tuple[np.ndarray, np.ndarray, list[np.ndarray]]:
    """Points, the point array and lines of an ASCII legacy file, version 4.2."""
    words = path.read_text().split("\n", 2)[2].split()
    at = words.index("POINTS")
    count = int(words[at + 1])
    points = np.array(words[at + 3 : at + 3 + 3 * count], dtype=float).reshape(-1, 3)
    at = words.index("LINES")
    lines, position = [], at + 3
    for _ in range(int(words[at + 1])):
        length = int(words[position])
        lines.append(np.array(words[position + 1 : position + 1 + length], dtype=int))
        position += 1 + length
    at = words.index("LOOKUP_TABLE") + 2
    return points, np.array(words[at : at + count], dtype=float), lines


@pytest.fixture(scope="session")
def samples_folder() -> Path:
    return FOLDER


@pytest.fixture(scope="session")
def load() -> Callable[[str], Sample]:
    """Read a sample by its name."""

    def read(name: str) -> Sample:
        (file,) = [path for path in (FOLDER / name).iterdir() if path.suffix in (".vtp", ".vtk")]
        content = _xml(file) if file.suffix == ".vtp" else _legacy(file)
        return Sample(*content, json.loads((FOLDER / name / "truth.json").read_text()))

    return read
