"""Read files: the one entry for every format."""

from __future__ import annotations

import hashlib
import os
import stat
from collections.abc import Sequence
from contextlib import ExitStack
from dataclasses import replace
from pathlib import Path

import numpy as np

from geomprep.errors import FileError
from geomprep.files.contained import Child, Parsed, ReadLimits
from geomprep.files.contents import AnyArray, FileContents
from geomprep.files.formats import Format, format_of
from geomprep.files.layout import Layout, compare
from geomprep.files.structure import checked_arrays, checked_lines, checked_points
from geomprep.findings import Finding, Severity

__all__ = ["Reading", "read_file", "read_files", "start_reading"]

_DEFAULT_LIMITS = ReadLimits()
_VTK_LINES = (3, 4)  # VTK_LINE and VTK_POLY_LINE
_VTK_VERTICES = (1, 2)  # VTK_VERTEX and VTK_POLY_VERTEX


class Reading:
    """A reading that has begun; :meth:`result` ends it. Made by :func:`start_reading`."""

    def __init__(self, path: str | Path, limits: ReadLimits) -> None:
        self.name = _shown(str(path))
        self._given, self._path = str(path), Path(path)
        self._format = format_of(self._path, self.name)
        self._stamp = _stamp(self._path, self.name)
        self._child = Child(self._format.library, self.name, limits)

    def __enter__(self) -> Reading:
        """Return itself."""
        return self

    def __exit__(self, *_: object) -> None:
        """End the child process, whatever happened."""
        self.close()

    def close(self) -> None:
        """End the child process and free what it holds."""
        self._child.close()

    def result(self) -> FileContents:
        """Return the contents.

        Raises
        ------
        FileError
            The file cannot be read, or says something impossible.
        """
        with self:
            data = _bytes(self._path, self.name)
            layout = self._format.layout(self.name, data)
            self._child.order(self._path, layout.reader)
            digest = hashlib.sha256(data).hexdigest()
            for check in layout.later:
                check()
            del data
            parsed = self._child.result()
            if _stamp(self._path, self.name) != self._stamp:
                raise FileError(self.name, "was changed while it was read; read it again")
            compare(self.name, layout, parsed)
            contents = _assembled(self.name, self._format, layout, parsed)
            return replace(contents, name=self._given, sha256=digest)


def start_reading(path: str | Path, *, limits: ReadLimits = _DEFAULT_LIMITS) -> Reading:
    """Begin to read a file: its child process loads the reader while the caller does other work.

    Parameters
    ----------
    path : str or Path
        File to read.
    limits : ReadLimits
        What reading may cost.

    Returns
    -------
    Reading
        Its ``result()`` gives the contents and ``close()`` gives it up; it is a context
        manager, too.

    Raises
    ------
    FileError
        The file is missing, empty, no ordinary file, or of unknown suffix.

    Examples
    --------
    >>> start_reading("no such file.vtp")
    Traceback (most recent call last):
    geomprep.errors.FileError: no such file.vtp: there is no such file; check name and folder
    """
    return Reading(path, limits)


def read_file(path: str | Path, *, limits: ReadLimits = _DEFAULT_LIMITS) -> FileContents:
    """Read the lines of a file with all arrays on points and lines.

    The file is parsed in a child process by VTK's own reader (meshio for other mesh
    formats), bounded in memory and time; what the header declares is found by a second,
    independent look at the bytes and must agree with what the reader gives back.

    Parameters
    ----------
    path : str or Path
        File with one of the suffixes in :data:`geomprep.files.FORMATS`.
    limits : ReadLimits
        What reading may cost.

    Returns
    -------
    FileContents

    Raises
    ------
    FileError
        One line with the file, its fault and the way out: missing, empty, a folder,
        unknown suffix, damaged, without lines, coordinates that are not finite, ...

    Examples
    --------
    >>> read_file("arteries.doc")
    Traceback (most recent call last):
    geomprep.errors.FileError: arteries.doc: suffix '.doc' is unknown; one of .vtk, ... is needed
    """
    return start_reading(path, limits=limits).result()


def read_files(paths: Sequence[str | Path], *, limits: ReadLimits = _DEFAULT_LIMITS) -> list[FileContents]:
    """Read several files, with as many child processes at once as there are processors.

    Parameters
    ----------
    paths : sequence of str or Path
        Files to read; an empty sequence gives an empty list.
    limits : ReadLimits
        What reading each may cost.

    Returns
    -------
    list of FileContents
        In the order of `paths`.

    Raises
    ------
    FileError
        The first file in order that cannot be read.

    Examples
    --------
    >>> read_files([])
    []
    """
    at_once = max(2, os.cpu_count() or 1)
    contents: list[FileContents] = []
    with ExitStack() as stack:
        started: list[Reading] = []
        for number in range(len(paths)):
            ahead = paths[len(started) : number + at_once]
            started += [stack.enter_context(start_reading(path, limits=limits)) for path in ahead]
            contents.append(started[number].result())
    return contents


