"""Program of the child process in which a file is parsed; never imported by the package.

It is started as ``python -I child.py PACKAGE_PATHS READER OUTPUT`` and loads the reader's
library at once, while the parent still looks at the bytes. Then it waits for one line of
JSON on its input: the file and the limits. Arrays go one after the other to the file
descriptor OUTPUT, a line of JSON that describes them goes to standard output. A crash, an
endless loop or too much memory ends this process only.
"""

from __future__ import annotations

import json
import os
import sys
from collections.abc import Callable
from typing import Any

Answer = tuple[dict[str, Any], list[tuple[str, str, Any]]]


def main() -> None:
    """Load the library, wait for the order, read, hand back."""
    sys.path[:] = json.loads(sys.argv[1])
    kind, output = sys.argv[2], int(sys.argv[3])
    reply = os.dup(1)
    os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
    read = _mesh_reader() if kind == "meshio" else _vtk_reader(kind)
    order = json.loads(sys.stdin.readline() or "null")
    if order is None:  # the parent has found a fault, or is gone
        return
    _limit(order["memory_bytes"], order["cpu_seconds"])
    try:
        answer, arrays = read(os.fsdecode(bytes.fromhex(order["path"])), order)
        answer["arrays"] = _hand_over(arrays, output)
    except Exception as error:  # every fault of a parser becomes one line in the parent
        answer = {"faults": [f"{type(error).__name__}: {error}"]}
    with os.fdopen(reply, "w") as stream:
        json.dump(answer, stream)


def _limit(memory: int, seconds: int) -> None:
    """Bound memory and processor time of this process."""
    import resource

    resource.setrlimit(resource.RLIMIT_AS, (memory, memory))
    resource.setrlimit(resource.RLIMIT_CPU, (seconds, seconds + 1))
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))


def _hand_over(arrays: list[tuple[str, str, Any]], output: int) -> list[dict[str, Any]]:
    """Write arrays to the output one after the other; say where each lies."""
    import numpy as np

    described, position = [], 0
    with os.fdopen(output, "wb") as stream:
        for role, name, array in arrays:
            whole = np.ascontiguousarray(array)
            stream.write(whole.reshape(-1).view(np.uint8).data)
            stream.write(bytes(-whole.nbytes % 16))
            described.append(
                {"role": role, "name": name, "dtype": whole.dtype.str, "shape": whole.shape, "start": position}
            )
            position += whole.nbytes + (-whole.nbytes % 16)
    return described


_LIBRARIES = {"vtk xml": "vtkmodules.vtkIOXML", "vtk legacy": "vtkmodules.vtkIOLegacy"}


def _every_array(reader: Any, kind: str) -> None:
    """Legacy files: read all arrays of a kind, not the first only."""
    if kind == "vtk legacy":
        for every in ("Scalars", "Vectors", "Normals", "Tensors", "ColorScalars", "TCoords", "Fields"):
            getattr(reader, f"ReadAll{every}On")()


def _vtk_reader(
    kind: str,
    libraries: dict[str, str] = _LIBRARIES,
    prepare: Callable[[Any, str], None] = _every_array,
    gather: Callable[[Any, Any], Answer] | None = None,
) -> Any:
    """Load VTK's readers; what comes back reads a file with the one that the order names."""
    from importlib import import_module

    library = import_module(libraries[kind])
    from vtkmodules.util.numpy_support import vtk_to_numpy  # noqa: F401  loaded while there is time
    from vtkmodules.vtkCommonCore import vtkOutputWindow, vtkStringOutputWindow

    def read(path: str, order: dict[str, Any]) -> Answer:
        window = vtkStringOutputWindow()
        vtkOutputWindow.SetInstance(window)
        reader = getattr(library, order["reader"])()
        faults: list[str] = []
        for event in ("ErrorEvent", "WarningEvent"):
            reader.AddObserver(event, _listener(faults))
        reader.SetFileName(path)
        prepare(reader, kind)
        reader.Update()
        faults += [window.GetOutput()] if window.GetOutput().strip() else []
        if reader.GetErrorCode():
            faults.append(f"error code {reader.GetErrorCode()}")
        data = reader.GetOutput()
        if faults or data is None:
            return {"faults": faults or ["nothing was read"]}, []
        return gather(data, reader) if gather else _gather(data)

    return read


