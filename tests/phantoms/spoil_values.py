"""Faults of radii, noise of positions, and the order in which lines stand in a file."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from phantoms.lines import Defect, Spoiled
from phantoms.truth import arc

__all__ = ["decaying_ends", "jagged", "on_voxels", "radius_faults", "radius_floor", "shuffled", "two_point_lines"]

_NOWHERE = np.full(3, np.nan)


def radius_faults(
    lines: Spoiled,
    rng: np.random.Generator,
    strength: float = 0.05,
    kinds: tuple[str, ...] = ("zero", "negative", "nan", "spike"),
) -> Spoiled:
    """Spoil the radius of single points and of runs of two or three.

    Label: kind ``radius``; `raw` are the points of one run; answer ``interpolate``. Facts: `fault`
    (one of `kinds`), `true_radius` (of each point), `segment`.

    Parameters
    ----------
    strength : float
        Part of all points.
    kinds : tuple of str
        ``zero``, ``negative``, ``nan``, ``spike`` (2 to 4 times or a half to a quarter of the truth).
    """
    left = round(strength * sum(len(line) for line in lines.lines))
    radius, taken, labels = lines.radius.copy(), np.zeros(len(lines.points), np.bool_), []
    drawn = [i for i in range(len(lines.lines)) if lines.line_segment[i] >= 0 and len(lines.lines[i]) > 6]
    for _ in range(100 * left):
        if left <= 0:
            break
        line = lines.lines[int(rng.choice(drawn))]
        count = min(int(rng.choice((1, 1, 2, 3))), left)
        first = int(rng.integers(0, len(line) - count + 1))
        run = line[first : first + count]
        if taken[line[max(0, first - 4) : first + count + 4]].any() or (lines.segment[run] < 0).any():
            continue
        fault = str(rng.choice(kinds))
        radius[run] = _faulty(radius[run], fault, rng)
        taken[run] = True
        left -= count
        facts = {"fault": fault, "true_radius": lines.true_radius[run], "segment": int(lines.segment[run[0]])}
        labels.append(Defect("radius", lines.points[run].mean(axis=0), 0.0, tuple(map(int, run)), "interpolate", facts))
    return replace(lines, radius=radius, defects=(*lines.defects, *labels))


def _faulty(radius: np.ndarray, fault: str, rng: np.random.Generator) -> np.ndarray:
    """Radii with a fault."""
    if fault == "spike":
        factor = rng.uniform(2.0, 4.0, len(radius))
        return radius * (factor if rng.random() < 0.5 else 1 / factor)
    return {"zero": 0 * radius, "negative": -radius, "nan": np.nan * radius}[fault]


def decaying_ends(lines: Spoiled, rng: np.random.Generator, strength: float = 1.0, share: float = 0.7) -> Spoiled:
    """Let the radius fall to zero at open ends, as distance maps do.

    Label: kind ``radius``; `raw` are the points from the tip inwards; answer ``interpolate``. Facts: `fault`
    (``end decay``), `true_radius`.

    Parameters
    ----------
    strength : float
        Length of the decay in radii.
    share : float
        Part of the open ends.
    """
    radius, labels = lines.radius.copy(), []
    for tip in lines.open_points():
        if rng.random() > share:
            continue
        line = next(line for line in lines.lines if tip in line[[0, -1]])
        line = line if line[0] == tip else line[::-1]
        away = arc(lines.points[line])
        length = strength * float(np.nanmedian(np.abs(lines.radius[line])))
        run = line[away < length]
        if lines.segment[tip] < 0 or len(run) == len(line):
            continue
        radius[run] *= away[: len(run)] / length
        facts = {"fault": "end decay", "true_radius": lines.true_radius[run]}
        labels.append(Defect("radius", lines.points[tip], 0.0, tuple(map(int, run)), "interpolate", facts))
    return replace(lines, radius=radius, defects=(*lines.defects, *labels))


def radius_floor(lines: Spoiled, rng: np.random.Generator, strength: float = 0.8) -> Spoiled:
    """Raise all smaller radii to one value, as partial volume does.

    Label: kind ``radius``; `raw` are the points raised; answer ``report``. Facts: `fault` (``floor``), `floor` (m).

    Parameters
    ----------
    strength : float
        The floor in mm.
    """
    floor = 1e-3 * strength
    low = np.flatnonzero(lines.radius < floor * 0.999)
    if len(low) == 0:
        return lines
    radius = lines.radius.copy()
    radius[low] = floor * rng.uniform(0.999, 1.001, len(low))
    facts = {"fault": "floor", "floor": floor}
    label = Defect("radius", _NOWHERE, 0.0, tuple(map(int, low)), "report", facts)
    return replace(lines, radius=radius).with_defect(label)


def jagged(lines: Spoiled, rng: np.random.Generator, strength: float = 0.15) -> Spoiled:
    """Move every place at random; points at one place move together.

    Label: kind ``jagged``; answer ``smooth``. Facts: `sigma` (m, per axis).

    Parameters
    ----------
    strength : float
        Standard deviation per axis in mm.
    """
    _, place = np.unique(lines.points, axis=0, return_inverse=True)
    moves = rng.normal(0.0, 1e-3 * strength, (int(place.max()) + 1, 3))
    label = Defect("jagged", _NOWHERE, 0.0, (), "smooth", {"sigma": 1e-3 * strength})
    return replace(lines, points=lines.points + moves[place.ravel()]).with_defect(label)


def on_voxels(lines: Spoiled, rng: np.random.Generator, strength: float = 0.5) -> Spoiled:
    """Move every point to the centre of its voxel; points of one line in one voxel become one.

    Label: kind ``jagged``; answer ``smooth``. Facts: `sigma` (m, per axis: voxel / √12), `voxel`.

    Parameters
    ----------
    strength : float
        Edge of a voxel in mm.
    """
    voxel = 1e-3 * strength
    shift = rng.uniform(0, voxel, 3)
    points = np.round((lines.points - shift) / voxel) * voxel + shift
    kept = []
    for line in lines.lines:
        new = np.append(True, (np.diff(points[line], axis=0) != 0).any(axis=1))
        new[-1] = True
        if not (points[line[-1]] != points[line[np.flatnonzero(new)[-2]]]).any() and new.sum() > 2:
            new[np.flatnonzero(new)[-2]] = False
        kept.append(line[new])
    label = Defect("jagged", _NOWHERE, 0.0, (), "smooth", {"sigma": voxel / np.sqrt(12), "voxel": voxel})
    return replace(lines, points=points, lines=tuple(kept)).with_defect(label)


def shuffled(lines: Spoiled, rng: np.random.Generator) -> Spoiled:
    """Put the lines in random order and turn half of them round."""
    order = rng.permutation(len(lines.lines))
    flip = rng.random(len(order)) < 0.5
    return replace(
        lines,
        lines=tuple(lines.lines[i][::-1] if turn else lines.lines[i] for i, turn in zip(order, flip, strict=True)),
        line_segment=lines.line_segment[order],
        line_class=lines.line_class[order],
    )


def two_point_lines(lines: Spoiled, rng: np.random.Generator) -> Spoiled:
    """Cut all lines into lines of two points that share their points, in random order and direction."""
    counts = [len(line) - 1 for line in lines.lines]
    pieces = np.concatenate([np.column_stack((line[:-1], line[1:])) for line in lines.lines])
    cut = replace(
        lines,
        lines=tuple(pieces),
        line_segment=np.repeat(lines.line_segment, counts),
        line_class=np.repeat(lines.line_class, counts),
    )
    return shuffled(cut, rng)
