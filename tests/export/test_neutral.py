"""The network file is written whole, reproducibly, and read by a receiver who has only json and numpy."""

from __future__ import annotations

import importlib.util
from collections.abc import Callable
from pathlib import Path
from types import SimpleNamespace

import pytest

from geomprep.export import write_network

EXAMPLE = Path(__file__).parent.parent / "reader_example.py"


def largest_difference(path: Path) -> float:
    """What the receiver's example finds."""
    spec = importlib.util.spec_from_file_location("reader_example", EXAMPLE)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return float(module.largest_difference(str(path)))


@pytest.mark.parametrize("name", ["y", "ring"])
def test_a_receiver_reproduces_the_steady_check(
    name: str, make: Callable[[str], SimpleNamespace], tmp_path: Path
) -> None:
    case = make(name)
    target = tmp_path / "network.json"
    assert write_network(target, case.network, case.state, case.context) == (target,)
    assert largest_difference(target) < 1e-6
