"""The truth a sample was made from, and the counts that a build of it must find."""

from __future__ import annotations

import json
from collections import Counter
from pathlib import Path
from typing import Any

import numpy as np

from maker.curves import Floats
from maker.tree import Phantom, Segment

__all__ = ["counts", "truth", "write_names", "write_truth"]


def counts(phantom: Phantom) -> dict[str, int]:
    """Numbers of the graph of nodes and segments; loops = segments − nodes + components."""
    degree = Counter(end for segment in phantom.segments for end in (segment.start, segment.end))
    leader = {node: node for node in phantom.nodes}

    def root(node: str) -> str:
        while leader[node] != node:
            node = leader[node]
        return node

    for segment in phantom.segments:
        leader[root(segment.start)] = root(segment.end)
    components = len({root(node) for node in leader})
    return {
        "nodes": len(degree),
        "segments": len(phantom.segments),
        "components": components,
        "loops": len(phantom.segments) - len(degree) + components,
        "open_ends": sum(number == 1 for number in degree.values()),
    }


def truth(phantom: Phantom) -> dict[str, Any]:
    """Everything known about a sample, as plain lists and numbers in its own unit."""
    return {
        "sample": phantom.name,
        "length_unit": phantom.unit,
        "frame": "LPS",
        "counts": counts(phantom),
        "nodes": [{"name": name, "position": place.tolist()} for name, place in phantom.nodes.items()],
        "segments": [_segment(segment) for segment in phantom.segments],
    }


def _segment(segment: Segment) -> dict[str, Any]:
    """One segment: `length` along the smooth curve, `drawn_length` along the written points."""
    return {
        "name": segment.name,
        "from": segment.start,
        "to": segment.end,
        "length": round(segment.length, 5),
        "drawn_length": round(_drawn_length(segment.points), 5),
        "radius_at_from": float(segment.radius[0]),
        "radius_at_to": float(segment.radius[-1]),
        "minimum_radius": float(segment.radius.min()),
    }


def _drawn_length(points: Floats) -> float:
    """Length of a poly-line."""
    return float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum())


def write_truth(content: dict[str, Any], folder: Path) -> None:
    """Write ``truth.json``, one node, segment or defect per line."""
    lines = []
    for key, value in content.items():
        if isinstance(value, list):
            rows = ",\n".join("    " + json.dumps(row) for row in value)
            lines.append(f"  {json.dumps(key)}: [\n{rows}\n  ]")
        else:
            lines.append(f"  {json.dumps(key)}: {json.dumps(value)}")
    _write(folder / "truth.json", "{\n" + ",\n".join(lines) + "\n}\n")


def write_names(phantom: Phantom, folder: Path, decimals: int) -> None:
    """Write ``names.csv``: the vessel name of each segment and a place on it."""
    rows = ["name,x,y,z"]
    for segment in phantom.segments:
        x, y, z = segment.points[len(segment.points) // 2]
        rows.append(f"{segment.name},{x:.{decimals}f},{y:.{decimals}f},{z:.{decimals}f}")
    _write(folder / "names.csv", "\n".join(rows) + "\n")


def _write(path: Path, text: str) -> None:
    """Write text with one kind of line end on every system."""
    path.write_text(text, encoding="utf-8", newline="\n")
