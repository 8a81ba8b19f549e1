"""The tags of a VTK XML file, found without looking into its data."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from xml.parsers import expat

from geomprep.errors import FileError

__all__ = ["ArrayTag", "Piece", "Tags", "find_tags", "number_of"]

SECTIONS = ("PointData", "CellData", "Points", "Verts", "Lines", "Strips", "Polys", "Cells")
_INSIDE = {"VTKFile": {"PolyData", "UnstructuredGrid", "AppendedData", "FieldData"}, "Piece": {*SECTIONS}}


@dataclass
class ArrayTag:
    """One array as its tag describes it.

    Attributes
    ----------
    section : str
        Element that it stands in, such as ``PointData``.
    attributes : dict of str to str
        Of its tag.
    span : (int, int)
        Bytes of the text inside the tag up to the next tag.
    """

    section: str
    attributes: dict[str, str]
    span: tuple[int, int] | None = None

    @property
    def name(self) -> str:
        """Name of the array, empty where there is none."""
        return self.attributes.get("Name", "")


@dataclass
class Piece:
    """One piece of the data set: its attributes and arrays per section."""

    attributes: dict[str, str]
    sections: dict[str, list[ArrayTag]] = field(default_factory=dict)


@dataclass
class Tags:
    """All tags of one file.

    Attributes
    ----------
    root : dict of str to str
        Attributes of ``VTKFile``.
    kind : str
        Element of the data set, ``PolyData`` or ``UnstructuredGrid``; empty where there is none.
    pieces : list of Piece
    loose : list of ArrayTag
        Arrays that belong to the whole file.
    encoding : str
        Of the appended data: ``raw`` or ``base64``; empty where there is none.
    appended : int
        First byte of the appended data, behind the underscore; −1 where there is none.
    """

    root: dict[str, str] = field(default_factory=dict)
    kind: str = ""
    pieces: list[Piece] = field(default_factory=list)
    loose: list[ArrayTag] = field(default_factory=list)
    encoding: str = ""
    appended: int = -1


def number_of(name: str, attributes: dict[str, str], key: str, default: int | None = 0) -> int:
    """Return a whole number from 0 up out of the attributes of a tag.

    Raises
    ------
    FileError
        It is missing and has no default, or is no such number.

    Examples
    --------
    >>> number_of("a.vtp", {"NumberOfPoints": "5"}, "NumberOfPoints"), number_of("a.vtp", {}, "NumberOfVerts")
    (5, 0)
    """
    text = attributes.get(key, "" if default is None else str(default)).strip()
    if not re.fullmatch(r"\d{1,18}", text):
        raise FileError(name, f"{key}='{text}' is no whole number from 0 up; the file is damaged, write it anew")
    return int(text)


class _Collector:
    """Handlers of the XML parser."""

    def __init__(self, name: str) -> None:
        self.name, self.tags = name, Tags()
        self.path: list[str] = []
        self.array: ArrayTag | None = None

    def start(self, element: str, attributes: dict[str, str]) -> None:
        """Take a start tag in."""
        parent = self.path[-1] if self.path else ""
        self.path.append(element)
        if parent in _INSIDE and element not in _INSIDE[parent]:
            raise FileError(self.name, f"element '{element}' inside {parent} is unknown; the file is damaged")
        if not parent:
            self.tags.root = attributes
            if element != "VTKFile":
                raise FileError(self.name, f"is XML but no VTK file: its first element is '{element}', not 'VTKFile'")
        elif parent == "VTKFile" and element == "AppendedData":
            self.tags.encoding = attributes.get("encoding", "base64")
            self.tags.appended = 0
        elif parent == "VTKFile" and element != "FieldData":
            self.tags.kind = element
            if len(attributes.get("TimeValues", "").split()) > 1:
                raise FileError(self.name, "holds several time steps; write one of them as a file of its own")
        elif parent in ("PolyData", "UnstructuredGrid"):
            self._in_data_set(element, attributes)
        elif parent in (*SECTIONS, "FieldData"):
            self._in_section(parent, element, attributes)
        elif parent == "Piece":
            if element in self.tags.pieces[-1].sections:
                raise FileError(self.name, f"one piece has two elements '{element}'; the file is damaged")
            self.tags.pieces[-1].sections[element] = []

    def _in_data_set(self, element: str, attributes: dict[str, str]) -> None:
        """A piece, or arrays that belong to the whole file."""
        if element == "Piece":
            self.tags.pieces.append(Piece(attributes))
        elif element != "FieldData":
            raise FileError(self.name, f"element '{element}' inside the data set is unknown; the file is damaged")

    def _in_section(self, section: str, element: str, attributes: dict[str, str]) -> None:
        """One array of a section."""
        if element not in ("DataArray", "Array"):
            raise FileError(self.name, f"element '{element}' inside {section} is unknown; the file is damaged")
        if "TimeStep" in attributes:
            raise FileError(self.name, "holds several time steps; write one of them as a file of its own")
        self.array = ArrayTag(section, attributes)
        (self.tags.loose if section == "FieldData" else self.tags.pieces[-1].sections[section]).append(self.array)

    def end(self, element: str) -> None:
        """Take an end tag in."""
        self.path.pop()
        if element in ("DataArray", "Array"):
            self.array = None

    def doctype(self, *_: object) -> None:
        """No VTK file has one; entities in it could grow without bound."""
        raise FileError(self.name, "has a DOCTYPE, which no VTK file has; the file is refused")


def find_tags(name: str, data: bytes) -> Tags:
    """Return the tags of a VTK XML file; raise where it is none, or is no well-formed XML.

    The text of arrays is stepped over by the next ``<``, so that the cost does not grow
    with the data.

    Parameters
    ----------
    name : str
        Name of the file, for the message.
    data : bytes
        All bytes of the file.

    Raises
    ------
    FileError
        No XML, no VTK file, broken off, or with unknown elements.

    Examples
    --------
    >>> find_tags("a.vtp", b"hello")
    Traceback (most recent call last):
    geomprep.errors.FileError: a.vtp: is no VTK XML file: it starts with 'hello'; ...
    """
    if not data[:64].removeprefix(b"\xef\xbb\xbf").lstrip().startswith(b"<"):
        shown = data[:20].decode("ascii", "backslashreplace").replace("\n", " ")
        way = "rename it to .vtk" if data.startswith(b"# vtk") else "check what wrote it"
        raise FileError(name, f"is no VTK XML file: it starts with '{ascii(shown)[1:-1]}'; {way}")
    collector = _Collector(name)
    parser = expat.ParserCreate()
    parser.StartElementHandler, parser.EndElementHandler = collector.start, collector.end
    parser.StartDoctypeDeclHandler = collector.doctype
    position = 0
    try:
        while collector.tags.appended < 0 and position < len(data):
            position = _feed_next(parser, collector, data, position)
        if collector.tags.appended < 0:
            parser.Parse(b"", True)
    except expat.ExpatError as error:
        fault = expat.ErrorString(error.code)
        raise FileError(
            name, f"is no well-formed XML near byte {position} ({fault}); cut short or damaged, write it anew"
        ) from None
    if collector.tags.appended == 0:
        collector.tags.appended = _underscore(name, data, position)
    return collector.tags


def _feed_next(parser: expat.XMLParserType, collector: _Collector, data: bytes, position: int) -> int:
    """Feed the text up to the next tag (not that of arrays), then the tag; where the next text begins."""
    less = data.find(b"<", position)
    less = len(data) if less < 0 else less
    if collector.array is not None and collector.array.span is None:
        collector.array.span = (position, less)
    else:
        parser.Parse(data[position:less], False)
    greater = data.find(b">", less)
    after = len(data) if greater < 0 else greater + 1
    parser.Parse(data[less:after], False)
    return after


def _underscore(name: str, data: bytes, position: int) -> int:
    """First byte behind the underscore that opens the appended data."""
    mark = data.find(b"_", position)
    if mark < 0 or data[position:mark].strip():
        raise FileError(name, "the appended data do not begin with an underscore; cut short or damaged, write it anew")
    return mark + 1
