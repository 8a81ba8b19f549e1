"""Poly-lines as text: the habits of the sample files and the two formats they are written in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np
import numpy.typing as npt

from maker.curves import Floats
from maker.tree import Phantom

__all__ = ["Lines", "private_copies", "repeated_trunks", "shared_points", "write_legacy", "write_xml"]


@dataclass(frozen=True, eq=False)
class Lines:
    """Points with a radius, and poly-lines as lists of point numbers."""

    points: Floats
    radius: Floats
    lines: tuple[npt.NDArray[np.int64], ...]


def shared_points(phantom: Phantom) -> Lines:
    """Habit: one poly-line per segment; lines that meet use the same point number.

    A shared point carries the largest radius of the segments that meet there.
    """
    node_number = {name: number for number, name in enumerate(phantom.nodes)}
    points, radius = [np.array(list(phantom.nodes.values()))], [np.zeros(len(node_number))]
    lines = []
    count = len(node_number)
    for segment in phantom.segments:
        inner = np.arange(count, count + len(segment.points) - 2)
        ends = node_number[segment.start], node_number[segment.end]
        lines.append(np.concatenate(([ends[0]], inner, [ends[1]])))
        points.append(segment.points[1:-1])
        radius.append(segment.radius[1:-1])
        np.maximum.at(radius[0], list(ends), segment.radius[[0, -1]])
        count += len(inner)
    return Lines(np.concatenate(points), np.concatenate(radius), tuple(lines))


def private_copies(phantom: Phantom) -> Lines:
    """Habit: one poly-line per segment, each with its own copy of its end points and its own radius there."""
    starts = np.cumsum([0] + [len(segment.points) for segment in phantom.segments])
    return Lines(
        np.concatenate([segment.points for segment in phantom.segments]),
        np.concatenate([segment.radius for segment in phantom.segments]),
        tuple(np.arange(first, last) for first, last in pairwise(starts)),
    )


def repeated_trunks(phantom: Phantom, routes: Sequence[Sequence[str]]) -> Lines:
    """Habit: one poly-line per route from an inlet to an outlet; what routes share is repeated exactly.

    Parameters
    ----------
    phantom : Phantom
    routes : sequence of sequence of str
        Names of the nodes along each route.

    Raises
    ------
    ValueError
        The routes leave out a segment.
    """
    drawn = shared_points(phantom)
    between = {(segment.start, segment.end): line for segment, line in zip(phantom.segments, drawn.lines, strict=True)}
    runs, used = [], set()
    for route in routes:
        pieces = [between[step] if step in between else between[step[::-1]][::-1] for step in pairwise(route)]
        used |= {frozenset(step) for step in pairwise(route)}
        runs.append(np.concatenate([pieces[0][:1], *(piece[1:] for piece in pieces)]))
    if len(used) != len(between):
        raise ValueError(f"the routes leave out {[pair for pair in between if frozenset(pair) not in used]}")
    taken = np.concatenate(runs)
    starts = np.cumsum([0] + [len(run) for run in runs])
    numbers = tuple(np.arange(first, last) for first, last in pairwise(starts))
    return Lines(drawn.points[taken], drawn.radius[taken], numbers)


def _rows(values: npt.NDArray[np.generic], form: str) -> list[str]:
    """Text of each row of an array."""
    return [" ".join(format(value, form) for value in np.atleast_1d(row)) for row in values]


def write_legacy(drawn: Lines, path: Path, title: str, size: tuple[str, Floats], decimals: int) -> None:
    """Write a legacy file, version 4.2, ASCII, POLYDATA with one point array.

    Parameters
    ----------
    drawn : Lines
    path : Path
    title : str
        Second line of the file.
    size : (str, (n,) array)
        Name and values of the point array.
    decimals : int
        Digits after the point.
    """
    form = f".{decimals}f"
    text = ["# vtk DataFile Version 4.2", title, "ASCII", "DATASET POLYDATA", f"POINTS {len(drawn.points)} double"]
    text += _rows(drawn.points, form)
    text.append(f"LINES {len(drawn.lines)} {sum(len(line) + 1 for line in drawn.lines)}")
    text += [" ".join(map(str, [len(line), *line.tolist()])) for line in drawn.lines]
    text += [f"POINT_DATA {len(drawn.points)}", f"SCALARS {size[0]} double 1", "LOOKUP_TABLE default"]
    text += _rows(size[1], form)
    path.write_text("\n".join(text) + "\n", encoding="ascii", newline="\n")


def _data_array(kind: str, name: str, rows: Sequence[str], components: int = 1) -> list[str]:
    """One array of an XML file."""
    head = f'<DataArray type="{kind}" Name="{name}" NumberOfComponents="{components}" format="ascii">'
    return [head, *rows, "</DataArray>"]


def write_xml(drawn: Lines, path: Path, size_name: str, decimals: int) -> None:
    """Write an XML poly-data file, ASCII, with the radius as point array.

    Parameters
    ----------
    drawn : Lines
    path : Path
    size_name : str
        Name of the point array that holds the radius.
    decimals : int
        Digits after the point.
    """
    form = f".{decimals}f"
    offsets = np.cumsum([len(line) for line in drawn.lines])
    text = [
        '<?xml version="1.0"?>',
        '<VTKFile type="PolyData" version="0.1" byte_order="LittleEndian">',
        "<PolyData>",
        f'<Piece NumberOfPoints="{len(drawn.points)}" NumberOfVerts="0" NumberOfLines="{len(drawn.lines)}"'
        ' NumberOfStrips="0" NumberOfPolys="0">',
        f'<PointData Scalars="{size_name}">',
        *_data_array("Float64", size_name, _rows(drawn.radius, form)),
        "</PointData>",
        "<Points>",
        *_data_array("Float64", "Points", _rows(drawn.points, form), 3),
        "</Points>",
        "<Lines>",
        *_data_array("Int64", "connectivity", [" ".join(map(str, line.tolist())) for line in drawn.lines]),
        *_data_array("Int64", "offsets", [" ".join(map(str, offsets.tolist()))]),
        "</Lines>",
        "</Piece>",
        "</PolyData>",
        "</VTKFile>",
    ]
    path.write_text("\n".join(text) + "\n", encoding="ascii", newline="\n")
