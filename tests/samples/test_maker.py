"""The maker draws the committed files again, byte for byte, and they stay small."""

import os
import subprocess
import sys
from pathlib import Path

SAMPLES = ("head-arteries", "limb", "neck-veins", "neck-veins-rough")
LARGEST = 200_000  # bytes, so that the samples can travel with the package


def test_the_same_bytes_again(samples_folder: Path, tmp_path: Path) -> None:
    environment = {**os.environ, "PYTHONHASHSEED": "5", "PYTHONDONTWRITEBYTECODE": "1"}
    command = [sys.executable, "-W", "error", str(samples_folder / "make_samples.py"), str(tmp_path)]
    subprocess.run(command, check=True, env=environment, timeout=120)
    made = sorted(path.relative_to(tmp_path) for path in tmp_path.rglob("*") if path.is_file())
    assert len(made) == 3 * len(SAMPLES)  # geometry, names and truth of each
    assert sorted(path.name for path in tmp_path.iterdir()) == list(SAMPLES)
    for path in made:
        assert (tmp_path / path).read_bytes() == (samples_folder / path).read_bytes(), path


def test_every_sample_is_whole_and_small(samples_folder: Path) -> None:
    readme = (samples_folder / "README.md").read_text(encoding="utf-8")
    for name in SAMPLES:
        files = [path for path in (samples_folder / name).iterdir() if path.is_file()]
        assert {"case.toml", "names.csv", "truth.json"} < {path.name for path in files}
        assert all(path.stat().st_size < LARGEST for path in files)
        assert f"| `{name}` |" in readme
