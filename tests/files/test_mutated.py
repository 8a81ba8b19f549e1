"""A fixed-seed tenth of the mutated files; all 500 run in ``tests/benchmarks/mutated_files.py``."""

import runpy
from pathlib import Path

import pytest

SCRIPT = Path(__file__).parent.parent / "benchmarks" / "mutated_files.py"


@pytest.fixture(scope="module")
def script() -> dict:
    return runpy.run_path(str(SCRIPT))


def test_untouched_files_read_as_they_were_made(script: dict, tmp_path: Path) -> None:
    for base in script["bases"]():
        assert script["verdict"](base, base.data, tmp_path) == "equal", base.name


def test_mutated_files_are_refused_or_equal_the_bytes(script: dict) -> None:
    table = script["run"](50, seed=1)
    outcomes = {word for row in table.values() for word in row}
    assert outcomes <= {"refused", "equal"}, table
    assert outcomes == {"refused", "equal"}  # both happen, so that neither branch is idle
