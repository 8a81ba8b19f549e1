"""Time a whole build against its floor: contained read + hash of the input + atomic write of the same output bytes.

    python tests/benchmarks/whole_build.py            1e4, 1e5, 1e6 points
    python tests/benchmarks/whole_build.py --cold     a cold `geomprep build` of 5,000 points beside its floor
    python tests/benchmarks/whole_build.py --quick    1e4 and 1e5 points

Every row is one run in one process on one machine: read the ratio, not the seconds.
"""

from __future__ import annotations

import argparse
import hashlib
import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from nets import Lines, soup, tree, with_rings_and_joints

from geomprep.atomic import write_atomic
from geomprep.case.build import build
from geomprep.files import read_file, write_lines

CASE = """
[case]
name = "benchmark"
[[input]]
file = "lines.vtp"
vessels = "arteries"
length_unit = "mm"
size_array = "radius"
size_means = "inscribed radius"
[imaging_state]
arterial_pressure = "93 mmHg"
[walls.artery]
stiffness = "user"
wave_speed = "8 m/s"
[[inlets]]
at = "0 0 0"
pressure = "93 mmHg"
[[outlets]]
at = "every other open end"
model = "fixed pressure"
pressure = "20 mmHg"
"""

SHAPES: dict[str, Callable[[int], Lines]] = {
    "poly-lines with loops": tree,
    "the same, rings and joints added": lambda n: with_rings_and_joints(tree(n)),
    "shuffled edge soup": lambda n: soup(tree(n)),
}


def prepared(folder: Path, net: Lines) -> Path:
    """Write a net and its case; return the case file."""
    write_lines(folder / "lines.vtp", net.points, net.connectivity, net.offsets, {"radius": net.radius})
    (folder / "case.toml").write_text(CASE)
    return folder / "case.toml"


def floor_seconds(folder: Path, outputs: list[Path]) -> float:
    """Contained read, hash of the input, atomic write of the bytes that the build wrote."""
    written = [path.read_bytes() for path in outputs]
    start = time.perf_counter()
    read_file(folder / "lines.vtp")
    hashlib.sha256((folder / "lines.vtp").read_bytes()).hexdigest()
    for number, data in enumerate(written):
        write_atomic(folder / f"floor-{number}", data)
    return time.perf_counter() - start


def row(label: str, net: Lines) -> str:
    """Build once to warm up, then time build and floor, alternating."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        case = prepared(folder, net)
        ratios, seconds = [], []
        for _ in range(3):
            start = time.perf_counter()
            build(case)
            seconds.append(time.perf_counter() - start)
            outputs = [path for path in (folder / "results").iterdir() if path.is_file()]
            ratios.append(seconds[-1] / floor_seconds(folder, outputs))
        size = sum(path.stat().st_size for path in outputs) / 1e6
        raw = net.points.nbytes + net.radius.nbytes + net.connectivity.nbytes + net.offsets.nbytes
        memory = peak_memory(case) / raw
        return (
            f"| {label} | {len(net.points):,} | {statistics.median(ratios):.2f} | {min(ratios):.2f}-{max(ratios):.2f} "
            f"| {size:.1f} | {memory:.1f} |"
        )


def peak_memory(case: Path) -> int:
    """Growth of the peak resident size over the imports, in bytes, of one build in its own process."""
    code = (
        "import sys; from geomprep.case.build import build; import scipy.spatial, scipy.sparse.csgraph, orjson\n"
        "peak = lambda: int(open('/proc/self/status').read().split('VmHWM:')[1].split()[0])\n"
        "base = peak(); build(sys.argv[1]); print((peak() - base) * 1024)"
    )
    done = subprocess.run([sys.executable, "-c", code, str(case)], capture_output=True, text=True, check=True)
    return int(done.stdout)


def cold() -> None:
    """A cold build of a 5,000-point case beside a process that imports what it must and reads contained."""
    with tempfile.TemporaryDirectory() as name:
        case = prepared(Path(name), tree(5000))
        lines = str(Path(name) / "lines.vtp")
        read_only = (
            "import numpy, scipy.sparse, scipy.sparse.linalg, scipy.spatial, vtkmodules.vtkIOXML, sys;"
            "from geomprep.files import read_file; read_file(sys.argv[1])"
        )
        ratios = []
        for _ in range(7):
            floor = timed([sys.executable, "-c", read_only, lines])
            ratios.append(timed([sys.executable, "-m", "geomprep", "build", str(case), "--quiet"]) / floor)
        print(
            f"cold build of 5,000 points: {statistics.median(ratios):.2f} (from {min(ratios):.2f} to {max(ratios):.2f})"
        )


def timed(command: list[str]) -> float:
    """Wall time of one process."""
    start = time.perf_counter()
    subprocess.run(command, check=True, capture_output=True)
    return time.perf_counter() - start


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cold", action="store_true")
    parser.add_argument("--quick", action="store_true")
    arguments = parser.parse_args()
    if arguments.cold:
        cold()
        return
    print("| data | points | build / floor | range | MB written | peak memory / raw arrays |")
    print("|---|---|---|---|---|---|")
    for n in (10_000, 100_000) if arguments.quick else (10_000, 100_000, 1_000_000):
        for label, make in SHAPES.items():
            net = make(n // 2 if "soup" in label else n)  # a soup holds every inner point twice
            print(row(label, net), flush=True)
    print(f"\nnumpy {np.__version__}, {os.cpu_count()} cores")


if __name__ == "__main__":
    main()
