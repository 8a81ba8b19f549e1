"""Where words go: standard output, standard error, terminals, and what a fault of the program looks like."""

import contextlib
import json
import os
import pty
import re
import subprocess
import sys
import tempfile
from pathlib import Path

import pytest

from geomprep.cli import build as build_command
from geomprep.cli import new as new_command
from geomprep.cli.console import Console, table
from geomprep.cli.main import main
from geomprep.errors import Question

ROOT = Path(__file__).parent.parent.parent
LIMB = ROOT / "sample_geometries" / "limb" / "case.toml"
COMMAND = [sys.executable, "-m", "geomprep"]


def test_quiet_prints_nothing_and_verbose_more(tmp_path, capsys):
    printed = {}
    for flag in ("--quiet", "--verbose", None):
        arguments = ["build", str(LIMB), "-o", str(tmp_path), *([flag] if flag else [])]
        assert main(arguments) == 0
        printed[flag] = capsys.readouterr()
    assert printed["--quiet"] == ("", "")
    assert printed[None].err == ""
    assert len(printed[None].out.splitlines()) <= 8
    assert printed["--verbose"].out.endswith(printed[None].out)


def test_json_is_the_only_thing_on_standard_output(tmp_path, capsys):
    assert main(["build", str(LIMB), "--dry-run", "--json"]) == 0
    document = json.loads(capsys.readouterr().out)
    assert (document["segments"], document["output_folder"]) == (7, None)


def test_open_questions_are_numbered_for_people_and_structured_for_programs(tmp_path, capsys):
    case = tmp_path / "case.toml"
    assert main(["new", str(ROOT / "sample_geometries" / "limb" / "arteries.vtk"), "-o", str(case), "-q"]) == 0
    assert main(["build", str(case), "--json"]) == 2
    said = capsys.readouterr()
    questions = json.loads(said.out)["questions"]
    assert questions[0]["key"] == "input[0].vessels"
    assert all(f"({number})" in said.err for number in range(1, len(questions) + 1))


def test_several_files_one_of_them_bad(tmp_path, capsys):
    good = str(ROOT / "sample_geometries" / "limb" / "arteries.vtk")
    assert main(["inspect", "none.vtp", good, "--json"]) == 2
    files = json.loads(capsys.readouterr().out)["files"]
    assert "error" in files[0]
    assert files[1]["lines"] == 7


def test_zero_radii_make_inspect_end_with_1(capsys):
    assert main(["inspect", str(ROOT / "sample_geometries" / "neck-veins-rough" / "veins.vtp")]) == 1
    assert re.search(r"error +'radius' is zero, negative or no number on \d+ of", capsys.readouterr().out)


def test_a_fault_of_the_program_is_one_line_and_a_file_with_the_details(tmp_path, capsys, monkeypatch):
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    monkeypatch.setattr(build_command, "build", lambda *_, **__: {}["nothing\nhere"])
    assert main(["build", str(LIMB)]) == 3
    said = capsys.readouterr()
    assert said.out == ""
    assert len(said.err.splitlines()) == 1
    log = Path(re.search(r"details are in (\S+\.log)", said.err)[1])
    assert "Traceback" in log.read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("error", "code", "words"),
    [
        (KeyboardInterrupt(), 130, "stopped"),
        (MemoryError(), 2, "not enough memory"),
        (OSError(28, "No space left on device", "results/network.json"), 2, "results/network.json: No space left"),
        (PermissionError(13, "Permission denied", "results"), 2, "results: Permission denied"),
    ],
)
def test_what_the_machine_refuses_is_one_line(error, code, words, capsys, monkeypatch):
    def refuses(*_, **__):
        raise error

    monkeypatch.setattr(build_command, "build", refuses)
    assert main(["build", str(LIMB)]) == code
    said = capsys.readouterr().err
    assert words in said
    assert len(said.splitlines()) == 1


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full on this system")
def test_a_full_disk_behind_standard_output():
    with Path("/dev/full").open("w") as full:
        done = subprocess.run([*COMMAND, "sources"], stdout=full, stderr=subprocess.PIPE, check=False, text=True)
    assert done.returncode == 2
    assert "No space left" in done.stderr
    assert "Traceback" not in done.stderr


def test_signs_that_a_terminal_lacks_are_replaced():
    done = subprocess.run(
        [*COMMAND, "inspect", "nö such ▶.vtp"], env={**os.environ, "PYTHONIOENCODING": "ascii"},
        capture_output=True, check=False,
    )  # fmt: skip
    assert done.returncode == 2
    assert b"n? such ?.vtp" in done.stderr


def test_the_bar_is_drawn_on_a_terminal_only(tmp_path):
    """The same command with standard error on a pseudo-terminal and on a pipe."""
    arguments = [*COMMAND, "build", str(LIMB), "-o", str(tmp_path)]
    master, slave = pty.openpty()
    drawn = b""
    with subprocess.Popen(arguments, stdout=subprocess.DEVNULL, stderr=slave) as process:
        os.close(slave)
        with contextlib.suppress(OSError):  # the end of a pseudo-terminal is an error of its reader
            while part := os.read(master, 4096):
                drawn += part
    os.close(master)
    assert process.returncode == 0
    assert b"100%" in drawn
    piped = subprocess.run(arguments, capture_output=True, check=True)
    assert piped.stderr == b""


def test_numbers_that_json_has_not_become_null(capsys):
    Console(json=True).document({"a": float("nan"), "b": [float("inf"), 1.5, True], "c": (None, "µm")})
    assert json.loads(capsys.readouterr().out) == {"a": None, "b": [None, 1.5, True], "c": [None, "µm"]}


def test_table_of_no_rows():
    assert table(["a", "b"], []) == ["  a  b"]


@pytest.mark.parametrize(
    ("typed", "answer"), [("2\n", "cm"), ("\n", None), ("", None), ("3\n", "3"), ("cm\n", "cm"), (" 1 \n", "mm")]
)
def test_answers_on_the_terminal(typed, answer, monkeypatch, capsys):
    import io

    monkeypatch.setattr(sys, "stdin", io.StringIO(typed))
    assert new_command._ask(Question("input[0].length_unit", "which unit?", ("mm", "cm"), ("fits", ""))) == answer
    assert "which unit?" in capsys.readouterr().out
