"""Which unit and which meaning of sizes fit: right hypothesis first on scaled copies of vessel sets.

The sets are rows of (length in mm, radius in mm at start and end) from published tables, laid out as
trees of straight vessels. Sources:

- ARM, TRUNK: subject-specific systemic tree, Front Physiol 2021;12:734311, table 2, rows as printed (SEEN).
- CIRCLE: Shatri et al. 2017, doi 10.3889/oamjms.2017.160, mean diameters and lengths (SEEN); the length of the
  internal carotid from Baz 2021, doi 10.3390/medicina57080832 (SEEN).
- NECK VEINS: internal jugular areas of Magnano 2016, doi 10.1371/journal.pone.0149532 (SEEN), sinus diameters
  6.65 and 5.37 mm, doi 10.3868/j.issn.2096-0689.2024.01.003 (SEEN); lengths from MEMORY of anatomy, rounded.
- LEGS: silicone network of Matthys 2007, lengths and radii from MEMORY.
"""

from __future__ import annotations

import numpy as np

from geomprep.files.contents import FileContents
from geomprep.files.scale import hypotheses
from geomprep.files.size_arrays import size_arrays

# (parent row or −1, length mm, radius mm at start, radius mm at end)
ARM = [
    (-1, 52, 2.6, 2.38), (0, 398, 4.10, 2.28), (1, 220, 1.75, 1.40), (1, 67, 2.15, 2.15), (3, 70, 1.0, 1.0),
    (3, 170, 2.03, 1.80),
]  # fmt: skip
TRUNK = [
    (-1, 44, 10.92, 11.93), (0, 10, 11.57, 10.72), (1, 37, 8.81, 2.96), (2, 29, 4.05, 4.38), (2, 103, 3.12, 3.27),
    (3, 234, 2.49, 1.48), (3, 398, 4.10, 2.29), (6, 220, 1.75, 1.40), (6, 67, 2.15, 2.15), (4, 158, 2.68, 1.62),
    (4, 120, 2.04, 1.09), (1, 15, 10.96, 10.46), (1, 134, 3.94, 2.62), (12, 151, 2.62, 1.75), (12, 114, 1.77, 1.03),
    (11, 79, 10.78, 8.50), (15, 159, 9.09, 8.05), (16, 13, 8.15, 7.90), (16, 18, 6.14, 2.33), (18, 65, 2.75, 2.50),
]  # fmt: skip
CIRCLE = [
    (-1, 150, 1.895, 1.895), (0, 15.75, 1.675, 1.675), (0, 13.96, 1.045, 1.045), (2, 2.74, 0.75, 0.75),
    (0, 12.93, 0.61, 0.61), (4, 6.59, 0.995, 0.995), (5, 30.2, 1.635, 1.635),
]  # fmt: skip
NECK_VEINS = [
    (-1, 100, 2.9, 3.4), (0, 60, 3.325, 3.325), (0, 60, 2.685, 2.685), (1, 40, 3.2, 3.4), (2, 40, 2.6, 2.8),
    (3, 150, 3.64, 5.11), (4, 150, 2.99, 4.08),
]  # fmt: skip
LEGS = [
    (-1, 104, 7.8, 7.8), (0, 205, 3.9, 3.9), (1, 216, 3.38, 3.38), (2, 206, 2.31, 2.31), (0, 201, 4.02, 4.02),
    (4, 195, 3.34, 3.34), (5, 207, 2.26, 2.26), (3, 163, 1.55, 1.55), (3, 151, 1.53, 1.53), (6, 149, 1.58, 1.58),
]  # fmt: skip
# vessels, rows, voxel edge in mm, distance of points in mm
SETS = {
    "arm": ("arteries", ARM, 0.8, 0.8),
    "trunk": ("arteries", TRUNK, 1.0, 0.6),
    "circle": ("arteries", CIRCLE, 0.5, 0.25),
    "neck veins": ("veins", NECK_VEINS, 0.6, 0.5),
    "legs": ("arteries", LEGS, 1.2, 1.5),
}
METRES = {"m": 1.0, "cm": 0.01, "mm": 0.001, "um": 1e-6, "in": 0.0254}
COPIES = [(unit, meaning) for unit in METRES for meaning in ("radius", "diameter")]
COPIES += [(unit, "area") for unit in ("m", "cm", "mm", "um")]


def laid_out(rows, step, unit, meaning, name):
    """Straight vessels in a unit, each starting where its parent ends, with one size array."""
    points, sizes, ends = [], [], []
    for number, (parent, length, first, last) in enumerate(rows):
        start = np.zeros(3) if parent < 0 else ends[parent]
        turn = 2.4 * number  # about the golden angle: siblings part
        towards = np.array([0.4 * np.cos(turn), 0.4 * np.sin(turn), -1.0])
        along = np.linspace(0.0, 1.0, 1 + max(1, round(length / step)))[:, None]
        points.append(start + along * length * towards / np.linalg.norm(towards))
        sizes.append(first + along[:, 0] * (last - first))
        ends.append(points[-1][-1])
    scale = 1e-3 / METRES[unit]
    radius = np.concatenate(sizes) * scale
    size = {"radius": radius, "diameter": 2.0 * radius, "area": np.pi * radius**2}[meaning]
    return FileContents(
        name="set.vtp",
        sha256="0" * 64,
        format="made here",
        points=np.concatenate(points) * scale,
        connectivity=np.arange(len(radius)),
        offsets=np.cumsum([0] + [len(line) for line in points]),
        point_arrays={name: size},
    )


def ranked(name, unit, meaning, array, voxel=True):
    vessels, rows, edge, step = SETS[name]
    contents = laid_out(rows, step, unit, meaning, array)
    return hypotheses(contents, size_arrays(contents)[0], vessels, (edge * 1e-3,) * 3 if voxel else None)


def firsts(copies, array, voxel):
    """(best unit and meaning, true unit and meaning) for every set and copy."""
    for name in SETS:
        for unit, meaning in copies:
            best = ranked(name, unit, meaning, array.format(meaning), voxel)[0]
            yield (best.unit, best.meaning), (unit, meaning)


def test_right_hypothesis_is_ranked_first_on_scaled_copies():
    """14 copies of 5 sets, voxels stated and the array named for what it holds: at least 95 % (66.5 of 70)."""
    assert len(COPIES) == 14
    assert sum(best == true for best, true in firsts(COPIES, "vessel {}", voxel=True)) >= 67


def test_without_voxels_only_inch_and_centimetre_are_confused():
    """They differ by 2.54, less than vessels of one class do; metric copies are all told apart."""
    wrong = [(best, true) for best, true in firsts(COPIES, "vessel {}", voxel=False) if best != true]
    assert all({best[0], true[0]} == {"in", "cm"} and best[1] == true[1] for best, true in wrong)
    assert len(wrong) <= 7


def test_unit_without_help_of_the_name():
    """A name that says nothing of the meaning: the unit still comes first in at least 95 % of the copies."""
    assert sum(best[0] == true[0] for best, true in firsts(COPIES, "radius or diameter", voxel=True)) >= 67
