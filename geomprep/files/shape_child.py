"""Program of the child process in which a surface or a mask is parsed; never imported by the package.

It is :mod:`geomprep.files.child` with other readers: what it shares with that program is taken from its
file beside this one. Started and ordered in the same way.
"""

from __future__ import annotations

import os
from typing import Any

Answer = tuple[dict[str, Any], list[tuple[str, str, Any]]]

_LIBRARIES = {"vtk xml": "vtkmodules.vtkIOXML", "stl": "vtkmodules.vtkIOGeometry", "image": "vtkmodules.vtkIOImage"}


def _shared() -> Any:
    """The program for centrelines, as a module."""
    from importlib.util import module_from_spec, spec_from_file_location

    path = os.path.join(os.path.dirname(os.path.abspath(__file__)), "child.py")  # noqa: PTH118, PTH100, PTH120
    spec = spec_from_file_location("child", path)
    if spec is None or spec.loader is None:
        raise ImportError(path)
    module = module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def _prepare(reader: Any, kind: str) -> None:
    """Every triangle of an STL file comes back, so that their number can be compared."""
    if kind == "stl":
        reader.MergingOff()


def _surface(shared: Any, data: Any) -> Answer:
    """Arrays and counts, polygons and strips among them."""
    answer, arrays = shared._gather(data)
    if data.IsA("vtkPolyData"):
        for section, held in (("polys", data.GetPolys()), ("strips", data.GetStrips())):
            arrays.append((f"{section} connectivity", "", shared._values(held.GetConnectivityArray())))
            arrays.append((f"{section} offsets", "", shared._values(held.GetOffsetsArray())))
    return answer, arrays


def _image(shared: Any, data: Any, reader: Any) -> Answer:
    """Values and place of an image; of a NIfTI file the matrices that belong to the order of its slices."""
    arrays: list[tuple[str, str, Any]] = []
    shared._attributes("point array", data.GetPointData(), arrays)
    shared._attributes("cell array", data.GetCellData(), arrays)
    answer: dict[str, Any] = {
        "faults": [],
        "class": data.GetClassName(),
        "counts": {},
        "extent": list(data.GetExtent()),
        "origin": list(data.GetOrigin()),
        "spacing": list(data.GetSpacing()),
        "directions": _numbers(data.GetDirectionMatrix(), 3),
    }
    if hasattr(reader, "GetSFormMatrix"):
        answer["sform"], answer["qform"] = (_numbers(m, 4) for m in (reader.GetSFormMatrix(), reader.GetQFormMatrix()))
        answer["rescale"] = [reader.GetRescaleSlope(), reader.GetRescaleIntercept()]
    return answer, arrays


def _numbers(matrix: Any, size: int) -> list[list[float]] | None:
    """Rows of a matrix of VTK."""
    return matrix and [[matrix.GetElement(i, j) for j in range(size)] for i in range(size)]


def main() -> None:
    """Let the shared program run with these readers."""
    shared = _shared()
    of_lines = shared._vtk_reader

    def gather(data: Any, reader: Any) -> Answer:
        return _image(shared, data, reader) if data.IsA("vtkImageData") else _surface(shared, data)

    shared._vtk_reader = lambda kind: of_lines(kind, _LIBRARIES, _prepare, gather)
    shared.main()


if __name__ == "__main__":
    main()
    os._exit(0)  # the parent waits; what the library would free piece by piece goes with the process
