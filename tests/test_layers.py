"""The rooms import downwards only, and heavy libraries stay in their rooms."""

import ast
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "geomprep"
LAYERS = [
    {"errors", "units", "findings", "curves", "atomic"},
    {"laws", "literature", "solve"},
    {"model"},
    {"files", "repair", "segments", "measure", "anatomy", "assign", "flow", "export"},
    {"case"},
    {"report"},
    {"cli", "cohort"},
]
LEVEL = {room: level for level, rooms in enumerate(LAYERS) for room in rooms}
KEPT_IN = {  # outside library -> rooms that may import it
    "scipy.sparse.linalg": {"solve"},
    "vtkmodules": {"files", "measure"},
    "vtk": set(),
    "meshio": {"files"},
    "networkx": {"repair", "anatomy", "export"},
    "orjson": {"export", "cli"},
    "msgspec": {"export"},
    "jsonschema": {"export"},
    "pyvista": {"report", "export"},
    "matplotlib": {"report"},
}
# named in DEVELOPERS.md; nothing else may look upwards or sideways
EXCEPTIONS: set[tuple[str, str]] = set()


def imports(path: Path) -> list[str]:
    found = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found += [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative import"
            found.append(node.module or "")
            found += [f"{node.module}.{alias.name}" for alias in node.names]
    return found


def room_of(path: Path) -> str:
    parts = path.relative_to(PACKAGE).parts
    return parts[0].removesuffix(".py")


MODULES = [path for path in sorted(PACKAGE.rglob("*.py")) if room_of(path) not in {"__init__", "__main__"}]


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_imports_point_down(path: Path) -> None:
    room = room_of(path)
    for name in imports(path):
        parts = name.split(".")
        if parts[0] != "geomprep" or len(parts) < 2 or parts[1].startswith("__"):
            continue
        other = parts[1]
        if other == room or (room, other) in EXCEPTIONS:
            continue
        if LEVEL[room] in (3, 6):  # stages, and the two faces at the top, know nothing of one another
            assert LEVEL[other] < LEVEL[room], f"{room} imports {other}"
        elif LEVEL[room] == 1:
            assert LEVEL[other] == 0 or (room, other) == ("literature", "laws"), f"{room} imports {other}"
        else:
            assert LEVEL[other] <= LEVEL[room], f"{room} imports {other}"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_outside_libraries_stay_in_their_rooms(path: Path) -> None:
    for name in imports(path):
        for library, rooms in KEPT_IN.items():
            if name == library or name.startswith(library + "."):
                assert room_of(path) in rooms, f"{room_of(path)} imports {library}"


def test_every_room_stands_in_the_plan() -> None:
    rooms = {room_of(path) for path in MODULES}
    assert rooms <= set(LEVEL), rooms - set(LEVEL)
