"""The hand-over: neutral network file with schema and validator, tables, overview."""

from geomprep.export.context import ExportContext, ImagingState, InputRecord
from geomprep.export.neutral import encode, neutral_document, write_network

__all__ = ["ExportContext", "ImagingState", "InputRecord", "encode", "neutral_document", "write_network"]
