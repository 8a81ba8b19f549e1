"""What is in a file, what is wrong with it, and which readings of its numbers fit."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np

from geomprep.case.open_ends import OpenEnds, find_open_ends
from geomprep.case.preview import Preview, preview_repairs
from geomprep.errors import FileError, InputError, Question
from geomprep.files import FileContents, read_file
from geomprep.files.meaning import Gate, gate
from geomprep.files.size_arrays import SizeArray
from geomprep.files.statement import InputStatement
from geomprep.findings import Finding, Severity

__all__ = ["ArraySummary", "Inspection", "inspect"]

_SHOWN_POINTS = 5


@dataclass(frozen=True)
class ArraySummary:
    """One array of a file: name, ``points`` or ``lines``, components, type, range, what it may be."""

    name: str
    place: str
    components: int
    type: str
    minimum: float | None
    maximum: float | None
    may_hold: str


@dataclass(frozen=True, eq=False)
class Inspection:
    """What was found in one file; nothing was changed or written.

    Attributes
    ----------
    file, sha256, format : str
    n_points, n_lines : int
    box : ((float, float, float), (float, float, float))
        Least and greatest coordinates of the points on lines, in the unit of the file.
    total_length : float
        In the unit of the file.
    ends : OpenEnds
        Open ends, rings and parts, by exactly equal coordinates.
    arrays : tuple of ArraySummary
    gate : Gate, optional
        Sizes, readings and questions; None where the file has no array that could hold sizes.
    questions : tuple of Question
        What a case has to state about this file.
    findings : tuple of Finding
        What is wrong or odd.
    preview : Preview
        What would be repaired if the best reading is the right one.
    """

    file: str
    sha256: str
    format: str
    n_points: int
    n_lines: int
    box: tuple[tuple[float, ...], tuple[float, ...]]
    total_length: float
    ends: OpenEnds
    arrays: tuple[ArraySummary, ...]
    gate: Gate | None
    questions: tuple[Question, ...]
    findings: tuple[Finding, ...]
    preview: Preview = field(default_factory=lambda: Preview("not looked at"))

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain numbers, texts, lists and dicts, ready for JSON."""
        readings = self.gate.hypotheses if self.gate else ()
        return {
            "file": self.file,
            "sha256": self.sha256,
            "format": self.format,
            "points": self.n_points,
            "lines": self.n_lines,
            "box": [list(corner) for corner in self.box],
            "total_length": self.total_length,
            "open_ends": len(self.ends.points),
            "parts": self.ends.n_parts,
            "independent_loops": self.ends.n_loops,
            "arrays": [vars(array) for array in self.arrays],
            "readings": [_plain(vars(reading)) for reading in readings],
            "questions": [_plain(vars(question)) for question in self.questions],
            "findings": [_plain(vars(finding)) for finding in self.findings],
            "repairs": {
                "read_as": self.preview.read_as,
                "repairs": [_plain(vars(repair)) for repair in self.preview.repairs],
            },
        }


def _plain(values: dict[str, Any]) -> dict[str, Any]:
    """Tuples as lists, severities as their word."""
    return {
        name: list(value) if isinstance(value, tuple) else str(value) if isinstance(value, Severity) else value
        for name, value in values.items()
    }


def inspect(
    file: str | Path,
    *,
    vessels: str | None = None,
    size_array: str | None = None,
    voxel: tuple[float, float, float] | None = None,
) -> Inspection:
    """Look into a file: contents, faults, and which unit and size meaning fit the numbers.

    Parameters
    ----------
    file : str or pathlib.Path
    vessels : str, optional
        ``arteries`` or ``veins``: published sizes of that class are used.
    size_array : str, optional
        Array that holds the sizes, where the file has several.
    voxel : tuple of float, optional
        Voxel edges of the image in metres; they help to tell units apart.

    Returns
    -------
    Inspection

    Raises
    ------
    FileError
        The file cannot be read or holds no lines.
    CaseError
        `size_array` is not in the file or holds no sizes.

    Examples
    --------
    >>> inspect("no-such-file.vtp")
    Traceback (most recent call last):
    geomprep.errors.FileError: no-such-file.vtp: there is no such file; check name and folder
    """
    if vessels not in (None, "arteries", "veins"):
        raise InputError(f"vessels = '{vessels}': must be arteries or veins")
    contents = read_file(file)
    statement = InputStatement(str(file), vessels=vessels, size_array=size_array, voxel=voxel)
    found = inspection_of(contents, statement)
    return replace(found, preview=preview_repairs(contents, statement, found.gate))


