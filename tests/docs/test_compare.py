"""The page on comparing: its commands run and end as it says, its limits are those of the settings."""

import json
import math
import re
import shlex
from pathlib import Path

import pytest

from geomprep.cli.main import main
from geomprep.measure.comparison import Change
from geomprep.measure.comparison_settings import ComparisonSettings

PAGE = (Path(__file__).parent.parent.parent / "docs" / "compare.md").read_text(encoding="utf-8")


def test_commands(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    monkeypatch.chdir(tmp_path)
    for line in "".join(re.findall(r"```bash\n(.*?)```", PAGE, re.DOTALL)).splitlines():
        command, _, remark = line.partition("#")
        words = shlex.split(command)
        assert words[0] == "geomprep"
        capsys.readouterr()
        assert main(words[1:]) == 0, capsys.readouterr()
        assert remark.strip() in capsys.readouterr().out or "--json" in words
    assert main(["compare", "demo/neck-veins", "demo/neck-veins-rough", "--json"]) == 0
    first, second = json.loads(capsys.readouterr().out)["resistance"]["all_inlets_to_all_outlets"]
    assert abs(second / first - 1) < 0.01


def test_words_and_limits() -> None:
    for kind in Change:
        assert re.search(rf"\b{kind.name.lower()}\b", PAGE), kind
    limits = ComparisonSettings()
    assert (limits.within, limits.named_within, limits.share, limits.cell, limits.end_shift) == (0.5, 1, 0.5, 0.5, 1)
    assert (limits.length_change, limits.radius_change, limits.local_change) == (0.05, 0.05, 0.2)
    assert (math.degrees(limits.angle), limits.noise_factor, limits.voxel_fraction) == (pytest.approx(60), 2, 0.25)
