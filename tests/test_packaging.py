"""What is in the repository is in the package."""

import tomllib
from pathlib import Path

ROOT = Path(__file__).parent.parent
SETUP = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


def test_every_room_is_packed() -> None:
    listed = set(SETUP["tool"]["setuptools"]["packages"]) - {"geomprep.samples"}
    found = {".".join(path.parent.relative_to(ROOT).parts) for path in (ROOT / "geomprep").rglob("__init__.py")}
    assert listed == found


def test_every_sample_file_is_packed() -> None:
    patterns = SETUP["tool"]["setuptools"]["package-data"]["geomprep.samples"]
    samples = ROOT / "sample_geometries"
    packed = {path for pattern in patterns for path in samples.glob(pattern)}
    needed = {path for case in samples.glob("*/case.toml") for path in case.parent.iterdir() if path.is_file()}
    assert needed <= packed


def test_top_level_is_that_of_the_plan() -> None:
    allowed = {
        "README.md", "DEVELOPERS.md", "CHANGELOG.md", "CITATION.cff", "LICENSE", "pyproject.toml",
        "geomprep", "tests", "sample_geometries", "docs",
    }  # fmt: skip
    made = {"build", "dist", "demo"}
    found = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    assert {name for name in found - made if not name.endswith(".egg-info")} == allowed


def test_versions_agree() -> None:
    import geomprep

    citation = (ROOT / "CITATION.cff").read_text(encoding="utf-8")
    assert f"version: {geomprep.__version__}\n" in citation
    assert f"## {geomprep.__version__}" in (ROOT / "CHANGELOG.md").read_text(encoding="utf-8")
