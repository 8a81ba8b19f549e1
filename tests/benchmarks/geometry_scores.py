"""Score the geometry of vessels on phantoms whose truth is known, at full size, and weigh its speed.

    python tests/benchmarks/geometry_scores.py             100 to 500 phantoms per row, speed at a million stations
    python tests/benchmarks/geometry_scores.py --tenth     a tenth of each

Prints the tables of docs/benchmarks.md.
"""

from __future__ import annotations

import argparse
import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent))

from nets import tree
from phantoms.cases import Case, cases
from phantoms.geometry import (
    FORMS,
    READINGS,
    Found,
    Vessel,
    closed_form_error,
    covered,
    from_voxels,
    network_of,
    noisy_intervals,
    noisy_narrowings,
    voxel_intervals,
    voxel_narrowings,
    y_tube,
)
from repair_speed import centrelines
from scipy.ndimage import map_coordinates

from geomprep.measure import (
    Convention,
    VoxelGrid,
    ZoneSettings,
    intervals,
    junction_zones,
    mask_areas,
    measure_segments,
    narrowings,
    radius_profiles,
    resolution,
)
from geomprep.model import Network, Stations
from geomprep.repair import join
from geomprep.segments import split

FIRST = 10_000
QUANTITIES = ("length", "volume", "inverse_fourth_power")


def table(title: str, *columns: str) -> None:
    """Print the head of a table."""
    print(f"\n{title}\n\n| {' | '.join(columns)} |\n{'|---' * len(columns)}|", flush=True)


def row(*cells: object) -> None:
    """Print a row of a table."""
    print(f"| {' | '.join(map(str, cells))} |", flush=True)


def resistance_and_coverage(n: int) -> None:
    """∫ds/r⁴ from masks, and how often the intervals of a voxel hold the truth."""
    table("From voxels", "voxels across", "radii", "median error of ∫ds/r⁴", "95th percentile", "median with its sign",
          "radius off, mean and standard deviation (voxels)", "volume held, width", "∫ds/r⁴ held, width")  # fmt: skip
    for across in (4, 6, 8, 12):
        made = from_voxels(across, FIRST, n)
        for reading in READINGS:
            error = np.array([each.error(reading) for each in made])
            low, high = 100 * np.percentile(np.abs(error), [50, 95])
            held = [f"{100 * share:.0f} %, {width:.2f}" for share, width in voxel_intervals(made, reading).values()]
            off = np.concatenate([each.off(reading) for each in made])
            row(across, reading, f"{low:.1f} %", f"{high:.1f} %", f"{100 * np.median(error):+.1f} %",
                f"{off.mean():+.2f}, {off.std():.2f}", *held)  # fmt: skip


def trees(n: int) -> None:
    """∫ds/r⁴ of the vessels of trees and rings in one mask, away from junctions, by voxels across."""
    table("Trees from voxels", "voxels across", "vessels", "radii", "median error of ∫ds/r⁴", "95th percentile",
          "median with its sign", "stations off by 20 %")  # fmt: skip
    found = np.concatenate(
        [tree_errors(case) for kind in ("voxel tree", "voxel ring") for case in cases(kind, FIRST, n)]
    )
    for low, high in ((4, 6), (6, 8), (8, 99)):
        held = found[(found[:, 0] >= low) & (found[:, 0] < high)]
        for column, reading in enumerate(TREE_READINGS, 1):
            error = held[:, column]
            size = 100 * np.percentile(np.abs(error), [50, 95])
            row(f"{low} to {high}" if high < 99 else f"{low} and more", len(held), reading, f"{size[0]:.1f} %",
                f"{size[1]:.1f} %", f"{100 * np.median(error):+.1f} %",
                f"{100 * held[:, column + len(TREE_READINGS)].mean():.1f} %")  # fmt: skip


TREE_READINGS = ("areas, true radii as weights", "areas, distance map as weights", "areas, no weights", "distance map")


def tree_errors(case: Case) -> np.ndarray:
    """(s, 9): voxels across each vessel, then errors of ∫ds/r⁴ and shares of stations 20 % off, by reading.

    Stations lie 0.5 mm apart. Left out are those inside a parent, and those within a radius and a voxel of that or of
    an end.
    """
    truth, image = case.truth, case.voxels
    edge, at = float(image.voxel.max()), (case.truth.points - image.origin) / image.voxel
    rows = [np.unique(np.r_[truth.offsets[k] : truth.offsets[k + 1] : 5, truth.offsets[k + 1] - 1])
            for k in range(truth.n_segments)]  # fmt: skip
    own = np.concatenate(rows)
    network = network_of([(truth.points[row], truth.radius[row]) for row in rows])
    zones, stations = junction_zones(network, ZoneSettings(change_points=False)), network.stations
    mouth = edge + stations.radius[np.stack((stations.offsets[:-1], stations.offsets[1:] - 1), axis=1)]
    mouth[zones.segment, zones.end] += zones.distance[:, Convention.LUMEN_EXIT]
    # squares of single precision are exact
    drawn = map_coordinates(image.distance, at[own].T, order=1).astype(np.float32).astype(float)
    grid, farthest = VoxelGrid(image.origin, image.voxel, np.eye(3)), 3 * stations.radius.max()
    weights = (truth.radius[own].astype(np.float32).astype(float), drawn, None)
    areas = [mask_areas(image.mask, grid, stations.position, stations.offsets, w, farthest).area for w in weights]
    radii = [np.sqrt(np.where(np.isnan(area), np.pi * drawn**2, area) / np.pi) for area in areas]
    radii.append(drawn)
    errors = []
    for k in range(truth.n_segments):
        here = np.arange(stations.offsets[k], stations.offsets[k + 1])
        s = stations.distance[here]
        kept = here[(s >= mouth[k, 0]) & (s <= s[-1] - mouth[k, 1])]
        if len(kept) >= 4:
            true, each = integral(stations, kept, truth.radius[own]), [integral(stations, kept, r) for r in radii]
            wrong = [np.mean(~(np.abs(r[kept] / truth.radius[own][kept] - 1) < 0.2)) for r in radii]
            errors.append((2 * truth.radius[own][kept].min() / edge, *(np.array(each) / true - 1), *wrong))
    return np.array(errors)


