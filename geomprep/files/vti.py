"""VTK XML ImageData, ``.vti``."""

from __future__ import annotations

import math
import re
from xml.parsers import expat

from geomprep.errors import FileError
from geomprep.files.layout import Declared
from geomprep.files.shape_reading import ImageLayout
from geomprep.files.xml_blocks import Blocks
from geomprep.files.xml_tags import ArrayTag, Tags, number_of

__all__ = ["layout"]

_LARGEST = 1 << 31


class _Collector:
    """Handlers of the XML parser: the tags up to the appended data."""

    def __init__(self, data: bytes, parser: expat.XMLParserType) -> None:
        self.data, self.parser, self.path = data, parser, [""]
        self.tags = Tags()
        self.image: dict[str, str] = {}
        self.pieces: list[dict[str, str]] = []
        self.arrays: list[ArrayTag] = []

    def start(self, element: str, attributes: dict[str, str]) -> None:
        """Take a start tag in."""
        parent = self.path[-1]
        self.path.append(element)
        if not parent:
            self.tags.root = {"root": element, **attributes}
        elif element == "ImageData":
            self.image, self.tags.kind = attributes, element
        elif element == "Piece":
            self.pieces.append(attributes)
        elif element in ("DataArray", "Array"):
            first = self.data.find(b">", self.parser.CurrentByteIndex) + 1
            last = self.data.find(b"<", first)
            self.arrays.append(ArrayTag(parent, attributes, (first, len(self.data) if last < 0 else last)))
        elif element == "AppendedData":
            self.tags.encoding = attributes.get("encoding", "base64")

    def end(self, _: str) -> None:
        """Take an end tag in."""
        self.path.pop()


def layout(name: str, data: bytes) -> ImageLayout:
    """Return the shape of the image and its arrays; raise FileError where the bytes do not hold them."""
    found = _tags(name, data)
    extent = _extent(name, found)
    shape = tuple(last - first + 1 for first, last in zip(extent[::2], extent[1::2], strict=True))
    sizes = {"PointData": math.prod(shape), "CellData": math.prod(side - 1 for side in shape)}
    blocks = Blocks(name, data, found.tags)
    declared: dict[str, list[Declared]] = {section: [] for section in sizes}
    for tag in found.arrays:
        numbers = tag.section in sizes and tag.attributes.get("type") != "String"
        columns = number_of(name, tag.attributes, "NumberOfComponents", 1)
        blocks.values(tag, sizes[tag.section] * columns if numbers else None)
        if numbers:
            declared[tag.section].append(Declared(tag.name, columns))
    blocks.check_appended()
    return ImageLayout(
        "VTK XML ImageData",
        "vtkXMLImageDataReader",
        point_arrays=tuple(declared["PointData"]),
        cell_arrays=tuple(declared["CellData"]),
        later=tuple(blocks.later),
        n_bytes=blocks.n_bytes,
        shape=(shape[0], shape[1], shape[2]),
    )


def _tags(name: str, data: bytes) -> _Collector:
    """All tags; the place of the appended data in them."""
    opening = re.search(rb"<AppendedData\b[^>]*>\s*_", data)
    parser = expat.ParserCreate()
    found = _Collector(data, parser)
    parser.StartElementHandler, parser.EndElementHandler = found.start, found.end

    def refuse(*_: object) -> None:
        raise FileError(name, "declares a document type; it is refused, write the file without it")

    parser.StartDoctypeDeclHandler = refuse
    try:
        parser.Parse(data[: opening.end()] if opening else data, opening is None)
    except expat.ExpatError as error:
        raise FileError(
            name, f"is no well-formed XML ({expat.ErrorString(error.code)}); cut short or damaged, write it anew"
        ) from None
    found.tags.appended = opening.end() if opening else -1
    said = found.tags.root.get("type", "")
    if found.tags.root.get("root") != "VTKFile" or said != "ImageData" or not found.image:
        raise FileError(
            name, f"holds '{said or found.tags.root.get('root')}', not ImageData; write the mask as an image"
        )
    return found


def _extent(name: str, found: _Collector) -> list[int]:
    """First and last point along each axis."""
    text = found.image.get("WholeExtent", "")
    if len(found.pieces) != 1 or found.pieces[0].get("Extent", "").split() != text.split():
        raise FileError(name, f"has {len(found.pieces)} pieces or a part of the extent; write the image as one piece")
    if not re.fullmatch(r"\s*(-?\d{1,9}\s+){5}-?\d{1,9}\s*", text):
        raise FileError(name, f"WholeExtent='{text[:60]}' is not six whole numbers; the file is damaged, write it anew")
    extent = [int(word) for word in text.split()]
    sides = [last - first + 1 for first, last in zip(extent[::2], extent[1::2], strict=True)]
    if min(sides) < 1 or math.prod(sides) > _LARGEST:
        raise FileError(name, f"WholeExtent='{text}' holds no voxel or too many; the file is damaged, write it anew")
    return extent
