"""The command line as a person meets it: what it prints, where, and with which exit code."""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from geomprep.cli.main import COMMANDS, main

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"


def test_from_sample_to_validated_network(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["sample", "limb", str(tmp_path)]) == 0
    assert main(["build", str(tmp_path / "limb" / "case.toml")]) == 0
    said = capsys.readouterr().out
    assert "mass balance" in said
    assert len(said.split("results/network.json")[0].splitlines()) <= 12
    results = tmp_path / "limb" / "results"
    for name in [
        "network.json",
        "nodes.csv",
        "segments.csv",
        "stations.csv",
        "findings.csv",
        "repairs.csv",
        "lines.vtp",
        "overview.svg",
    ]:
        assert (results / name).is_file(), name
    assert main(["validate", str(results / "network.json")]) == 0
    assert "valid" in capsys.readouterr().out


def test_inspect_writes_nothing_and_ranks_the_right_reading_first(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    assert main(["inspect", str(SAMPLES / "limb" / "arteries.vtk"), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    readings = found["files"][0]["readings"]
    assert (readings[0]["unit"], readings[0]["meaning"]) == ("cm", "diameter")
    assert list(tmp_path.iterdir()) == []


def test_new_leaves_questions_and_build_asks_them_all_at_once(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    case = tmp_path / "case.toml"
    assert main(["new", str(SAMPLES / "neck-veins" / "veins.vtp"), "-o", str(case)]) == 0
    assert "CHOOSE" in case.read_text(encoding="utf-8")
    assert main(["build", str(case)]) == 2
    asked = capsys.readouterr().err
    for key in ("input[0].vessels", "input[0].length_unit", "input[0].size_means"):
        assert key in asked
    assert not (tmp_path / "results").exists()
    before = case.read_bytes()
    assert main(["new", str(SAMPLES / "neck-veins" / "veins.vtp"), "-o", str(case)]) == 2
    assert case.read_bytes() == before


@pytest.mark.parametrize(
    ("arguments", "word"),
    [
        (["build", "none.toml"], "no such file"),
        (["build"], "CASE"),
        (["bild", "case.toml"], "invalid choice"),
        (["inspect", "none.vtp"], "no such file"),
        (["validate", "none.json"], "cannot be read"),
        (["sample", "nose"], "limb"),
        (["sources", "wave-speed-of-cheese"], "wave-speed"),
        ([], "COMMAND"),
    ],
)
def test_bad_usage_is_one_line_and_exit_code_2(
    arguments: list[str], word: str, capsys: pytest.CaptureFixture[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    assert main(arguments) == 2
    said = capsys.readouterr()
    assert word in said.err
    assert len(said.err.strip().splitlines()) == 1
    assert "Traceback" not in said.err + said.out


def test_unwritable_folder_and_existing_file_in_the_way(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "results").write_text("in the way")
    assert main(["build", str(SAMPLES / "limb" / "case.toml"), "-o", str(tmp_path / "results")]) == 2
    said = capsys.readouterr().err
    assert "results" in said
    assert len(said.strip().splitlines()) == 1
    assert (tmp_path / "results").read_text() == "in the way"


@pytest.mark.parametrize("command", sorted(COMMANDS))
def test_every_command_has_help_with_an_example(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main([command, "--help"]) == 0
    said = capsys.readouterr().out
    assert "xample:" in said
    assert f"geomprep {command}" in said


def test_help_does_not_load_numpy() -> None:
    code = "import sys; from geomprep.cli.main import main; main(['--help']); sys.exit('numpy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], capture_output=True, check=False).returncode == 0


def test_building_does_not_load_what_it_does_not_use(tmp_path: Path) -> None:
    code = (
        "import sys; from geomprep.cli.main import main; main(['build', sys.argv[1], '-o', sys.argv[2], '-q']);"
        "heavy = {'vtk', 'meshio', 'networkx', 'jsonschema', 'matplotlib', 'pyvista'} & set(sys.modules);"
        "sys.exit(', '.join(sorted(heavy)) or 0)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(SAMPLES / "limb" / "case.toml"), str(tmp_path)],
        capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr


def test_a_closed_pipe_is_no_error() -> None:
    reader, writer = os.pipe()
    os.close(reader)
    done = subprocess.run(
        [sys.executable, "-m", "geomprep", "sources"], stdout=writer, stderr=subprocess.PIPE, check=False
    )
    os.close(writer)
    assert done.returncode == 0
    assert b"Traceback" not in done.stderr


def test_strict_refuses_findings_of_severity_error(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = (SAMPLES / "limb" / "case.toml").read_text(encoding="utf-8")
    case = tmp_path / "case.toml"
    for name in ("arteries.vtk", "names.csv"):
        (tmp_path / name).write_bytes((SAMPLES / "limb" / name).read_bytes())
    case.write_text(text.replace('length_unit = "cm"', 'length_unit = "m"'), encoding="utf-8")
    code = main(["build", str(case), "--strict"])
    assert code == 2
    assert "strict" in capsys.readouterr().err
    assert not (tmp_path / "results").exists()


def test_dry_run_and_inspect_show_repairs_as_a_table(capsys) -> None:
    case = SAMPLES / "neck-veins-rough"
    assert main(["build", str(case / "case.toml"), "--dry-run"]) == 0
    shown = capsys.readouterr().out
    assert "would be repaired" in shown
    assert shown.count("two open ends lie") == 4
    assert main(["inspect", str(case / "veins.vtp"), "--vessels", "veins"]) == 1  # sizes of zero are an error
    shown = capsys.readouterr().out
    assert shown.count("asked: leave | interpolate") == 4
