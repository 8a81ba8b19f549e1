"""Every command of the walk-through runs and ends as the page says."""

import re
import shlex
from pathlib import Path

import pytest

from geomprep.cli.main import main

DOCS = Path(__file__).parent.parent.parent / "docs"
README = DOCS.parent / "README.md"


def commands(page: Path) -> list[str]:
    blocks = re.findall(r"```bash\n(.*?)```", page.read_text(encoding="utf-8"), re.DOTALL)
    lines = [line.split("#")[0].strip() for block in blocks for line in block.splitlines()]
    return [line for line in lines if line.startswith("geomprep ")]


def test_walk_through(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    monkeypatch.chdir(tmp_path)
    codes = {line: main(shlex.split(line)[1:]) for line in commands(DOCS / "first-case.md")}
    assert len(codes) == 7
    expected = {line: 2 if line == "geomprep build demo/own.toml" else 0 for line in codes}
    assert codes == expected, capsys.readouterr()
    assert (tmp_path / "demo" / "limb" / "results" / "network.json").is_file()


def test_commands_of_the_readme_exist(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    text = README.read_text(encoding="utf-8")
    for name in ("inspect", "new", "build", "validate", "sample"):
        assert f"geomprep {name}" in text
        assert main([name, "--help"]) == 0


def test_python_of_the_readme(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    main(["sample", "neck-veins", "demo"])
    (code,) = re.findall(r"```python\n(.*?)```", README.read_text(encoding="utf-8"), re.DOTALL)
    exec(compile(code, "README.md", "exec"), {})
