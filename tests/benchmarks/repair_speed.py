"""Time the detection of defects against joining and cutting into segments, on lines without and with defects.

    python tests/benchmarks/repair_speed.py [POINTS ...]      1e4, 1e5, 1e6 points

Every row is one run in one process: read the ratio, not the seconds.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable
from typing import Any

import numpy as np
from nets import Lines, tree

from geomprep.model import Centrelines
from geomprep.repair import STEPS, Given, join, mend_graph
from geomprep.segments import split


def centrelines(net: Lines) -> Centrelines:
    """A net as the package takes it, all arteries."""
    points = np.asarray(net.points, float) * 1e-3
    return Centrelines(
        points,
        np.asarray(net.radius, float) * 1e-3,
        points,
        net.connectivity,
        net.offsets,
        np.ones(len(net.offsets) - 1),
        np.zeros(len(net.offsets) - 1),
        np.zeros(len(points)),
    )


def rough(lines: Centrelines, seed: int = 0) -> Centrelines:
    """The same lines with every hundredth of them cut in two by a gap of some points."""
    rng = np.random.default_rng(seed)
    counts = np.diff(lines.offsets)
    cut = np.flatnonzero((counts > 14) & (rng.random(len(counts)) < 0.01))
    keep = np.ones(len(lines.connectivity), np.bool_)
    starts = lines.offsets[:-1].copy()
    more = []
    for line in cut.tolist():
        middle = int(lines.offsets[line] + counts[line] // 2)
        keep[middle : middle + 3] = False
        more.append(middle + 3)
    number = np.cumsum(keep) - keep
    starts = np.sort(np.concatenate((starts, np.array(more, np.int64))))
    offsets = np.append(number[starts], keep.sum())
    count = len(offsets) - 1
    return Centrelines(
        lines.points, lines.radius, lines.raw_points, lines.connectivity[keep], offsets, np.ones(count), np.zeros(count),
        np.zeros(len(lines.points)),
    )  # fmt: skip


def timed(work: Callable[[], Any], times: int) -> tuple[float, Any]:
    """Median time of some runs, and the last result."""
    spent = []
    for _ in range(times):
        start = time.perf_counter()
        result = work()
        spent.append(time.perf_counter() - start)
    return statistics.median(spent), result


def main() -> None:
    """Print a row per size and kind, and a row per step for the largest."""
    sizes = [int(float(text)) for text in sys.argv[1:]] or [10_000, 100_000, 1_000_000]
    print("| lines | points | all steps / (join + segments) | per point, over that of the first size | repairs |")
    print("|---|---|---|---|---|")
    first: dict[str, float] = {}
    for name, spoil in (("clean", lambda lines: lines), ("with gaps", rough)):
        for size in sizes:
            lines = spoil(centrelines(tree(size)))
            times = 3 if size > 300_000 else 7
            joining, joined = timed(lambda lines=lines: join(lines), times)
            cutting, _ = timed(lambda joined=joined: split(joined.graph), times)
            mending, mended = timed(lambda joined=joined: mend_graph(joined.graph, {}, Given()), times)
            per_point = mending / len(lines.connectivity)
            ratio = per_point / first.setdefault(name, per_point)
            share = mending / (joining + cutting)
            print(
                f"| {name} | {len(lines.connectivity):,} | {share:.2f} | {ratio:.2f} | {len(mended.repairs)} |",
                flush=True,
            )
    print("\n| step, largest size | part of all steps |\n|---|---|")
    graph, given = joined.graph, Given()
    spent = {}
    for row in STEPS:
        spent[row.name], result = timed(lambda row=row, graph=graph: row.step(graph, row.settings(), given), 1)
        graph = result.graph
    for step, seconds in spent.items():
        print(f"| {step} | {100 * seconds / sum(spent.values()):.0f} % |")


if __name__ == "__main__":
    main()