def _shown(name: str) -> str:
    """A file name as it can stand in one line."""
    return name if name.isprintable() else ascii(name)[1:-1]


def _stamp(path: Path, name: str) -> tuple[int, ...]:
    """Identity of a file's bytes; raises where there are none to read."""
    try:
        status = path.stat()
    except FileNotFoundError:
        raise FileError(name, "there is no such file; check name and folder") from None
    except (OSError, ValueError) as error:
        raise FileError(name, f"cannot be read ({_reason(error)}); check name, folder and rights") from None
    if stat.S_ISDIR(status.st_mode):
        raise FileError(name, "is a folder; name a file in it")
    if not stat.S_ISREG(status.st_mode):
        raise FileError(name, "is no ordinary file (a pipe or a device); copy its content into a file")
    if status.st_size == 0:
        raise FileError(name, "is empty (0 bytes); write it anew")
    return status.st_dev, status.st_ino, status.st_size, status.st_mtime_ns, status.st_ctime_ns


def _bytes(path: Path, name: str) -> bytes:
    """All bytes of the file."""
    try:
        return path.read_bytes()
    except (OSError, MemoryError) as error:
        raise FileError(name, f"cannot be read ({_reason(error)}); check rights and size") from None


def _reason(error: Exception) -> str:
    """Why the system refused, in its own words."""
    return getattr(error, "strerror", None) or str(error) or type(error).__name__


def _assembled(name: str, row: Format, layout: Layout, parsed: Parsed) -> FileContents:
    """Contents out of what the reader gave back, all checks made."""
    points = checked_points(name, parsed.one("points"))
    counts = parsed.answer["counts"]
    connectivity, offsets, rows, n_cells = _lines(parsed)
    other = n_cells - len(rows)
    if row.library == "meshio":
        vertices = counts.get("vertex", 0)
        other = sum(counts.values()) - len(rows) - vertices
    elif "verts" in counts:
        vertices = counts["verts"][1]
        other -= counts["verts"][0]
    else:
        types = parsed.one("types")
        vertices = 0 if types is None else int(np.isin(types, _VTK_VERTICES).sum())
        other -= vertices
    point_arrays = checked_arrays(name, "point", parsed.named("point array"), len(points))
    if row.library == "meshio":
        cell_arrays = checked_arrays(name, "cell", parsed.named("cell array"), len(rows))
    else:
        whole = checked_arrays(name, "cell", parsed.named("cell array"), n_cells)
        cell_arrays = {key: array[rows] for key, array in whole.items()}
    connectivity, offsets = checked_lines(name, connectivity, offsets, len(points))
    return FileContents(
        name=name,
        sha256="",
        format=layout.words,
        points=points,
        connectivity=connectivity,
        offsets=offsets,
        point_arrays=point_arrays,
        cell_arrays=cell_arrays,
        n_vertices_ignored=vertices,
        n_other_cells_ignored=other,
        findings=layout.findings + _left_out(vertices, other),
    )


def _lines(parsed: Parsed) -> tuple[AnyArray, AnyArray, AnyArray, int]:
    """Connectivity and offsets of the lines, their rows among all cells, number of all cells."""
    connectivity, offsets, types = parsed.one("connectivity"), parsed.one("offsets"), parsed.one("types")
    counts = parsed.answer["counts"]
    if connectivity is None or offsets is None or len(offsets) == 0:
        connectivity, offsets = np.empty(0, np.int64), np.zeros(1, np.int64)
    if "verts" in counts:
        first, n_lines = counts["verts"][0], counts["lines"][0]
        return connectivity, offsets, np.arange(first, first + n_lines), sum(each[0] for each in counts.values())
    if "cells" not in counts or types is None:
        return connectivity, offsets, np.arange(len(offsets) - 1), len(offsets) - 1
    rows = np.flatnonzero(np.isin(types, _VTK_LINES))
    lengths = np.diff(offsets)
    kept = np.repeat(np.isin(types, _VTK_LINES), lengths)
    return connectivity[kept], np.concatenate([[0], np.cumsum(lengths[rows])]), rows, len(types)


def _left_out(vertices: int, other: int) -> tuple[Finding, ...]:
    """Findings for cells that are no lines."""
    findings = []
    if vertices:
        message = f"{vertices} vertices are ignored; centrelines are lines"
        findings.append(Finding("ignored vertices", Severity.NOTE, message, value=vertices))
    if other:
        message = f"{other} cells that are no lines (polygons, strips, volumes) are ignored"
        findings.append(Finding("ignored cells", Severity.NOTE, message, value=other))
    return tuple(findings)
