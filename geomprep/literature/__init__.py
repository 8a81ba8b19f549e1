"""Published numbers and relations as a table: what, where from, how checked, where it holds."""

from geomprep.literature.row import Row
from geomprep.literature.sizes import plausible_radius, size_rows
from geomprep.literature.table import parse_rows, row, rows

__all__ = ["Row", "parse_rows", "plausible_radius", "row", "rows", "size_rows"]
