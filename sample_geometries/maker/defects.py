"""Sample ``neck-veins-rough``: the neck veins with planted defects, each listed in its truth.

Kinds: ``gap`` (points left out between two new open ends), ``spur`` (a short line from the axis
that ends in or just outside the lumen), ``copy`` (a stretch drawn once more, beside the first and
sampled differently), ``zero radius`` and ``radius spike``.
"""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np

from maker.curves import Floats
from maker.lines import Lines, write_xml
from maker.neck_veins import neck_veins
from maker.tree import Phantom
from maker.truth import truth, write_names, write_truth

__all__ = ["rough_neck_veins", "write_neck_veins_rough"]

_DECIMALS = 3
_GAPS = (  # vessel, first and last point left out
    ("superior sagittal sinus", 96, 102),
    ("left sigmoid sinus", 20, 23),
    ("right condylar vein", 11, 13),
    ("right internal jugular vein", 70, 78),
)
_SPURS = (  # vessel, point it leaves from, length in local radii, own radius in mm
    ("superior sagittal sinus", 60, 1.15, 0.8),
    ("right sigmoid sinus", 25, 0.80, 0.7),
    ("left internal jugular vein", 40, 1.20, 0.9),
    ("straight sinus", 22, 1.30, 0.6),
)
_COPIES = (  # vessel, first and last point, distance beside it in local radii, points per point of the first
    ("superior sagittal sinus", 110, 170, 0.03, 0.8),
    ("left internal jugular vein", 60, 110, 0.30, 1.3),
)
_ZEROS = (("occipital sinus", 20, 22), ("left vertebral vein", 141, 141), ("left inferior anastomotic vein", 0, 0))
_SPIKES = (("right sigmoid sinus", 12, 12, 3.0), ("left internal jugular vein", 25, 26, 2.5))

Drawn = list[tuple[Floats, Floats]]
"""Points and radius of each line."""


def _place(points: Floats, first: int, last: int) -> list[float]:
    """Middle of a stretch, as written."""
    return [float(value) for value in np.round((points[first] + points[last]) / 2, _DECIMALS)]


def _sideways(points: Floats) -> Floats:
    """(n, 3) unit vectors square to a line, all on the same side of it."""
    tangent = np.gradient(points, axis=0)
    tangent /= np.linalg.norm(tangent, axis=1)[:, None]
    reference = np.eye(3)[np.argmin(np.abs(tangent).max(axis=0))]  # the axis the line never follows
    side = np.cross(tangent, reference)
    unit: Floats = side / np.linalg.norm(side, axis=1)[:, None]
    return unit


def _bad_radii(index: dict[str, int], drawn: Drawn, defects: list[dict[str, Any]]) -> None:
    """Plant zero radii and spikes (in place)."""
    for name, first, last in _ZEROS:
        points, radius = drawn[index[name]]
        radius[first : last + 1] = 0.0
        row = {"kind": "zero radius", "vessel": name, "position": _place(points, first, last)}
        defects.append({**row, "points": last - first + 1})
    for name, first, last, factor in _SPIKES:
        points, radius = drawn[index[name]]
        true = round(float(radius[first]), _DECIMALS)
        radius[first : last + 1] = np.round(radius[first : last + 1] * factor, _DECIMALS)
        row = {"kind": "radius spike", "vessel": name, "position": _place(points, first, last)}
        defects.append({**row, "points": last - first + 1, "factor": factor, "true_radius": true})


def _spurs(index: dict[str, int], drawn: Drawn, defects: list[dict[str, Any]]) -> Drawn:
    """Short lines that leave the axis of a vessel."""
    lines = []
    for name, at, share, own in _SPURS:
        points, radius = drawn[index[name]]
        length = share * radius[at]
        distance = np.linspace(0.0, length, max(3, round(length / 0.8) + 1))
        spur = np.round(points[at] + distance[:, None] * _sideways(points)[at], _DECIMALS)
        lines.append((spur, np.full(len(spur), own)))
        row = {"kind": "spur", "vessel": name, "position": points[at].tolist(), "length": round(float(length), 3)}
        defects.append({**row, "length_outside_lumen": round(max(0.0, float(length - radius[at])), 3)})
    return lines


def _copies(index: dict[str, int], drawn: Drawn, defects: list[dict[str, Any]]) -> Drawn:
    """Stretches drawn a second time, beside the first and sampled differently."""
    lines = []
    for name, first, last, share, density in _COPIES:
        points, radius = drawn[index[name]]
        steps = np.arange(len(points), dtype=np.float64)
        taken = np.linspace(first, last, round((last - first) * density) + 1)
        beside = points + share * radius[:, None] * _sideways(points)
        copy = np.column_stack([np.interp(taken, steps, beside[:, axis]) for axis in range(3)])
        lines.append((np.round(copy, _DECIMALS), np.round(np.interp(taken, steps, radius), _DECIMALS)))
        row = {"kind": "copy", "vessel": name, "position": _place(points, first, last)}
        defects.append({**row, "from": points[first].tolist(), "to": points[last].tolist(), "offset_in_radii": share})
    return lines


def _gaps(index: dict[str, int], drawn: Drawn, defects: list[dict[str, Any]]) -> Drawn:
    """Lines behind a gap; the lines before it are cut short (in place)."""
    lines = []
    for name, first, last in _GAPS:
        points, radius = drawn[index[name]]
        lines.append((points[last + 1 :], radius[last + 1 :]))
        drawn[index[name]] = points[:first], radius[:first]
        ends = points[first - 1], points[last + 1]
        row = {"kind": "gap", "vessel": name, "position": [round(float(v), _DECIMALS) for v in sum(ends) / 2]}
        width = round(float(np.linalg.norm(ends[1] - ends[0])), 3)
        defects.append({**row, "from": ends[0].tolist(), "to": ends[1].tolist(), "width": width})
    return lines


def rough_neck_veins(phantom: Phantom) -> tuple[Lines, list[dict[str, Any]]]:
    """Return the lines of a phantom, one per segment, with all defects planted, and the list of them."""
    drawn: Drawn = [(segment.points, segment.radius.copy()) for segment in phantom.segments]
    index = {segment.name: number for number, segment in enumerate(phantom.segments)}
    defects: list[dict[str, Any]] = []
    added = _spurs(index, drawn, defects) + _copies(index, drawn, defects)
    _bad_radii(index, drawn, defects)
    drawn += _gaps(index, drawn, defects) + added
    starts = np.cumsum([0] + [len(points) for points, _ in drawn])
    lines = tuple(np.arange(a, b) for a, b in pairwise(starts))
    return Lines(np.concatenate([p for p, _ in drawn]), np.concatenate([r for _, r in drawn]), lines), defects


def write_neck_veins_rough(folder: Path) -> None:
    """Write veins with defects, names and truth of the sample into an existing folder."""
    phantom = neck_veins()
    drawn, defects = rough_neck_veins(phantom)
    write_xml(drawn, folder / "veins.vtp", "radius", _DECIMALS)
    write_names(phantom, folder, _DECIMALS)
    content = truth(phantom)
    content["sample"] = "neck-veins-rough"
    content["points"], content["lines"] = len(drawn.points), len(drawn.lines)
    content["defects"] = defects
    write_truth(content, folder)
