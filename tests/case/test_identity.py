"""Equal input gives equal bytes: other processes, hash seeds and thread counts included."""

import hashlib
import os
import subprocess
import sys
from pathlib import Path

import pytest

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"
BUILD = "import sys; from geomprep.case.build import build; build(sys.argv[1], output=sys.argv[2])"


def hashes(case: Path, folder: Path, **environment: str) -> dict[str, str]:
    """Build in a process of its own and hash everything it wrote."""
    subprocess.run([sys.executable, "-c", BUILD, str(case), str(folder)], check=True, env={**os.environ, **environment})
    return {path.name: hashlib.sha256(path.read_bytes()).hexdigest() for path in sorted(folder.iterdir())}


@pytest.mark.parametrize("name", ["neck-veins", "head-arteries", "neck-veins-rough"])
def test_same_bytes_whatever_the_process(name: str, tmp_path: Path) -> None:
    case = SAMPLES / name / "case.toml"
    one = hashes(case, tmp_path / "a", PYTHONHASHSEED="0", OMP_NUM_THREADS="1", OPENBLAS_NUM_THREADS="1")
    other = hashes(
        case, tmp_path / "elsewhere" / "b", PYTHONHASHSEED="4711", OMP_NUM_THREADS="2", OPENBLAS_NUM_THREADS="2"
    )
    assert one == other
    assert "network.json" in one


def test_no_path_and_no_clock_in_the_result(tmp_path: Path) -> None:
    hashes(SAMPLES / "limb" / "case.toml", tmp_path / "here")
    for path in (tmp_path / "here").iterdir():
        data = path.read_bytes()
        assert str(tmp_path).encode() not in data, path.name
        assert str(SAMPLES).encode() not in data, path.name