def _listener(faults: list[str]) -> Any:
    """Something that VTK calls with the text of each error or warning."""

    def heard(_source: Any, _event: str, text: str | None = None) -> None:
        faults.append(text or "an error without a text")

    heard.CallDataType = "string0"  # type: ignore[attr-defined]
    return heard


def _gather(data: Any) -> Answer:
    """Arrays and counts of one VTK data set."""
    arrays: list[tuple[str, str, Any]] = []
    counts: dict[str, list[int]] = {}
    if data.GetPoints() is not None:
        arrays.append(("points", "", _values(data.GetPoints().GetData())))
    if data.IsA("vtkPolyData"):
        cells = {
            "verts": data.GetVerts(),
            "lines": data.GetLines(),
            "polys": data.GetPolys(),
            "strips": data.GetStrips(),
        }
        wanted = "lines"
    else:
        cells, wanted = {"cells": data.GetCells()}, "cells"
        if data.GetNumberOfCells():
            types = data.GetCellTypesArray() if hasattr(data, "GetCellTypesArray") else data.GetCellTypes()
            arrays.append(("types", "", _values(types)))
    for section, held in cells.items():
        counts[section] = [held.GetNumberOfCells(), held.GetNumberOfConnectivityIds()]
        if section == wanted:
            arrays.append(("connectivity", "", _values(held.GetConnectivityArray())))
            arrays.append(("offsets", "", _values(held.GetOffsetsArray())))
    skipped = _attributes("point array", data.GetPointData(), arrays)
    skipped += _attributes("cell array", data.GetCellData(), arrays)
    whole = data.GetFieldData()
    loose = [whole.GetArrayName(i) or "" for i in range(whole.GetNumberOfArrays())]
    return {"faults": [], "class": data.GetClassName(), "counts": counts, "skipped": skipped, "loose": loose}, arrays


def _attributes(role: str, attributes: Any, arrays: list[tuple[str, str, Any]]) -> list[str]:
    """Append the numeric arrays of points or cells; names of those that hold no numbers."""
    skipped = []
    for i in range(attributes.GetNumberOfArrays()):
        array = attributes.GetAbstractArray(i)
        name = array.GetName() or ""
        if array.IsA("vtkDataArray"):
            arrays.append((role, name, _values(array)))
        else:
            skipped.append(name)
    return skipped


def _values(array: Any) -> Any:
    """Values of a VTK array, without a copy where its memory is plain."""
    from vtkmodules.util import numpy_support
    from vtkmodules.vtkCommonCore import vtkUnsignedCharArray

    convert: Any = numpy_support  # it carries no types

    if array.IsA("vtkBitArray"):
        bits = vtkUnsignedCharArray()
        bits.DeepCopy(array)
        array = bits
    return convert.vtk_to_numpy(array)


def _mesh_reader() -> Any:
    """Load meshio; what comes back reads a file with it."""
    import warnings

    import meshio

    warnings.simplefilter("error")  # numpy only warns when numbers are missing

    def read(path: str, order: dict[str, Any]) -> Answer:
        return _gather_mesh(meshio.read(path, file_format=order["reader"]))

    return read


def _gather_mesh(mesh: Any) -> Answer:
    """Arrays and counts of one mesh: the two-point lines of all its blocks."""
    import numpy as np

    lines = [i for i, block in enumerate(mesh.cells) if block.type == "line"]
    ends = [np.asarray(mesh.cells[i].data, np.int64).reshape(-1, 2) for i in lines] or [np.empty((0, 2), np.int64)]
    arrays: list[tuple[str, str, Any]] = [("points", "", np.asarray(mesh.points))]
    arrays.append(("connectivity", "", np.concatenate(ends).reshape(-1)))
    arrays.append(("offsets", "", np.arange(sum(map(len, ends)) + 1) * 2))
    arrays += [("point array", name, np.asarray(array)) for name, array in mesh.point_data.items()]
    for name, blocks in mesh.cell_data.items() if lines else ():
        arrays.append(("cell array", name, np.concatenate([np.asarray(blocks[i]) for i in lines])))
    counts: dict[str, int] = {}
    for block in mesh.cells:
        counts[block.type] = counts.get(block.type, 0) + len(block.data)
    return {"faults": [], "class": "mesh", "counts": counts, "skipped": [], "loose": []}, arrays


if __name__ == "__main__":
    main()
    os._exit(0)  # the parent waits; what the library would free piece by piece goes with the process
