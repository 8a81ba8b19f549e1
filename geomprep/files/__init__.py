"""Files in and out: every format that holds lines, read in a contained way."""

from geomprep.files.contained import ReadLimits
from geomprep.files.contents import FileContents
from geomprep.files.formats import FORMATS, Format, format_of
from geomprep.files.masks import MaskContents, read_mask
from geomprep.files.reading import Reading, read_file, read_files, start_reading
from geomprep.files.surfaces import SurfaceContents, read_surface
from geomprep.files.writing import write_lines

__all__ = [
    "FORMATS",
    "FileContents",
    "Format",
    "MaskContents",
    "ReadLimits",
    "Reading",
    "SurfaceContents",
    "format_of",
    "read_file",
    "read_files",
    "read_mask",
    "read_surface",
    "start_reading",
    "write_lines",
]
