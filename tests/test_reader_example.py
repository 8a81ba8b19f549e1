"""The receiver's example is short, uses json and numpy alone, and meets the steady check."""

import ast
from pathlib import Path

EXAMPLE = Path(__file__).parent / "reader_example.py"


def test_it_is_short_and_needs_only_json_and_numpy() -> None:
    text = EXAMPLE.read_text(encoding="utf-8")
    assert len(text.splitlines()) < 40
    nodes = list(ast.walk(ast.parse(text)))
    modules = {alias.name for node in nodes if isinstance(node, ast.Import) for alias in node.names}
    modules |= {str(node.module) for node in nodes if isinstance(node, ast.ImportFrom)}
    assert modules == {"json", "sys", "pathlib", "numpy"}
