"""What a file's own header declares, found by us and compared with what the reader gave back."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from geomprep.errors import FileError
from geomprep.files.contained import Parsed
from geomprep.findings import Finding

__all__ = ["Declared", "Layout", "compare", "unique"]


@dataclass(frozen=True)
class Declared:
    """One array on points or cells as the header declares it.

    Attributes
    ----------
    name : str
        Name; empty where the file gives none.
    components : int
        Values per row.
    """

    name: str
    components: int


@dataclass(frozen=True)
class Layout:
    """What the header of one file declares.

    Attributes
    ----------
    words : str
        What the file is, for people.
    reader : str
        Reader of the child's library.
    n_points : int or None
        Number of points, None where the header does not say.
    cells : dict of str to (int, int or None)
        Per section of cells: their number, and the point numbers in all of them.
    point_arrays, cell_arrays : tuple of Declared, or None
        Numeric arrays, None where the header does not say.
    later : tuple of callables
        Longer checks of the text, made while the child parses.
    n_bytes : int
        Bytes that all arrays take when they are read, as far as the header says.
    findings : tuple of Finding
        What is not used.
    """

    words: str
    reader: str
    n_points: int | None = None
    cells: dict[str, tuple[int, int | None]] = field(default_factory=dict)
    point_arrays: tuple[Declared, ...] | None = None
    cell_arrays: tuple[Declared, ...] | None = None
    later: tuple[Callable[[], None], ...] = ()
    n_bytes: int = 0
    findings: tuple[Finding, ...] = ()


def unique(name: str, kind: str, names: list[str]) -> None:
    """Raise where an array has no name, or two have the same: one would be lost on reading."""
    if "" in names:
        raise FileError(name, f"array {names.index('')} on {kind}s has no name; name it")
    for key in names:
        if names.count(key) > 1:
            raise FileError(name, f"two {kind} arrays are named '{key}'; rename one of them")


def compare(name: str, layout: Layout, parsed: Parsed) -> None:
    """Raise where the reader gave back anything else than the header declares."""
    points = parsed.one("points")
    n_points = 0 if points is None else len(points)
    if layout.n_points is not None and n_points != layout.n_points:
        raise _differs(name, "points", layout.n_points, n_points)
    for section, (n_cells, n_numbers) in layout.cells.items():
        got = parsed.answer["counts"].get(section, [0, 0])
        if got[0] != n_cells:
            raise _differs(name, section, n_cells, got[0])
        if n_numbers is not None and got[1] != n_numbers:
            raise _differs(name, f"point numbers in {section}", n_numbers, got[1])
    for kind, declared in (("point", layout.point_arrays), ("cell", layout.cell_arrays)):
        if declared is not None:
            _compare_arrays(name, kind, declared, parsed)


def _compare_arrays(name: str, kind: str, declared: tuple[Declared, ...], parsed: Parsed) -> None:
    """Raise where an array of the header did not come back, or came back with other columns."""
    got = {key: 1 if array.ndim == 1 else array.shape[1] for key, array in parsed.named(f"{kind} array")}
    for array in declared:
        if array.name not in got:
            raise FileError(name, f"{kind} array '{array.name}' is declared but was not read; write the file anew")
        if got[array.name] != array.components:
            raise _differs(name, f"components of {kind} array '{array.name}'", array.components, got[array.name])


def _differs(name: str, what: str, declared: int, got: int) -> FileError:
    """The error for two numbers that should be one."""
    return FileError(name, f"declares {declared} {what}, but {got} were read; the file is damaged, write it anew")