def inspection_of(contents: FileContents, statement: InputStatement, key: str = "input[0]") -> Inspection:
    """Return the inspection of a file that is read already."""
    findings = list(contents.findings)
    checked = None
    try:
        checked = gate(contents, statement, key=key)
        findings += checked.findings
    except FileError as error:
        findings.append(Finding("no sizes", Severity.ERROR, f"{statement.file}: {error.fault}"))
    used = np.asarray(contents.points, dtype=np.float64)[contents.connectivity]
    ends = find_open_ends(contents)
    findings += _line_findings(contents, ends)
    if checked:
        size = checked.size or (checked.candidates[0] if len(checked.candidates) == 1 else None)
        findings += _size_findings(contents, size)
    return Inspection(
        file=statement.file,
        sha256=contents.sha256,
        format=contents.format,
        n_points=contents.n_points,
        n_lines=contents.n_lines,
        box=(tuple(used.min(axis=0).tolist()), tuple(used.max(axis=0).tolist())),
        total_length=ends.total_length,
        ends=ends,
        arrays=_summaries(contents, checked),
        gate=checked,
        questions=checked.questions if checked else (),
        findings=tuple(findings),
    )


def _summaries(contents: FileContents, checked: Gate | None) -> tuple[ArraySummary, ...]:
    """One line per array."""
    sizes = {(array.name, array.place): array for array in (checked.candidates if checked else ())}
    found = []
    for place, arrays in (("points", contents.point_arrays), ("lines", contents.cell_arrays)):
        for name, values in arrays.items():
            components = 1 if values.ndim == 1 else values.shape[1]
            finite = values[np.isfinite(values)] if values.dtype.kind in "iuf" else values[:0]
            low, high = (float(finite.min()), float(finite.max())) if finite.size else (None, None)
            size = sizes.get((name, place))
            may = f"may hold {' or '.join(size.named)}" if size and size.named else ""
            found.append(ArraySummary(name, place, components, str(values.dtype), low, high, may))
    return tuple(found)


def _line_findings(contents: FileContents, ends: OpenEnds) -> list[Finding]:
    """Oddities of points and lines."""
    found = []
    unused = int((np.bincount(contents.connectivity, minlength=contents.n_points) == 0).sum())
    if unused:
        found.append(Finding("unused points", Severity.NOTE, f"{unused} points lie on no line and are not used"))
    if ends.n_zero_steps:
        message = f"{ends.n_zero_steps} steps of lines have no length: a point is repeated"
        found.append(Finding("repeated points", Severity.NOTE, message))
    if ends.n_parts > 1:
        message = (
            f"the lines make {ends.n_parts} parts that share no point; gaps, or vessels that lie apart "
            f"(the smallest has {ends.smallest_part} points)"
        )
        found.append(Finding("parts", Severity.WARNING, message))
    if not len(ends.points):
        found.append(Finding("open ends", Severity.WARNING, "no open end: blood can neither enter nor leave"))
    return found


def _size_findings(contents: FileContents, size: SizeArray | None) -> list[Finding]:
    """Sizes that no vessel can have."""
    if size is None:
        return []
    values = np.asarray(size.values, dtype=np.float64)
    bad = np.flatnonzero(~(np.isfinite(values) & (values > 0)))
    if not len(bad):
        return []
    shown = ", ".join(map(str, bad[:_SHOWN_POINTS].tolist())) + (", …" if len(bad) > _SHOWN_POINTS else "")
    message = f"'{size.name}' is zero, negative or no number on {len(bad)} of {len(values)} {size.place}: {shown}"
    return [Finding("bad sizes", Severity.ERROR, message)]
