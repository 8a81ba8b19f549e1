"""Score every repair on phantoms whose truth is known, at full size.

    python tests/benchmarks/repair_scores.py             200 phantoms of planted defects, 100 voxel phantoms
    python tests/benchmarks/repair_scores.py --tenth     a tenth of each
    python tests/benchmarks/repair_scores.py --tuning    on the seeds used for tuning

Prints the tables of docs/benchmarks.md.
"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent))

from phantoms import series
from phantoms.cases import cases
from phantoms.judge import comparable, compare
from phantoms.scores import total


def row(what: str, measure: str, value: object) -> None:
    """Print a row of a table."""
    print(f"| {what} | {measure} | {value} |", flush=True)


def planted(first: int, n: int) -> None:
    """Tables of planted defects."""
    print("| what | measure | value |\n|---|---|---|")
    for kind in ("clean", "clean crossing"):
        row(f"{kind}, {n} phantoms", "repairs and questions", sum(series.clean_repairs(kind, first, n).values()))
    for kind in ("gaps", "long gaps"):
        own, greedy = series.gap_scores(kind, first, n)
        one, other = total(own), total(greedy)
        value = f"{one.precision:.3f}, {one.recall:.3f}"
        row(f"{kind}, up to 6 radii ({one.right + one.missed})", "precision, recall", value)
        row("the same, nearest end first", "balanced score", f"{other.balanced:.3f}")
    row("gaps beside veins", "edges between artery and vein", series.mixed_bridges("gaps in pairs", first, n))
    spur = series.spurs(first, n)
    row(f"spurs ({spur.planted})", "recall", f"{1 - spur.left / spur.planted:.3f}")
    row(f"true branches beside spurs ({spur.ends})", "lost", f"{100 * spur.lost / spur.ends:.2f} %")
    for kind in ("kissing", "kissing classes"):
        kiss = series.kissing(kind, first, n)
        value = f"{1 - kiss.left / kiss.planted:.3f}, {kiss.false / kiss.cases:.3f}"
        row(f"{kind} ({kiss.planted})", "recall, false per case", value)
    error = np.abs(series.radius_errors(first, n))
    value = (
        f"{100 * np.mean(error <= 0.02):.1f} %, {100 * np.median(error):.3f} %, {100 * np.percentile(error, 99):.0f} %"
    )
    row(f"outliers of radius ({len(error)} segments)", "resistance within 2 %, median error, 99th percentile", value)
    for kind in ("routes", "cliques", "holes", "stray", "copies", "wide copies", "all"):
        row(kind, "topology exact (copies: veins left out)", topology(kind, first, n))


def topology(kind: str, first: int, n: int) -> str:
    """Share of exact topologies among phantoms without veins."""
    exact = [
        compare(case.truth, series.mended(case).graph).exact
        for case in cases(kind, first, n)
        if comparable(case.truth) and (kind not in ("copies", "wide copies") or case.truth.vessel_class.max() == 1)
    ]
    return f"{sum(exact)} of {len(exact)}"


def voxels(first: int, n: int) -> None:
    """Table of voxel phantoms."""
    print("\n| voxel phantoms | exact | of those whose skeleton reaches all ends | error of resistance, median and 95th "
          "percentile | the same as far as the skeleton reaches | faults |\n|---|---|---|---|---|---|")  # fmt: skip
    for kind in ("voxel tree", "voxel ring", "voxel pair", "voxel veins", "coarse voxel tree"):
        found = series.voxels(kind, first, n)
        faults = ", ".join(f"{name} {count}" for name, count in found.faults.most_common()) or "none"
        print(
            f"| {kind} | {found.exact} of {found.cases} | {found.exact_reached} of {found.reached} | "
            f"{_spread(found.errors)} | {_spread(found.errors_reached)} | {faults} |",
            flush=True,
        )


def _spread(errors: list[np.ndarray]) -> str:
    """Median and 95th percentile of absolute errors, and the median with its sign."""
    error = np.concatenate(errors)
    low, high = np.percentile(np.abs(error), [50, 95])
    return f"{100 * low:.1f} %, {100 * high:.1f} % ({100 * np.median(error):+.1f} %)"


def main() -> None:
    """Run both."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--tenth", action="store_true")
    parser.add_argument("--tuning", action="store_true")
    arguments = parser.parse_args()
    first, part = (0 if arguments.tuning else 10_000), (10 if arguments.tenth else 1)
    planted(first, 200 // part)
    voxels(first, 100 // part)


if __name__ == "__main__":
    main()
