"""A network file of an earlier build decides on every repair, whatever the case says by now."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest

from geomprep.case.build import build
from geomprep.errors import InputError

SAMPLE = Path(__file__).parent.parent.parent / "sample_geometries" / "neck-veins-rough"

MOVED = """
[repair.spurs]
outside_below = 0.4
[repair.radius]
spike_ratio = 2.8
[repair.gaps]
ask_above = 0.49
longest = 2.0
[repair.join]
copies_within = 0.01
[repair.copies]
within = 0.1
"""


@pytest.fixture
def case(tmp_path: Path) -> Path:
    shutil.copytree(SAMPLE, tmp_path / "case")
    return tmp_path / "case" / "case.toml"


def content(file: Path) -> dict:
    """A network file without what it says of its case."""
    document = json.loads(file.read_text(encoding="utf-8"))
    document["provenance"].pop("case_sha256")
    return document


def test_replay_gives_the_same_network_though_every_threshold_has_moved(case: Path) -> None:
    build(case, output=case.parent / "first")
    shutil.copy(case.parent / "first" / "network.json", case.parent / "earlier.json")
    text = case.read_text(encoding="utf-8")
    case.write_text(text + MOVED + '[repair.replay]\nnetwork = "earlier.json"\n', encoding="utf-8")
    build(case, output=case.parent / "second")
    assert content(case.parent / "second" / "network.json") == content(case.parent / "first" / "network.json")
    # without the record the moved thresholds change what is found, and the build no longer fits its decisions
    case.write_text(text + MOVED, encoding="utf-8")
    try:
        third = build(case, dry_run=True)
    except InputError:
        return
    assert {repair.id for repair in third.repairs} != {
        row["id"] for row in content(case.parent / "earlier.json")["repairs"]
    }


def test_decisions_of_a_person_go_before_the_record(case: Path) -> None:
    build(case, output=case.parent / "first")
    shutil.copy(case.parent / "first" / "network.json", case.parent / "earlier.json")
    record = content(case.parent / "earlier.json")
    spur = next(row["id"] for row in record["repairs"] if row["kind"] == "spur")
    with case.open("a", encoding="utf-8") as file:
        file.write('[repair.replay]\nnetwork = "earlier.json"\n')
    decided = f'\n[[decision]]\nid = "{spur}"\nchoice = "leave"\nnote = "a vessel"\nrecorded_by = "A. Test"\n'
    with (case.parent / "decisions.toml").open("a", encoding="utf-8") as file:
        file.write(decided)
    repairs = {repair.id: repair for repair in build(case, dry_run=True).repairs}
    assert (repairs[spur].choice, repairs[spur].verdict_by) == ("leave", "person")
    others = {row["id"]: row["choice"] for row in record["repairs"] if row["id"] != spur}
    assert {key: repairs[key].choice for key in others} == others


def test_settings_are_on_record(case: Path) -> None:
    build(case, output=case.parent / "first")
    rows = content(case.parent / "first" / "network.json")["provenance"]["settings"]
    assert {"step": "gaps", "key": "longest", "value": "10.0"} in rows
    assert {"join", "radius", "cliques", "kissing", "paths"} <= {row["step"] for row in rows}


@pytest.mark.parametrize("text", ["", "{}", '{"provenance": {"settings": [{"step": "gaps"}]}}', "no json"])
def test_what_is_no_record_is_refused_in_one_line(case: Path, text: str) -> None:
    (case.parent / "earlier.json").write_text(text, encoding="utf-8")
    with case.open("a", encoding="utf-8") as file:
        file.write('[repair.replay]\nnetwork = "earlier.json"\n')
    with pytest.raises(InputError, match=r"repair\.replay\.network = 'earlier\.json': no record of repairs") as refusal:
        build(case, dry_run=True)
    assert "\n" not in str(refusal.value)
