"""The case: one file that says everything about a run, and what is made from it."""

from geomprep.case.file import read_case
from geomprep.case.sections import Case

__all__ = ["Case", "read_case"]
