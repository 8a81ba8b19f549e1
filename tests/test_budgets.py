"""Small enough to hold in the head: lengths of files and functions, parameters, docstrings."""

import ast
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "geomprep"
MODULES = sorted(PACKAGE.rglob("*.py"))
FILE_LINES, FUNCTION_LINES, PARAMETERS = 400, 60, 7


def functions(tree: ast.AST) -> list[ast.FunctionDef]:
    return [node for node in ast.walk(tree) if isinstance(node, ast.FunctionDef)]


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_sizes(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert text.count("\n") < FILE_LINES
    for function in functions(ast.parse(text)):
        docstring = ast.get_docstring(function, clean=False) or ""
        length = function.end_lineno - function.lineno + 1 - docstring.count("\n")
        assert length <= FUNCTION_LINES, f"{function.name} has {length} lines"
        arguments = function.args
        assert len(arguments.posonlyargs + arguments.args + arguments.kwonlyargs) <= PARAMETERS, function.name


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_everything_public_is_described(path: Path) -> None:
    tree = ast.parse(path.read_text(encoding="utf-8"))
    assert ast.get_docstring(tree), f"{path.name} has no docstring"
    holders = [tree, *(node for node in ast.walk(tree) if isinstance(node, ast.ClassDef))]
    for node in (inner for holder in holders for inner in holder.body):
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("__"):
            assert ast.get_docstring(node), f"{node.name} has no docstring"
