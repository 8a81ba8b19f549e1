"""The page on repairs names every step, and its commands run and end as it says."""

import re
import shlex
import shutil
from pathlib import Path

import pytest

from geomprep.cli.main import main
from geomprep.repair import STEPS

PAGE = Path(__file__).parent.parent.parent / "docs" / "repairs.md"


def test_every_step_is_on_the_page_in_its_order() -> None:
    named = re.findall(r"^\| \w+ \| `\[repair\.(\w+)\]`", PAGE.read_text(encoding="utf-8"), re.MULTILINE)
    assert named == ["radius", "join", *(row.name for row in STEPS)]


def test_commands(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    monkeypatch.chdir(tmp_path)
    blocks = re.findall(r"```bash\n(.*?)```", PAGE.read_text(encoding="utf-8"), re.DOTALL)
    codes = []
    for line in "".join(blocks).splitlines():
        words = shlex.split(line, comments=True)
        if words[0] == "mv":
            shutil.move(words[1], words[2])
        else:
            assert words[0] == "geomprep"
            codes.append(main(words[1:]))
        if "--list" in words:
            assert capsys.readouterr().out.count("open  ") == 6
    assert codes == [0, 0, 2, 0, 0, 0], capsys.readouterr()
