"""The data of arrays in a VTK XML file: where they lie and whether they can hold what is declared.

A block is its size (of 4 or 8 bytes) and the values; a compressed one begins with the
number of blocks, the size of each, that of the last, and the compressed size of each.
In base64 the sizes of a compressed block are a run of their own, padded by itself.
"""

from __future__ import annotations

import base64
import binascii
import string
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from geomprep.errors import FileError
from geomprep.files.number_text import end_of_numbers
from geomprep.files.xml_tags import ArrayTag, Tags, number_of

__all__ = ["Blocks"]

_TYPES = {f"{sign}{kind}{bits}": (bits // 8, letter)
          for sign, kind, letter, sizes in (("", "Int", "i", (8, 16, 32, 64)), ("U", "Int", "u", (8, 16, 32, 64)),
                                            ("", "Float", "f", (32, 64)))
          for bits in sizes}  # fmt: skip
_GROWTH = {"vtkZLibDataCompressor": 1032, "vtkLZ4DataCompressor": 255, "vtkLZMADataCompressor": 1 << 20}
_ALPHABET = (string.ascii_letters + string.digits + "+/").encode()


def _encoded(size: int) -> int:
    """Length of so many bytes in base64."""
    return 4 * (-(-size // 3))


@dataclass
class Blocks:
    """Bytes of one file and what its root says about them.

    Attributes
    ----------
    name : str
    data : bytes
    tags : Tags
    later : list of callables
        Longer checks of text, put off.
    used : list of (int, int, str)
        First byte, byte after the last, and owner of every appended block so far.
    n_bytes : int
        Bytes of all arrays when they are read.
    """

    name: str
    data: bytes
    tags: Tags
    later: list[Callable[[], None]] = field(default_factory=list)
    used: list[tuple[int, int, str]] = field(default_factory=list)
    n_bytes: int = 0

    def fault(self, what: str, text: str) -> FileError:
        """The error for a fault in one array."""
        return FileError(self.name, f"{what} {text}; the file is cut short or damaged, write it anew")

    def values(self, tag: ArrayTag, expected: int | None) -> int:
        """Return how many values an array holds, its bytes being there.

        Parameters
        ----------
        tag : ArrayTag
        expected : int or None
            Values that the counts of the header ask for; None where any number may be.

        Raises
        ------
        FileError
            Type or format unknown, or the bytes do not hold so many values.
        """
        what = f"{tag.section} array '{tag.name}'"
        type_name, form = tag.attributes.get("type", ""), tag.attributes.get("format", "ascii")
        if type_name == "String":
            size, kind = 1, "s"
        elif type_name in _TYPES:
            size, kind = _TYPES[type_name]
        else:
            raise self.fault(what, f"is of unknown type '{type_name}'")
        if form == "ascii":
            count = self._text(tag, expected, what, kind)
        elif form in ("binary", "appended"):
            count, rest = divmod(self._binary(tag, form, what), size)
            if rest or expected not in (None, count):
                needed = "whole values" if expected is None else f"{expected} values"
                raise self.fault(what, f"holds {count * size + rest} bytes, which are not {needed} of {type_name}")
        else:
            raise self.fault(what, f"has the unknown format '{form}'")
        self.n_bytes += count * size
        return count

    def _text(self, tag: ArrayTag, expected: int | None, what: str, kind: str) -> int:
        """Number of values written as text; a known number is checked later."""
        first, stop = tag.span or (0, 0)
        if kind == "s":
            return stop - first
        if expected is None:
            return end_of_numbers(self.name, self.data, (first, stop), None, what, kind)
        if 2 * expected - 1 > stop - first:
            raise self.fault(what, f"declares {expected} values, but has {stop - first} bytes of text")

        def check() -> None:
            end = end_of_numbers(self.name, self.data, (first, stop), expected, what, kind)
            if self.data[end:stop].strip():
                raise self.fault(what, f"holds more than the {expected} values declared")
            _check_small(self, tag, what)

        self.later.append(check)
        return expected

    def _binary(self, tag: ArrayTag, form: str, what: str) -> int:
        """Bytes of the values of an array that is not text."""
        if form == "appended":
            if self.tags.appended < 0:
                raise self.fault(what, "lies in appended data, but there are none")
            at = self.tags.appended + number_of(self.name, tag.attributes, "offset", None)
            if self.tags.encoding not in ("raw", "base64"):
                raise self.fault("AppendedData", f"has the unknown encoding '{self.tags.encoding}'")
            size, end = self._sizes(at, len(self.data), self.tags.encoding == "base64", what)
            self.used.append((at, end, what))
            return size
        first, stop = tag.span or (0, 0)
        text = self.data[first:stop]
        at, stop = first + len(text) - len(text.lstrip()), stop - (len(text) - len(text.rstrip()))
        size, end = self._sizes(at, max(at, stop), True, what)
        if end != stop:
            raise self.fault(what, f"has {stop - end} more bytes of text than its size says")
        return size

    def _sizes(self, at: int, stop: int, encoded: bool, what: str) -> tuple[int, int]:
        """Bytes of the values of the block at a place, and where the block ends."""
        compressor = self.tags.root.get("compressor", "")
        width = self._header_width()
        head = self._header(at, stop, 1, encoded, what)[0]
        if not compressor:
            end = at + (_encoded(width + head) if encoded else width + head)
            runs, size = [(at, end, width + head)], head
        else:
            if compressor not in _GROWTH:
                raise self.fault("VTKFile", f"names the unknown compressor '{compressor}'")
            if head > (stop - at) // width:
                raise self.fault(what, f"declares {head} compressed blocks, more than there are bytes")
            _, each, last, *packed = self._header(at, stop, 3 + head, encoded, what)
            size = head * each if last == 0 or head == 0 else (head - 1) * each + last
            if last > each or size > _GROWTH[compressor] * (sum(packed) + 64):
                raise self.fault(what, f"declares {size} bytes, more than {sum(packed)} compressed bytes can hold")
            sizes = width * (3 + head)
            middle = at + (_encoded(sizes) if encoded else sizes)
            end = middle + (_encoded(sum(packed)) if encoded else sum(packed))
            runs = [(at, middle, sizes), (middle, end, sum(packed))]
        if end > stop:
            raise self.fault(what, f"needs {end - at} bytes, only {max(0, stop - at)} are there")
        if encoded:
            self.later.append(lambda: self._check_base64(runs, what))
        return size, end

    def _header_width(self) -> int:
        """Bytes of one size in a header."""
        kind = self.tags.root.get("header_type", "UInt32")
        if kind not in ("UInt32", "UInt64"):
            raise self.fault("VTKFile", f"has the unknown header_type '{kind}'")
        return 4 if kind == "UInt32" else 8

    def _header(self, at: int, stop: int, count: int, encoded: bool, what: str) -> list[int]:
        """The first sizes of a block."""
        width, order = self._header_width(), self.tags.root.get("byte_order", "")
        if order not in ("LittleEndian", "BigEndian"):
            raise self.fault("VTKFile", f"has the byte_order '{order}', which is neither LittleEndian nor BigEndian")
        wanted = count * width
        piece = self.data[at : min(stop, at + (_encoded(wanted) if encoded else wanted))]
        if encoded:
            try:
                piece = base64.b64decode(piece, validate=True)
            except binascii.Error:
                raise self.fault(what, "has a header that is no base64") from None
        if len(piece) < wanted:
            raise self.fault(what, f"breaks off: {wanted} bytes of sizes are needed, {len(piece)} are there")
        dtype = ("<" if order == "LittleEndian" else ">") + f"u{width}"
        return [int(value) for value in np.frombuffer(piece, dtype, count)]

    def _check_base64(self, runs: list[tuple[int, int, int]], what: str) -> None:
        """Raise where a run holds a sign that is no base64, or ends too early."""
        for first, stop, size in runs:
            padding = -size % 3
            body = self.data[first : stop - padding].translate(None, _ALPHABET)
            if body or self.data[stop - padding : stop] != b"=" * padding:
                raise self.fault(what, "has a sign in it that is no base64")

    def check_appended(self) -> None:
        """Raise where appended blocks overlap, leave a gap or do not reach the end tag.

        A header size of the wrong width reads the right length from the wrong place;
        what gives it away is that the blocks no longer touch.
        """
        place = self.tags.appended
        if place < 0:
            return
        for first, end, what in sorted(self.used):
            if first != place:
                how = "overlaps another array" if first < place else f"leaves a gap of {first - place} bytes before it"
                raise self.fault(what, how)
            place = end
        closing = self.data[place:].split()
        if b"".join(closing) != b"</AppendedData></VTKFile>":
            raise self.fault("AppendedData", "do not end where its arrays end")


def _check_small(blocks: Blocks, tag: ArrayTag, what: str) -> None:
    """Raise where a number written as text does not fit its type (a reader would wrap it around)."""
    size, kind = _TYPES[tag.attributes["type"]]
    if kind == "f" or size > 2 or tag.span is None:
        return
    numbers = np.array(blocks.data[slice(*tag.span)].split() or [b"0"]).astype(np.float64)
    info = np.iinfo(f"{kind}{size}")
    if numbers.min() < info.min or numbers.max() > info.max:
        raise blocks.fault(what, f"holds a number outside {tag.attributes['type']}")
