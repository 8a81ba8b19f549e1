"""Vessel centrelines in, a checked network for any 1D or 0D blood-flow solver out.

The public names are loaded when they are first used, so that importing the package is cheap.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

_PUBLIC: dict[str, str] = {
    "BuildResult": "geomprep.case.build",
    "GeomprepError": "geomprep.errors",
    "Network": "geomprep.model",
    "build": "geomprep.case.build",
    "compare": "geomprep.case.compare",
    "copy_sample": "geomprep.case.samples",
    "inspect": "geomprep.case.inspect",
    "new_case": "geomprep.case.new",
    "read": "geomprep.files",
    "read_case": "geomprep.case.file",
    "sources": "geomprep.literature",
    "validate": "geomprep.export",
}
"""Public name -> room that offers it."""

_DEFINED_AS = {"read": "read_file", "sources": "rows", "validate": "validate_network"}
"""Public name -> name in its room, where that says more."""

__all__ = ["__version__"]
__all__ += list(_PUBLIC)


def __getattr__(name: str) -> Any:
    """Load a public name on first use."""
    if name not in _PUBLIC:
        raise AttributeError(f"module 'geomprep' has no attribute '{name}'; it offers {', '.join(sorted(__all__))}")
    return getattr(import_module(_PUBLIC[name]), _DEFINED_AS.get(name, name))


def __dir__() -> list[str]:
    """List the public names, for tab completion."""
    return sorted(__all__)
