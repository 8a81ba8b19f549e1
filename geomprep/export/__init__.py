"""The hand-over: neutral network file with schema and validator, tables, overview."""

from geomprep.export.context import ExportContext, ImagingState, InputRecord
from geomprep.export.neutral import encode, neutral_document, write_network
from geomprep.export.overview import overview_svg, write_overview
from geomprep.export.tables import write_tables

__all__ = [
    "ExportContext",
    "ImagingState",
    "InputRecord",
    "encode",
    "neutral_document",
    "overview_svg",
    "write_network",
    "write_overview",
    "write_tables",
]