def integral(stations: Stations, kept: np.ndarray, radius: np.ndarray) -> float:
    """∫ds/r⁴ over some stations in a row."""
    return Vessel(stations.distance[kept], radius[kept], np.inf, np.eye(3)).inverse_fourth_power


def planted(n: int) -> None:
    """Degree and place of planted narrowings."""
    columns = ("radii", "form", "missed", "beside", "error of the degree, median and 95th percentile (points)",
               "error of the place, median and 95th percentile (mm)", "within 1 mm")  # fmt: skip
    table("Narrowings", *columns)
    for reach, said in ((0.0, "independent"), (1.0, "over a radius")):
        for form in FORMS:
            found_row(f"noise of 2 %, {said}", form, noisy_narrowings(form, FIRST, n, reach=reach))
    for across in (12, 20):
        for reading, found in voxel_narrowings(across, FIRST, n).items():
            found_row(f"{across} voxels across, {reading}", "three forms", found)


def found_row(what: str, form: str, found: Found) -> None:
    """Print what was found of planted narrowings."""
    there = np.isfinite(found.degree)
    degree = 100 * np.percentile(np.abs(found.degree[there]), [50, 95])
    place = 1e3 * np.percentile(np.abs(found.place[there]), [50, 95])
    near = 100 * np.mean(np.abs(found.place) <= 1e-3)
    row(what, form, found.missed, found.beside, f"{degree[0]:.1f}, {degree[1]:.1f}", f"{place[0]:.2f}, {place[1]:.2f}",
        f"{near:.0f} %")  # fmt: skip


def stated_noise(n: int) -> None:
    """Coverage of 90 % intervals of noisy vessels."""
    table("Intervals", "vessels", "length held, width", "volume held, width", "∫ds/r⁴ held, width")
    for kind in ("all", "level", "tapered", "narrowed", "bent"):
        found, truth = noisy_intervals(kind, FIRST, n)
        shown = [getattr(found, name) for name in QUANTITIES]
        row(kind, *(f"{100 * covered(one, true):.1f} %, {np.median(one.high / one.low):.3f}"
                    for one, true in zip(shown, truth, strict=True)))  # fmt: skip


def closed_forms() -> None:
    """Errors of measured profiles, and of junctions of straight tubes."""
    sizes = (11, 21, 41, 81, 161, 321)
    table("Closed forms", "profile of 10 mm", *(f"{size} stations" for size in sizes))
    for form in ("cone", "exponential", "cosine"):
        row(form, *(f"{100 * abs(closed_form_error(form, size)):.4f} %" for size in sizes))
    table("Y-tubes", "junction", "radii of trunk and branch", "angles", "largest error of ∫ds/r⁴", "of the union")
    for name, parts, pairs in (("passing trunk", False, ((2, 1), (1.5, 1.5))), ("parting", True, ((2, 1), (1, 0.8)))):
        for trunk, branch in pairs:
            errors = np.abs([y_tube(degrees, trunk, branch, parts) for degrees in (30, 45, 60, 90)]).max(axis=0)
            row(name, f"{trunk}, {branch}", "30, 45, 60, 90°", *(f"{100 * error:.3f} %" for error in errors))


def speed(points: int) -> None:
    """Kernels against five sums over the same stations, the median of three runs."""
    table("Speed", "stations", "segments", "kernel", "kernel / five sums")
    for per_line in (20, 200):
        network = split(join(centrelines(tree(points, per_line))).graph)
        floor = spent(lambda network=network: sums(network), 25)
        for name, kernel in KERNELS.items():
            ratio = spent(lambda kernel=kernel, network=network: kernel(network), 3) / floor
            row(f"{len(network.stations):,}", f"{len(network.segments):,}", name, f"{ratio:.0f}")


def sums(network: Network) -> list[np.ndarray]:
    """Five sums of the stations of every segment."""
    stations = network.stations
    return [np.add.reduceat(stations.radius, stations.offsets[:-1]) for _ in range(5)]


def lines(network: Network) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Distance, radius and offsets of the stations."""
    return network.stations.distance, network.stations.radius, network.stations.offsets


KERNELS: dict[str, Callable[[Network], Any]] = {
    "measure_segments": measure_segments,
    "resolution": lambda network: resolution(*lines(network), 0.5e-3),
    "junction_zones, no volumes, no change points": lambda network: junction_zones(
        network, ZoneSettings(change_points=False, volumes=False)
    ),
    "narrowings": lambda network: narrowings(*lines(network)),
    "radius_profiles": lambda network: radius_profiles(*lines(network)),
    "intervals": lambda network: intervals(network.stations, 0.5e-3),
}


def spent(work: Callable[[], Any], times: int) -> float:
    """Median time of some runs after a first."""
    work()
    found = []
    for _ in range(times):
        start = time.perf_counter()
        work()
        found.append(time.perf_counter() - start)
    return statistics.median(found)


def main() -> None:
    """Run all."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--tenth", action="store_true")
    part = 10 if parser.parse_args().tenth else 1
    resistance_and_coverage(200 // part)
    trees(50 // part)
    planted(100 // part)
    stated_noise(500 // part)
    closed_forms()
    speed(1_000_000 // part)


if __name__ == "__main__":
    main()
