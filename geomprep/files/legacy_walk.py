"""A walk through the sections of a VTK legacy file, each held against the bytes that are there."""

from __future__ import annotations

import re
from urllib.parse import unquote

from geomprep.errors import FileError
from geomprep.files.layout import Declared
from geomprep.files.number_text import end_of_numbers

__all__ = ["Walk"]

_BITS = {
    b"bit": (1, "u"),
    b"unsigned_char": (8, "u"),
    b"char": (8, "i"),
    b"signed_char": (8, "i"),
    b"unsigned_short": (16, "u"),
    b"short": (16, "i"),
    b"unsigned_int": (32, "u"),
    b"int": (32, "i"),
    b"unsigned_long": (64, "u"),
    b"long": (64, "i"),
    b"vtktypeint64": (64, "i"),
    b"vtktypeuint64": (64, "u"),
    b"vtkidtype": (32, "i"),  # written as 32 bits, whatever the machine's own type is
    b"float": (32, "f"),
    b"double": (64, "f"),
}
_LINE = re.compile(rb"[^\n]*\n?")


class Walk:
    """Position in the bytes of one file, and what was declared so far.

    Attributes
    ----------
    name : str
    binary : bool
    version : (int, int)
    n_points : int
    n_bytes : int
        Bytes that all arrays take when read.
    point_arrays, cell_arrays : list of Declared
    """

    def __init__(self, name: str, data: bytes, position: int, binary: bool, version: tuple[int, int]) -> None:
        self.name, self.binary, self.version = name, binary, version
        self.n_points = self.n_bytes = 0
        self.point_arrays: list[Declared] = []
        self.cell_arrays: list[Declared] = []
        self._data, self._position = data, position
        self._rows: int | None = None
        self._arrays: list[Declared] = []

    def words(self) -> list[bytes] | None:
        """Words of the next line that is not empty; None at the end."""
        while self._position < len(self._data):
            match = _LINE.match(self._data, self._position, self._position + 4096)
            line = match[0] if match else b""
            self._position += len(line)
            if line.strip():
                return line.split()
        return None

    def whole(self, words: list[bytes], place: int, what: str) -> int:
        """Whole number from 0 up at a place of a line."""
        text = words[place] if place < len(words) else b""
        if not text.isdigit() or len(text) > 18:
            shown = text[:30].decode("ascii", "backslashreplace")
            raise FileError(self.name, f"{what}: '{shown}' is no count; the file is damaged, write it anew")
        return int(text)

    def type_of(self, words: list[bytes], place: int) -> bytes:
        """Type of numbers at a place of a line."""
        kind = words[place].lower() if place < len(words) else b""
        if kind not in _BITS:
            shown = kind[:30].decode("ascii", "backslashreplace")
            raise FileError(self.name, f"'{shown}' is no type of numbers; leave arrays of texts out, or write it anew")
        return kind

    def block(self, count: int, kind: bytes, what: str) -> None:
        """Go on behind so many numbers of one type."""
        bits, letter = _BITS[kind]
        self.n_bytes += (count * bits + 7) // 8
        if not self.binary:
            span = (self._position, len(self._data))
            self._position = end_of_numbers(self.name, self._data, span, count, what, letter)
            return
        size = (count * bits + 7) // 8
        left = len(self._data) - self._position
        if size > left:
            raise FileError(
                self.name, f"{what}: {size} bytes are declared, only {left} are there; cut short, write it anew"
            )
        self._position += size

    def enter(self, key: bytes, rows: int, n_cells: int) -> None:
        """Begin the arrays on points or on cells."""
        needed = self.n_points if key == b"POINT_DATA" else n_cells
        if rows != needed:
            raise FileError(
                self.name, f"{key.decode()} {rows}, but there are {needed}; the file is damaged, write it anew"
            )
        self._rows = rows
        self._arrays = self.point_arrays if key == b"POINT_DATA" else self.cell_arrays

    def array(self, words: list[bytes], columns: int, kind: bytes, rows: int | None = None) -> None:
        """One array of the section entered; before any section it belongs to the whole file."""
        label = unquote(words[1].decode("utf-8", "replace")) if len(words) > 1 else ""
        if self._rows is None:
            if rows is None:
                raise FileError(
                    self.name, f"array '{label}' stands before POINT_DATA and CELL_DATA; write the file anew"
                )
        elif rows is None:
            rows = self._rows
        elif rows != self._rows:
            raise FileError(self.name, f"array '{label}' has {rows} rows; {self._rows} are needed")
        if self._rows is not None:
            self._arrays.append(Declared(label, columns))
        self.block(columns * (rows or 0), kind, f"array '{label}'")

    def skip_metadata(self) -> None:
        """Go on behind a METADATA part, which an empty line ends."""
        end = self._data.find(b"\n\n", self._position - 1)
        self._position = len(self._data) if end < 0 else end + 2
