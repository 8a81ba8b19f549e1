"""The hand-over: neutral network file with schema and validator, tables, overview."""

from geomprep.export.context import ExportContext, ImagingState, InputRecord, SettingRecord
from geomprep.export.neutral import encode, neutral_document, write_network
from geomprep.export.overview import overview_svg, write_overview
from geomprep.export.schema import schema, schema_text
from geomprep.export.tables import write_tables
from geomprep.export.validate import ValidationReport, validate_network

__all__ = [
    "ExportContext",
    "ImagingState",
    "InputRecord",
    "SettingRecord",
    "ValidationReport",
    "encode",
    "neutral_document",
    "overview_svg",
    "schema",
    "schema_text",
    "validate_network",
    "write_network",
    "write_overview",
    "write_tables",
]
