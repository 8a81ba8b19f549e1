"""``geomprep compare`` as a person meets it."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from geomprep.case.build import build
from geomprep.cli.main import main

SAMPLES = Path(__file__).parent.parent.parent / "sample_geometries"
ROUGH = SAMPLES / "neck-veins-rough"


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Results of the limb, of the rough neck veins, and of these with one gap bridged by a thread of one voxel."""
    folder = tmp_path_factory.mktemp("compare")
    build(SAMPLES / "limb" / "case.toml", output=folder / "limb")
    build(ROUGH / "case.toml", output=folder / "before")
    case = folder / "case"
    case.mkdir()
    for file in ROUGH.iterdir():
        (case / file.name).write_bytes(file.read_bytes())
    assert main(["decide", str(case / "case.toml"), "gap-43b154f212e8", "thread of one voxel", "-q"]) == 0
    build(case / "case.toml", output=folder / "after")
    return folder


def test_a_narrowed_sinus_is_the_only_line_of_the_table(results: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["compare", str(results / "before"), str(results / "after"), "--voxel", "0.6 mm"]) == 0
    said = capsys.readouterr().out
    table = said.split("(A → B)\n")[1].split("\n\n")[0].splitlines()
    assert len(table) == 2
    assert table[1].split("  ")[1:3] == ["left sigmoid sinus", "narrower"]
    assert "1 of 21 vessels differ" in said
    assert "not for diagnosis or treatment" in said
    assert "not proved absent" in said
    assert "more that change less" in said


def test_json_says_the_same_in_si(results: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["compare", str(results / "before"), str(results / "after"), "--voxel", "0.6 mm", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    changed = [vessel for vessel in found["vessels"] if vessel["changes"]]
    assert [(vessel["name"], vessel["changes"]) for vessel in changed] == [("left sigmoid sinus", ["narrower"])]
    # the thread is half a voxel of 0.6 mm in radius, in a sinus of 2.3 mm, over 5 mm: of five cells of 1.15 mm, whose
    # logarithms are averaged, three at least lie in it, four at most
    least, thread = changed[0]["local_ratio"][0], 0.3 / 2.3
    assert thread ** (4 / 5) < least < thread ** (3 / 5)
    first, second = found["resistance"]["all_inlets_to_all_outlets"]
    assert changed[0]["effect"] == pytest.approx(second - first, rel=1e-6)  # it is the only change
    assert found["settings"]["voxel"] == 0.6e-3
    assert found["fit"] is None
    assert any("not for diagnosis" in caution for caution in found["cautions"])
    assert len(found["resistance"]["routes"]) == 6 * 4


def test_verbose_shows_all_and_quiet_nothing(results: Path, capsys: pytest.CaptureFixture[str]) -> None:
    pair = [str(results / "before"), str(results / "before")]
    assert main(["compare", *pair, "--verbose"]) == 0
    said = capsys.readouterr().out
    assert said.count("  same  ") == 21
    assert "0 of 21 vessels differ" in said
    assert main(["compare", *pair, "--quiet"]) == 0
    assert capsys.readouterr().out == ""


def test_networks_with_nothing_in_common_leave_with_one(results: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["compare", str(results / "before"), str(results / "limb")]) == 1
    said = capsys.readouterr().out
    assert "only 0% of the length" in said
    assert "--fit" in said
    assert "only way" in said


def test_a_fit_is_reported(results: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["compare", str(results / "before"), str(results / "after"), "--fit"]) == 0
    said = capsys.readouterr().out
    assert "laid upon A: turned by" in said
    assert "1 of 21 vessels differ" in said


@pytest.mark.parametrize(
    ("extra", "word"),
    [
        (["none.json"], "none.json: cannot be read"),
        (["before", "--voxel", "0.6"], "--voxel"),
        (["before", "--within", "much"], "--within = 'much': a number is needed"),
        (["before", "--within", "-1"], "within = -1"),
        (["before", "--radius-noise", "0 mm"], "radius_deviation = 0"),
        ([], "B"),
    ],
)
def test_bad_input_is_one_line_and_exit_code_2(
    results: Path, extra: list, word: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(results)
    assert main(["compare", "before", *extra]) == 2
    captured = capsys.readouterr()
    assert word in captured.err
    assert captured.err.count("\n") == 1
    assert captured.out == ""
